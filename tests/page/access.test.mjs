// What an automatic checker does not see: the order of the keyboard, visible focus, narrow and
// enlarged pages, spacing, contrast of the palette, headings, words for every change (WCAG 2.2,
// the numbers in brackets).

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

// An invented kelp film.
const FILM = "0.9550 0.0226 0.0327 0.0038\n0.0190 0.6733 0.2540 -0.6306\n0.0297 0.2500 0.7353 0.5698\n0.0003 0.6339 -0.5648 0.4469";

/** @type {Awaited<ReturnType<typeof openBrowser>>} */
let browser;
before(async () => {
  browser = await openBrowser();
});
after(() => browser.close());

/** @param {Page} page @param {string} text */
async function paste(page, text) {
  await page.evaluate((text) => {
    const clipboardData = new DataTransfer();
    clipboardData.setData("text/plain", text);
    document.body.dispatchEvent(new ClipboardEvent("paste", { clipboardData, bubbles: true, cancelable: true }));
  }, text);
  await page.locator("#task-heading").waitFor();
}

const TASKS = /** @type {const} */ (["realizability", "properties", "train"]);

/** @param {Page} page @param {(task: string) => Promise<void>} check */
async function inEachTask(page, check) {
  for (const task of TASKS) {
    await page.locator(`nav a[data-task="${task}"]`).click();
    await page.waitForTimeout(100);
    await check(task);
  }
}

/** Where the keyboard goes by Tab, from the start of the page to its end. @param {Page} page */
async function tabOrder(page) {
  await page.evaluate(() => {
    document.body.tabIndex = -1;
    document.body.focus();
    document.body.removeAttribute("tabindex");
  });
  /** @type {{ name: string, outlined: boolean, covered: string }[]} */
  const order = [];
  for (let presses = 0; presses < 150; presses += 1) {
    await page.keyboard.press("Tab");
    const stop = await page.evaluate(() => {
      const element = document.activeElement;
      if (!element || element === document.body) return null;
      const style = getComputedStyle(element);
      const box = element.getBoundingClientRect();
      const found = document.elementFromPoint(box.x + box.width / 2, box.y + Math.min(box.height, 40) / 2);
      const seen = found !== null && (element.contains(found) || found.contains(element) || element.matches("td") || (element instanceof HTMLInputElement && found.closest("label") !== null));
      return {
        name: element.id || element.getAttribute("data-task") || element.getAttribute("aria-label") || element.closest("[id]")?.id + ":" + (element.textContent ?? "").trim().slice(0, 30),
        outlined: style.outlineStyle !== "none" && parseFloat(style.outlineWidth) >= 1,
        covered: seen ? "" : (found?.outerHTML.slice(0, 80) ?? "outside"),
      };
    });
    if (stop === null) return order;
    order.push(stop);
  }
  return order;
}

test("Tab goes through everything in reading order, ends, and is always visible (2.1.2, 2.4.3, 2.4.7, 2.4.11)", async () => {
  const { page } = await browser.open("hosted", { viewport: { width: 1360, height: 900 } });
  await paste(page, FILM);
  await inEachTask(page, async (task) => {
    const order = await tabOrder(page);
    const names = order.map((stop) => stop.name);
    assert.ok(order.length < 150, `${task}: Tab does not end`);
    assert.equal(new Set(names).size, names.length, `${task}: twice at the same place: ${names.join(", ")}`);
    const head = ["skip", "realizability", "properties", "undo", "open-file", "save-file", "copy-link"];
    assert.deepEqual(names.filter((name) => head.includes(name)), head, task);
    const aside = ["order", "decimal", "normalised", "absolute", "as-text", "clear", "example", "noise-none", "first-index", "retardance-unit", "form", "save-results"];
    assert.deepEqual(names.filter((name) => aside.includes(name)), aside, task);
    assert.equal(names.filter((name) => /^m\d\d, /.test(name)).length, 1, `${task}: the grid is one stop`);
    assert.deepEqual(order.filter((stop) => !stop.outlined), [], `${task}: no outline`);
    assert.deepEqual(order.filter((stop) => stop.covered !== ""), [], `${task}: covered`);
  });
  await page.context().close();
});

