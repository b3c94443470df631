// The page as a person uses it, in both of its forms: the hosted folder under a
// sub-path, and the single file by its file: address.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { FORMS, openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

// An invented kelp film; one row a line.
const FILM = [
  "0.9550\t0.0226\t0.0327\t0.0038",
  "0.0190\t0.6733\t0.2540\t-0.6306",
  "0.0297\t0.2500\t0.7353\t0.5698",
  "0.0003\t0.6339\t-0.5648\t0.4469",
].join("\r\n");
// A quarter-wave plate with its fast axis at 36°, as a textbook prints it.
const TEXTBOOK = "1 0 0 0\n0 0.0955 0.2939 -0.9511\n0 0.2939 0.9045 0.3090\n0 0.9511 -0.3090 0";
const axe = readFileSync(new URL("../../node_modules/axe-core/axe.min.js", import.meta.url), "utf8");

/** @type {Awaited<ReturnType<typeof openBrowser>>} */
let browser;
before(async () => {
  browser = await openBrowser();
});
after(() => browser.close());

/**
 * A paste event with text, as Ctrl+V makes it, on whatever has the keyboard.
 * @param {Page} page
 * @param {string} text
 */
async function paste(page, text) {
  await page.evaluate((text) => {
    const clipboardData = new DataTransfer();
    clipboardData.setData("text/plain", text);
    const target = document.activeElement ?? document.body;
    target.dispatchEvent(new ClipboardEvent("paste", { clipboardData, bubbles: true, cancelable: true }));
  }, text);
}

/** @param {Page} page @param {string | RegExp} title */
async function verdict(page, title) {
  await page.locator("#task-heading", { hasText: title }).waitFor({ timeout: 5000 });
}

/** @param {Page} page */
function cells(page) {
  return page.locator("#matrix-grid td").evaluateAll((boxes) => boxes.map((box) => box.getAttribute("title")));
}

/** How many colours a canvas holds: an empty one has one. @param {Page} page @param {string} name */
function colours(page, name) {
  return page.locator(`#plot-${name}`).evaluate((element) => {
    const canvas = /** @type {HTMLCanvasElement} */ (element);
    const data = canvas.getContext("2d")?.getImageData(0, 0, canvas.width, canvas.height).data ?? [];
    const seen = new Set();
    for (let k = 0; k < data.length; k += 4) seen.add(`${data[k]},${data[k + 1]},${data[k + 2]},${data[k + 3]}`);
    return seen.size;
  });
}

/** @param {import("./browser.mjs").WatchedPage} watched */
function clean({ violations, errors, requestsAfterReady }) {
  assert.deepEqual({ violations, errors, requestsAfterReady }, { violations: [], errors: [], requestsAfterReady: [] });
}