test("320 px wide, or 1280 px at 400 %, nothing scrolls sideways (1.4.10); with wide text spacing neither (1.4.12)", async () => {
  const { page } = await browser.open("hosted", { viewport: { width: 320, height: 256 } });
  const fits = async (/** @type {string} */ what) => {
    const [wide, room] = await page.evaluate(() => [document.documentElement.scrollWidth, innerWidth]);
    assert.ok(Number(wide) <= Number(room), `${what}: ${wide} px in ${room}`);
  };
  await fits("empty");
  await paste(page, FILM);
  const openAll = () => page.evaluate(() => document.querySelectorAll("details").forEach((fold) => (fold.open = true)));
  await inEachTask(page, async (task) => {
    await openAll();
    await fits(task);
    // What is wider than the page scrolls in a frame that the keyboard reaches.
    const lost = await page.evaluate(() =>
      [...document.querySelectorAll("#task *")]
        .filter((element) => ["auto", "scroll"].includes(getComputedStyle(element).overflowX) && element.scrollWidth > element.clientWidth + 1)
        .filter((element) => !(element instanceof HTMLElement && element.tabIndex >= 0) && !element.matches("textarea"))
        .map((element) => element.outerHTML.slice(0, 120)),
    );
    assert.deepEqual(lost, [], task);
  });
  await page.evaluate(() => {
    for (const element of document.querySelectorAll("body, body *")) {
      if (element instanceof HTMLElement) {
        element.style.lineHeight = "1.5";
        element.style.letterSpacing = "0.12em";
        element.style.wordSpacing = "0.16em";
      }
    }
  });
  await page.setViewportSize({ width: 640, height: 600 });
  await fits("spaced");
  const cut = await page.evaluate(() =>
    [...document.querySelectorAll("button, summary, h1, h2, h3, label, p")]
      .filter((element) => getComputedStyle(element).overflow === "hidden" && element.scrollHeight > element.clientHeight + 2)
      .map((element) => element.outerHTML.slice(0, 120)),
  );
  assert.deepEqual(cut, []);
  await page.context().close();
});

/** @param {string} hex */
function luminance(hex) {
  const [r = 0, g = 0, b = 0] = [1, 3, 5].map((k) => {
    const part = parseInt(hex.slice(k, k + 2), 16) / 255;
    return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4;
  });
  return 0.2126 * r + 0.7152 * g + 0.0722 * b;
}

/** @param {string} one @param {string} other */
function contrast(one, other) {
  const [light = 0, dark = 0] = [luminance(one), luminance(other)].sort((a, b) => b - a);
  return (light + 0.05) / (dark + 0.05);
}

test("the palette: text 4.5 to 1, edges and marks 3 to 1, in both themes (1.4.3, 1.4.11)", () => {
  const style = readFileSync(new URL("../../www/style.css", import.meta.url), "utf8");
  const [light = "", dark = ""] = [...style.matchAll(/:root \{([^}]*)\}/g)].map((match) => match[1] ?? "");
  for (const [theme, block] of Object.entries({ light, dark })) {
    const token = (/** @type {string} */ name) => {
      const hex = new RegExp(`--${name}: (#[0-9a-f]{6})`).exec(block)?.[1];
      assert.ok(hex, `${theme}: --${name}`);
      return String(hex);
    };
    for (const ground of ["ground", "panel"]) {
      for (const text of ["ink", "mute", "accent", "warn", "bad", "good"]) {
        const ratio = contrast(token(text), token(ground));
        assert.ok(ratio >= 4.5, `${theme}: ${text} on ${ground} ${ratio.toFixed(2)}`);
      }
      for (const mark of ["edge", "above", "below", "accent"]) {
        const ratio = contrast(token(mark), token(ground));
        assert.ok(ratio >= 3, `${theme}: ${mark} on ${ground} ${ratio.toFixed(2)}`);
      }
    }
    assert.ok(contrast(token("on-accent"), token("accent")) >= 4.5, theme);
  }
});

test("nothing moves for those who asked for that, and every change is said (2.3.3, 4.1.3)", async () => {
  const { page } = await browser.open("hosted", { reducedMotion: "reduce" });
  await paste(page, FILM);
  assert.equal(await page.evaluate(() => document.getAnimations().length), 0);
  const status = page.locator("#status");
  await page.locator("#status", { hasText: "Not realizable" }).waitFor();
  assert.equal(await status.getAttribute("role"), "status");
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.004");
  await page.locator("#status", { hasText: "within noise" }).waitFor();
  await page.locator("#undo").click();
  await page.locator("#status", { hasText: "Undone: the change of σ" }).waitFor();
  await page.evaluate(() => (location.hash = "#v1.abcdefghijkl.1234567"));
  await page.locator("#status", { hasText: /link/ }).waitFor();
  await page.context().close();
});