for (const form of FORMS) {
  test(`${form}: first run, paste, verdict, plots, noise, properties`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    assert.equal(await page.title(), "Halfshade: Mueller matrices, checked and explained");
    await verdict(page, "Paste a measured Mueller matrix");
    assert.equal(await page.locator("#example option").count(), 11);

    await paste(page, FILM);
    await verdict(page, "Not realizable as it stands; no noise is stated");
    await page.locator("#verdict-reason", { hasText: "would explain it" }).waitFor();
    assert.deepEqual((await cells(page)).slice(0, 2), ["m00 = 0.9550", "m01 = 0.0226"]);
    assert.match((await page.locator("#reading").textContent()) ?? "", /between tabs/);
    assert.ok((await colours(page, "eigenvalues")) > 10);
    assert.match((await page.locator("#plot-eigenvalues").getAttribute("aria-label")) ?? "", /λ1/);

    await page.locator("#noise-uniform").check();
    await page.locator("#sigma").fill("0,004");
    await verdict(page, "Not realizable, but within noise");
    await page.locator("#verdict-reason", { hasText: "(p = 0.4" }).waitFor();
    assert.match((await page.locator("#verdict-reason").textContent()) ?? "", /−0\.0038\(21\) of m00/);

    await page.locator('nav a[data-task="properties"]').click();
    await verdict(page, "Properties");
    for (const name of ["sphere", "ellipses"]) assert.ok((await colours(page, name)) > 10, name);
    const figures = (await page.locator("#figures").textContent()) ?? "";
    assert.match(figures, /Linear retardance62\.16\(17\)°/);
    assert.match(figures, /Isotropic depolarization α−0\.0056\(49\)/);
    // The picture turns by slider, by key and by named view, and says where it stands.
    await page.locator("#view-azimuth").fill("75");
    assert.match((await page.locator("#view-azimuth-number").inputValue()) ?? "", /75°/);
    await page.locator("#plot-sphere").press("ArrowLeft");
    assert.match((await page.locator("#view-azimuth-number").inputValue()) ?? "", /80°/);
    // A definition opens beside its figure.
    await page.locator("#about-retardanceDeg").click();
    assert.match((await page.locator("#define-retardanceDeg").textContent()) ?? "", /Lu & Chipman 1996/);
    clean(watched);
    await page.context().close();
  });

  test(`${form}: a whole session by keyboard, typed cell by cell`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    await page.locator("#matrix-grid td").first().focus();
    for (const number of TEXTBOOK.split(/\s/)) {
      await page.keyboard.type(number);
      await page.keyboard.press("Tab");
    }
    await verdict(page, /consistent with rounding to 4 decimals/);
    // Escape gives the old text back; Enter takes the new one and moves down.
    await page.locator("#matrix-grid td").nth(5).focus();
    await page.keyboard.type("9");
    await page.keyboard.press("Escape");
    assert.equal((await cells(page))[5], "m11 = 0.0955");
    await page.keyboard.press("F2");
    await page.keyboard.press("End");
    await page.keyboard.type("x");
    await page.keyboard.press("Enter");
    assert.equal(await page.locator('#matrix-grid td[aria-invalid="true"]').count(), 1);
    assert.match((await page.locator("#grid-errors").textContent()) ?? "", /m11: “0\.0955x” is not a number/);
    await page.locator("#stale").waitFor();
    await page.keyboard.press("Control+z");
    await page.locator("#stale").waitFor({ state: "hidden" });
    assert.equal((await cells(page))[5], "m11 = 0.0955");
    clean(watched);
    await page.context().close();
  });

  test(`${form}: a link shows a colleague the same`, async () => {
    const watched = await browser.open(form, { permissions: ["clipboard-read", "clipboard-write"] });
    const { page } = watched;
    await paste(page, FILM);
    await page.locator("#noise-uniform").check();
    await page.locator("#sigma").fill("0.004");
    await page.locator("summary", { hasText: "Change it" }).click();
    await page.locator("#convention-angles").selectOption("clockwise");
    await page.locator('nav a[data-task="properties"]').click();
    await page.locator("#copy-link").click();
    await page.locator("#status", { hasText: "Link copied" }).waitFor();
    const copied = await page.evaluate(() => navigator.clipboard.readText());
    const hash = /#\S+/.exec(copied)?.[0] ?? "";
    assert.match(hash, /^#v1\./);
    assert.equal(copied.includes("file:"), false, "a file address is useless to a colleague");
    const before = await page.locator("#figures").textContent();
    clean(watched);
    await page.context().close();

    // On any copy of the page, in a profile that has never seen it.
    for (const other of FORMS) {
      const fresh = await browser.open(other, { hash });
      await verdict(fresh.page, "Properties");
      await fresh.page.locator("#banner", { hasText: "Loaded from a link" }).waitFor();
      await fresh.page.locator("#figures", { hasText: "62.16(17)" }).waitFor();
      assert.equal(await fresh.page.locator("#figures").textContent(), before);
      assert.equal(await fresh.page.locator("#sigma").inputValue(), "0.004");
      assert.equal(await fresh.page.locator("#convention-angles").inputValue(), "clockwise");
      assert.equal(await fresh.page.locator("#raw-text").inputValue(), FILM.replaceAll("\r\n", "\n"));
      clean(fresh);
      await fresh.page.context().close();
    }

    // Pasted into the page it opens as well; cut or changed, it says so and keeps the work.
    const third = await browser.open(form);
    await paste(third.page, TEXTBOOK);
    await paste(third.page, copied.split("\n")[0] ?? "");
    await verdict(third.page, "Properties");
    for (const [bad, reason] of [
      [hash.slice(0, -4), /cut off/],
      [hash.replace("#v1", "#v7"), /newer version/],
      [`${hash.slice(0, 30)}${hash[30] === "A" ? "B" : "A"}${hash.slice(31)}`, /damaged/],
    ]) {
      await third.page.evaluate((bad) => {
        location.hash = bad;
      }, String(bad));
      await third.page.locator("#problem", { hasText: reason }).waitFor();
      assert.equal(await third.page.locator("#sigma").inputValue(), "0.004");
    }
    clean(third);
    await third.page.context().close();
  });

  test(`${form}: a bad paste is kept and explained, and nothing is lost`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    await paste(page, TEXTBOOK);
    await verdict(page, /rounding to 4 decimals/);
    const bad = "1 0 0 0\n0 1 0 0\n0 0 0,5.2 0\n0 0 0 1";
    await paste(page, bad);
    await page.locator("#raw-error", { hasText: "Line 3, character 5" }).waitFor();
    assert.match((await page.locator("#raw-error").textContent()) ?? "", /two decimal marks/);
    assert.equal(await page.locator("#raw-error mark").textContent(), "0,5.2");
    assert.equal(await page.locator("#raw-text").inputValue(), bad);
    // The last good matrix and its result stay, and are marked as not belonging to the text.
    assert.match((await page.locator("#stale").textContent()) ?? "", /last matrix that could be read/);
    assert.equal((await cells(page))[6], "m12 = 0.2939");
    await page.locator("#go-to-error").click();
    const selected = await page.locator("#raw-text").evaluate((area) => {
      const { selectionStart, selectionEnd, value } = /** @type {HTMLTextAreaElement} */ (area);
      return value.slice(selectionStart, selectionEnd);
    });
    assert.equal(selected, "0,5.2");
    await page.keyboard.type("1");
    await verdict(page, /^Realizable/);
    await page.locator("#undo").click();
    await page.locator("#undo").click();
    await verdict(page, /rounding to 4 decimals/);
    assert.equal(await page.locator("#raw-text").inputValue(), TEXTBOOK);
    clean(watched);
    await page.context().close();
  });

  test(`${form}: every action is one step of undo, and a reload brings the work back`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    const step = async (/** @type {() => Promise<unknown>} */ act) => {
      await act();
      states.push(await page.evaluate(() => document.querySelector("aside")?.textContent ?? ""));
    };
    /** @type {string[]} */
    const states = [];
    await step(async () => {});
    await step(() => paste(page, FILM));
    await step(() => page.locator("#normalised").selectOption("yes"));
    await step(() => page.locator("#order").selectOption("columns"));
    await step(() => page.locator("#noise-rounding").check());
    await step(() => page.locator("#use-nearest").click());
    await step(() => page.locator("#example").selectOption({ index: 3 }));
    await step(() => page.locator("#clear").click());
    for (let k = states.length - 2; k >= 0; k -= 1) {
      await page.locator("#undo").click();
      assert.equal(await page.evaluate(() => document.querySelector("aside")?.textContent), states[k], `undo to ${k}`);
    }
    assert.equal(await page.locator("#undo").isDisabled(), true);
    for (let k = 1; k <= 5; k += 1) await page.locator("#redo").click();
    assert.equal(await page.evaluate(() => document.querySelector("aside")?.textContent), states[5]);

    page.on("dialog", (dialog) => dialog.accept());
    const kept = await cells(page);
    await page.reload();
    await page.waitForSelector("html[data-ready=true]", { state: "attached" });
    assert.deepEqual(await cells(page), kept);
    assert.deepEqual(watched.violations, []);
    assert.deepEqual(watched.errors, []);
    await page.context().close();
  });

  test(`${form}: every example is read, judged, and marked as invented`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    /** @type {(string | null)[]} */
    const verdicts = [];
    for (let k = 1; k <= 10; k += 1) {
      await page.locator("#example").selectOption({ index: k });
      assert.match((await page.locator("#origin").textContent()) ?? "", /^Invented example: .+\. \S/);
      await page.waitForFunction(() => !/testing/.test(document.getElementById("task-heading")?.textContent ?? "testing"));
      verdicts.push(await page.locator("#task-heading").textContent());
    }
    // What each was made to show stands in demo-data/README.md.
    const count = (/** @type {RegExp} */ title) => verdicts.filter((each) => title.test(each ?? "")).length;
    assert.deepEqual(
      [count(/^Realizable$/), count(/^Not realizable, but within noise$/), count(/beyond noise$/), count(/^Not realizable as printed, but/)],
      [2, 5, 2, 1],
    );
    await paste(page, FILM);
    assert.equal(await page.locator("#origin").isVisible(), false);
    clean(watched);
    await page.context().close();
  });
}

test("the real clipboard: Ctrl+V anywhere, Ctrl+C in a cell", async () => {
  const { page } = await browser.open("hosted", { permissions: ["clipboard-read", "clipboard-write"] });
  await page.evaluate((text) => navigator.clipboard.writeText(text), FILM);
  await page.locator("#task").focus();
  await page.keyboard.press("Control+v");
  await verdict(page, "Not realizable as it stands");
  await page.locator("#matrix-grid td").nth(7).focus();
  await page.keyboard.press("Control+c");
  assert.equal(await page.evaluate(() => navigator.clipboard.readText()), "-0.6306");
  await page.locator("#nearest-matrix summary").click();
  await page.locator("#copy-nearest").click();
  await page.locator("#status", { hasText: "Copied at full precision" }).waitFor();
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  await paste(page, copied);
  await verdict(page, /^Realizable/);
  await page.context().close();
});

test("several matrices: one is picked; two readings: the person chooses", async () => {
  const { page } = await browser.open("hosted");
  await paste(page, `# first\n${FILM}\n\n# second\n${TEXTBOOK}\n`);
  await page.locator("#pick").waitFor();
  assert.match((await page.locator("#reading").textContent()) ?? "", /Read 2 matrices/);
  await page.locator("#pick").selectOption("1");
  await verdict(page, /rounding to 4 decimals/);
  // Every number could be grouped thousands or have a decimal comma.
  await paste(page, Array(4).fill("1,234 2,345 3,456 4,567").join("\n"));
  await page.locator(".alternative").nth(1).waitFor();
  await page.locator("#use-reading-1").click();
  const second = await cells(page);
  await page.locator("#undo").click();
  assert.notDeepEqual(await cells(page), second);
  await page.context().close();
});