test("an error stands in words beside its field, with a way out (3.3.1, 3.3.3)", async () => {
  const { page } = await browser.open("hosted");
  await paste(page, FILM);
  const cell = page.locator("#matrix-grid td").nth(2);
  await cell.focus();
  await page.keyboard.type("1.2.3");
  await page.keyboard.press("Enter");
  const message = await cell.getAttribute("aria-errormessage");
  assert.match((await page.locator(`#${message}`).textContent()) ?? "", /^m02: .*two decimal marks/);
  await cell.focus();
  await page.keyboard.type("abc");
  await page.keyboard.press("Enter");
  assert.match((await page.locator("#grid-errors").textContent()) ?? "", /Write it like 0\.1234/);
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("-1");
  assert.equal(await page.locator("#sigma").getAttribute("aria-invalid"), "true");
  assert.match((await page.locator(`#${await page.locator("#sigma").getAttribute("aria-describedby")}`).textContent()) ?? "", /above zero/);
  await page.context().close();
});

test("headings, landmarks, language and title (1.3.1, 2.4.2, 2.4.6, 3.1.1)", async () => {
  const { page } = await browser.open("hosted");
  await paste(page, FILM);
  await inEachTask(page, async (task) => {
    const levels = await page.locator("#task :is(h1, h2, h3)").evaluateAll((heads) => heads.filter((head) => head.checkVisibility()).map((head) => Number(head.tagName[1])));
    assert.equal(levels[0], 1, task);
    assert.equal(levels.filter((level) => level === 1).length, 1, task);
    levels.forEach((level, k) => assert.ok(level <= (levels[k - 1] ?? 1) + 1, `${task}: h${level} follows h${levels[k - 1]}`));
    for (const landmark of ["header", "nav", "main", "aside"]) assert.ok((await page.locator(landmark).count()) >= 1, landmark);
    assert.match(await page.title(), /^Not realizable as it stands.* · Halfshade$/);
  });
  assert.equal(await page.locator("html").getAttribute("lang"), "en");
  await page.context().close();
});

test("forced colours: cells keep their borders, and the pictures are not lost", async () => {
  const { page } = await browser.open("hosted", { forcedColors: "active" });
  await paste(page, FILM);
  const border = await page.locator("#matrix-grid td").first().evaluate((cell) => getComputedStyle(cell).borderTopWidth);
  assert.ok(parseFloat(border) >= 1);
  await inEachTask(page, async (task) => {
    if (task === "train") return;
    const name = task === "properties" ? "sphere" : "eigenvalues";
    const colours = await page.locator(`#plot-${name}`).evaluate((element) => {
      const canvas = /** @type {HTMLCanvasElement} */ (element);
      const data = canvas.getContext("2d")?.getImageData(0, 0, canvas.width, canvas.height).data ?? [];
      return new Set(new Uint32Array(new Uint8Array(data).buffer)).size;
    });
    assert.ok(colours > 5, task);
    // The system's own: its ground in the corner, its text and link colours somewhere.
    const missing = await page.locator(`#plot-${name}`).evaluate((element) => {
      const canvas = /** @type {HTMLCanvasElement} */ (element);
      const data = canvas.getContext("2d")?.getImageData(0, 0, canvas.width, canvas.height).data ?? [];
      const seen = new Set();
      for (let k = 0; k < data.length; k += 4) seen.add(`rgb(${data[k]}, ${data[k + 1]}, ${data[k + 2]})`);
      const probe = document.body.appendChild(document.createElement("span"));
      const colour = (/** @type {string} */ keyword) => {
        probe.style.color = keyword;
        return getComputedStyle(probe).color;
      };
      const wanted = ["Canvas", "CanvasText", "LinkText"].filter((keyword) => !seen.has(colour(keyword)));
      const corner = colour("Canvas") === `rgb(${data[0]}, ${data[1]}, ${data[2]})` ? [] : ["corner"];
      probe.remove();
      return [...wanted, ...corner];
    });
    assert.deepEqual(missing, [], task);
  });
  await page.context().close();
});