for (const colorScheme of /** @type {const} */ (["light", "dark"])) {
  for (const width of [1360, 1000, 360]) {
    test(`axe finds nothing: ${colorScheme}, ${width} px, both tasks, with and without result, with errors`, async () => {
      const watched = await browser.open("hosted", { colorScheme, viewport: { width, height: 900 } });
      const { page } = watched;
      const check = async (/** @type {string} */ state) => {
        // The policy of the page forbids scripts of others, so axe comes in by the driver.
        await page.evaluate(axe);
        const found = await page.evaluate(async () => {
          const { axe } = /** @type {any} */ (globalThis);
          const { violations } = await axe.run(document, { rules: { "target-size": { enabled: true } } });
          return violations.map((/** @type {any} */ one) => `${one.id}: ${one.nodes.map((/** @type {any} */ node) => `${node.html.slice(0, 120)} ${node.failureSummary}`).join(" | ")}`);
        });
        assert.deepEqual(found, [], state);
        assert.ok(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), `${state}: no sideways scroll`);
      };
      await check("first run");
      await page.locator("#example").selectOption({ index: 1 });
      await page.waitForFunction(() => !/testing/.test(document.getElementById("task-heading")?.textContent ?? "testing"));
      await page.evaluate(() => document.querySelectorAll("details").forEach((fold) => (fold.open = true)));
      await check("realizability");
      await page.locator('nav a[data-task="properties"]').click();
      await page.evaluate(() => document.querySelectorAll("details").forEach((fold) => (fold.open = true)));
      await page.locator("#about-entropy").click();
      await check("properties");
      await paste(page, "1 0 0\n0 1 0 x");
      await page.locator("#raw-error p").first().waitFor();
      await check("error");
      await page.context().close();
    });
  }
}
