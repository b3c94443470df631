// The task Optical train: a list edited by keyboard and by drag, light followed, unknowns fitted,
// known optics taken away, links, JSON in and out, both themes.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

const axe = readFileSync(new URL("../../node_modules/axe-core/axe.min.js", import.meta.url), "utf8");
const EXAMPLE = JSON.parse(readFileSync(new URL("../../demo-data/train/kelp-film-behind-a-window.json", import.meta.url), "utf8"));
const CLIPBOARD = { permissions: ["clipboard-read", "clipboard-write"] };

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
}

/** @param {Parameters<typeof browser.open>[1]} [options] */
async function openTrain(options = CLIPBOARD) {
  const watched = await browser.open("hosted", options);
  await watched.page.locator('nav a[data-task="train"]').click();
  return watched;
}

/** @param {import("./browser.mjs").WatchedPage} watched */
async function clean({ page, violations, errors, requestsAfterReady }) {
  assert.deepEqual({ violations, errors, requestsAfterReady }, { violations: [], errors: [], requestsAfterReady: [] });
  await page.context().close();
}

/** What a button copies. @param {Page} page @param {string} selector */
async function copied(page, selector) {
  await page.evaluate(() => navigator.clipboard.writeText(""));
  await page.locator(selector).click();
  await page.waitForFunction(async () => (await navigator.clipboard.readText()) !== "");
  return page.evaluate(() => navigator.clipboard.readText());
}

/** The train as its button copies it. @param {Page} page */
async function exported(page) {
  return JSON.parse(await copied(page, "#copy-train-export, #train-export"));
}

/** The rows of the table of states, as numbers. @param {Page} page */
async function states(page) {
  const rows = await page.locator("#train-states tbody tr").evaluateAll((all) => all.map((row) => [...row.querySelectorAll("td")].map((cell) => cell.textContent ?? "")));
  return rows.map((row) => row.map((text) => Number(text.replace("\u2212", "-").replace("°", ""))));
}

/** The elements as they stand in the list. @param {Page} page */
function labels(page) {
  return page.locator("#train-list .element-label").evaluateAll((inputs) => inputs.map((input) => /** @type {HTMLInputElement} */ (input).value || /** @type {HTMLInputElement} */ (input).placeholder));
}

/** Press Tab until this has the keyboard. @param {Page} page @param {string} id */
async function tabTo(page, id) {
  for (let presses = 0; presses < 120; presses += 1) {
    const now = await page.evaluate(() => document.activeElement?.id || (document.activeElement?.getAttribute("data-task") ?? ""));
    if (now === id) return;
    await page.keyboard.press("Tab");
  }
  assert.fail(`Tab does not reach ${id}`);
}

/** @param {Page} page */
function focused(page) {
  return page.evaluate(() => document.activeElement?.id ?? "");
}

/** Choose from a select by its keys: the first letters of the words. @param {Page} page @param {string} id @param {string} words */
async function choose(page, id, words) {
  await tabTo(page, id);
  await page.keyboard.type(words);
  const chosen = await page.locator(`#${id} option:checked`).textContent();
  assert.ok(chosen?.startsWith(words), `${chosen}, not ${words}`);
}

/** Row times column. @param {number[]} one @param {number[]} other */
function product(one, other) {
  return one.map((_, k) => [0, 1, 2, 3].reduce((sum, i) => sum + (one[4 * Math.floor(k / 4) + i] ?? NaN) * (other[4 * i + (k % 4)] ?? NaN), 0));
}

/** @param {number[]} found @param {number[]} wanted @param {number} tolerance @param {string} [what] */
function near(found, wanted, tolerance, what = "") {
  assert.equal(found.length, wanted.length, what);
  wanted.forEach((value, k) => assert.ok(Math.abs((found[k] ?? NaN) - value) <= tolerance, `${what} ${k}: ${found[k]}, not ${value}`));
}

// Malus, and a polarizer at 45° between crossed ones: ½ · cos² 45° · cos² 45° = 1/8 (derived).
test("by keyboard alone: add, set, move, duplicate, take out, delete, undo", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  await tabTo(page, "train");
  await page.keyboard.press("Enter");
  await page.locator("#task-heading", { hasText: "Optical train" }).waitFor();
  for (let k = 0; k < 3; k += 1) {
    await choose(page, "train-kind", "Polarizer");
    await tabTo(page, "train-add");
    await page.keyboard.press("Enter");
  }
  await choose(page, "train-source", "unpolarized");
  // Back to the list, from the start of the page.
  await page.evaluate(() => document.getElementById("skip")?.focus());
  await tabTo(page, "train-1-axisDeg-value");
  await page.keyboard.type("45");
  await tabTo(page, "train-2-label");
  await page.keyboard.type("analyser");
  await tabTo(page, "train-2-axisDeg-value");
  await page.keyboard.type("90");
  near((await states(page)).map((row) => row[0] ?? NaN), [1, 0.5, 0.25, 0.125], 1e-12, "power");
  near((await states(page)).map((row) => row[2] ?? NaN).slice(1), [0, 45, 90], 1e-9, "azimuth");
  // The analyser to the front: the keyboard goes with it.
  await page.evaluate(() => document.getElementById("skip")?.focus());
  await tabTo(page, "train-2-up");
  await page.keyboard.press("Enter");
  assert.equal(await focused(page), "train-1-up");
  await page.keyboard.press("Enter");
  assert.equal(await focused(page), "train-0-down");
  assert.equal(await page.locator("#status").textContent(), "analyser is now element 1 of 3.");
  assert.deepEqual(await labels(page), ["analyser", "linear diattenuator", "linear diattenuator"]);
  near((await states(page)).map((row) => row[0] ?? NaN), [1, 0.5, 0, 0], 1e-12, "crossed");
  await page.locator("#train-notes", { hasText: /No light is left after/ }).waitFor();
  await tabTo(page, "train-0-copy");
  await page.keyboard.press("Enter");
  assert.deepEqual((await labels(page)).slice(0, 2), ["analyser", "analyser"]);
  assert.equal(await focused(page), "train-1-copy");
  await tabTo(page, "train-1-delete");
  await page.keyboard.press("Enter");
  assert.equal(await focused(page), "train-1-delete");
  assert.deepEqual(await labels(page), ["analyser", "linear diattenuator", "linear diattenuator"]);
  await page.evaluate(() => document.getElementById("skip")?.focus());
  await tabTo(page, "train-1-on");
  await page.keyboard.press("Space");
  assert.equal((await exported(page)).train[1].disabled, true);
  // Without it, 90° and 45°: ½ · ½.
  await page.locator("#train-2-axisDeg-value").fill("45");
  near([(await states(page)).at(-1)?.[0] ?? NaN], [0.25], 1e-12);
  // Unpolarized light, then V twice, then +45°, on the sphere.
  await page.locator('#plot-train-path[aria-label*="0 at (0.000, 0.000, 0.000); 1 at (−1.000, "][aria-label*="3 at (0.000, 1.000, 0.000)"]').waitFor({ timeout: 5000 });
  for (const name of ["axis", "out of the beam", "deleting", "duplicating", "moving", "moving"]) {
    assert.match((await page.locator("#undo").getAttribute("title")) ?? "", new RegExp(name));
    await page.locator("#undo").click();
  }
  near((await states(page)).map((row) => row[0] ?? NaN), [1, 0.5, 0.25, 0.125], 1e-12, "undone");
  await clean(watched);
});

// A quarter-wave plate at ±45° to linear light makes circular light, of opposite senses (by definition).
test("every entry of the menu is taken; a quarter-wave plate makes circular light both ways round", async () => {
  const watched = await openTrain();
  const { page } = watched;
  const entries = await page.locator("#train-kind option").evaluateAll((options) => options.map((option) => /** @type {HTMLOptionElement} */ (option).value));
  assert.equal(entries.length, 16);
  for (const entry of entries) {
    await page.locator("#train-kind").selectOption(entry);
    await page.locator("#train-add").click();
  }
  assert.equal(await page.locator("#train-states tbody tr").count(), 1 + entries.length);
  assert.equal(await page.locator("#train-list .wrong:not([hidden])").count(), 0);
  await paste(page, JSON.stringify([{ kind: "linearRetarder", parameters: { retardanceDeg: { value: 90 }, axisDeg: { value: 45 } } }]));
  near([Math.abs((await states(page))[1]?.[3] ?? NaN)], [45], 1e-9);
  const one = (await states(page))[1]?.[3] ?? NaN;
  await page.locator("#train-0-axisDeg-value").fill("-45");
  near([(await states(page))[1]?.[3] ?? NaN], [-one], 1e-9);
  // The same light in words of the other sense of S3.
  await page.locator("#train-source-1").fill("0.5");
  near([(await states(page))[0]?.[1] ?? NaN], [0.5], 1e-12, "a partly polarized source");
  assert.equal(await page.locator("#train-source").inputValue(), "");
  await clean(watched);
});

test("what is typed stays, its error stands beside it in words, and the last number is used", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await paste(page, JSON.stringify([{ kind: "linearRetarder", label: "plate", parameters: { retardanceDeg: { value: 90 }, axisDeg: { value: 10 } } }]));
  const field = page.locator("#train-0-axisDeg-value");
  await field.fill("22.50");
  await field.blur();
  assert.equal(await field.inputValue(), "22.50", "as it was typed");
  await field.fill("22.5.1");
  await field.blur();
  assert.equal(await field.inputValue(), "22.5.1");
  assert.equal(await field.getAttribute("aria-invalid"), "true");
  const told = page.locator(`#${await field.getAttribute("aria-describedby")}`);
  assert.match((await told.textContent()) ?? "", /two decimal marks.*last number is still used/);
  assert.equal(await page.locator("#train-list .wrong:not([hidden])").count(), 1, "said once");
  assert.equal((await exported(page)).train[0].parameters.axisDeg.value, 22.5);
  await page.reload();
  await page.waitForSelector("html[data-ready=true]", { state: "attached" });
  assert.equal(await field.inputValue(), "22.5.1", "also after a reload");
  await field.fill("30");
  assert.equal(await field.getAttribute("aria-invalid"), "false");
  assert.equal(await told.isVisible(), false);
  await field.blur();
  // What the engine refuses stands there too.
  await paste(page, JSON.stringify([{ kind: "isotropicDepolarizer", parameters: { alpha: { value: 0.2 } } }, { kind: "linearDiattenuator", parameters: { transmittanceMax: { value: 1 }, transmittanceMin: { value: 0 }, axisDeg: { value: 0 } } }]));
  await page.locator("#train-1-transmittanceMin-value").fill("-1");
  await page.locator("#train-error-1-transmittanceMin:not([hidden])").waitFor();
  await page.locator("#train-light", { hasText: "cannot be followed" }).waitFor();
  await page.locator("#train-source-1").fill("2");
  await page.locator("#train-1-transmittanceMin-value").fill("0");
  await page.locator("#train-source-error", { hasText: /S0/ }).waitFor();
  await clean({ ...watched, requestsAfterReady: [] });
});

test("ties: factor and offset, kept through moves, dissolved where their element goes", async () => {
  const watched = await openTrain();
  const { page } = watched;
  const plate = { kind: "linearRetarder", parameters: { retardanceDeg: { value: 90 }, axisDeg: { value: 10 } } };
  await paste(page, JSON.stringify({ train: [{ ...plate, label: "first" }, { ...plate, label: "second" }, { kind: "rotator", parameters: { angleDeg: { value: 5 } } }] }));
  await page.locator("#train-1-axisDeg-role").selectOption("tie");
  assert.equal(await page.locator("#train-1-axisDeg-target").inputValue(), "0.axisDeg");
  await page.locator("#train-1-axisDeg-factor").fill("-1");
  await page.locator("#train-1-axisDeg-offset").fill("50");
  assert.deepEqual((await exported(page)).train[1].parameters.axisDeg.tie, { element: 0, name: "axisDeg", factor: -1, offset: 50 });
  // Two half-wave plates at a and b rotate by 2 (b − a): at 10° and 40°, linear light at 0° goes to 60° (derived).
  await page.locator("#train-0-retardanceDeg-value").fill("180");
  await page.locator("#train-1-retardanceDeg-value").fill("180");
  near([(await states(page))[2]?.[2] ?? NaN], [60], 0.005);
  await page.locator("#train-0-down").click();
  await page.locator("#train-1-down").click();
  assert.equal((await exported(page)).train[0].parameters.axisDeg.tie.element, 2);
  await page.locator("#train-2-delete").click();
  assert.deepEqual((await exported(page)).train[0].parameters.axisDeg, { value: 40 });
  await page.locator("#undo").click();
  assert.equal((await exported(page)).train[0].parameters.axisDeg.tie.element, 2);
  await clean(watched);
});

test("an element is dragged to another place, as one step", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await paste(page, JSON.stringify(["a", "b", "c"].map((label) => ({ kind: "rotator", label, parameters: { angleDeg: { value: 5 } } }))));
  const drag = async (/** @type {number} */ from, /** @type {number} */ to) => {
    await page.locator("#train-list .handle").nth(from).scrollIntoViewIfNeeded();
    const [start, end] = await Promise.all([page.locator("#train-list .handle").nth(from).boundingBox(), page.locator("#train-list li").nth(to).boundingBox()]);
    if (!start || !end) throw new Error("not seen");
    await page.mouse.move(start.x + 6, start.y + 6);
    await page.mouse.down();
    await page.mouse.move(start.x + 8, end.y + end.height / 2, { steps: 4 });
    await page.mouse.up();
  };
  await drag(0, 2);
  assert.deepEqual(await labels(page), ["b", "c", "a"]);
  await drag(2, 1);
  assert.deepEqual(await labels(page), ["b", "a", "c"]);
  await page.locator("#undo").click();
  await page.locator("#undo").click();
  assert.deepEqual(await labels(page), ["a", "b", "c"]);
  await clean(watched);
});

// The invented film was made with a transmittance of 0.83, a diattenuation of 0.06, a retardance
// of 64°, an axis at 31° and a depolarization of 0.05 (demo-data/README.md).
test("the invented example: fitted within three standard errors, used, undone", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await page.locator("#train-example").click();
  await page.locator("#origin", { hasText: "Invented example" }).waitFor();
  assert.deepEqual(await labels(page), ["window", "film", "haze of the film", "mirror"]);
  await page.locator("#train-fit-start").click();
  await page.locator("#train-fitted").waitFor({ timeout: 20_000 });
  const rows = await page.locator("#train-fitted tbody tr td:nth-child(2)").allTextContents();
  const truth = [0.83, 0.06, 64, 31, 0.05];
  assert.equal(rows.length, truth.length);
  rows.forEach((text, k) => {
    const [, value = "", digits = ""] = /^(-?[\d.]+)\((\d+)\)/.exec(text.replace("\u2212", "-")) ?? [];
    const se = Number(digits) * 10 ** -(value.split(".")[1]?.length ?? 0);
    assert.ok(se > 0 && Math.abs(Number(value) - (truth[k] ?? NaN)) <= 3 * se, `${text}, not ${truth[k]}`);
  });
  await page.locator("#train-fit-quality", { hasText: /within its noise.*11 degrees of freedom/ }).waitFor();
  await page.locator("#train-equivalents", { hasText: /axes of film .* exchanged/ }).waitFor();
  assert.equal(await page.locator('table[aria-label="Measured minus fitted, in σ"] td').count(), 16);
  await page.locator("#train-use-fit").click();
  const used = (await exported(page)).train[1].parameters;
  near([used.transmittance.value, used.retardanceDeg.value], [0.83, 64], 0.5);
  assert.notEqual(used.retardanceDeg.value, 60);
  assert.equal(used.retardanceDeg.free, true);
  assert.equal(await page.locator("#train-fitted").count(), 1, "the report of the same problem stays");
  await page.locator("#undo").click();
  assert.equal((await exported(page)).train[1].parameters.retardanceDeg.value, 60);
  // Another problem is another fit.
  await page.locator("#train-1-retardanceDeg-role").selectOption("fix");
  await page.locator("#train-fit-start", { hasText: "Fit 4 free" }).waitFor();
  assert.equal(await page.locator("#train-fitted").count(), 0);
  await clean(watched);
});

test("two retardances in line are named as not told apart; a long fit can be stopped", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await page.locator("#train-example").click();
  const plate = (/** @type {boolean} */ free) => ({ kind: "linearRetarder", parameters: { retardanceDeg: { value: 40, free: true }, axisDeg: { value: 20, free } } });
  await paste(page, JSON.stringify({ train: [plate(false), plate(false)] }));
  await page.locator("#train-fit-start").click();
  await page.locator("#train-null li", { hasText: /sum/ }).waitFor({ timeout: 20_000 });
  const film = { kind: "alignedDiattenuatingRetarder", parameters: Object.fromEntries([["transmittance", 0.9], ["diattenuation", 0.1], ["retardanceDeg", 50], ["axisDeg", 20]].map(([name, value]) => [name, { value, free: true }])) };
  await paste(page, JSON.stringify({ train: Array(6).fill(film) }));
  await page.locator("#train-fit-start").click();
  await page.locator("#train-fit-stop").click({ timeout: 5000 });
  await page.locator("#status", { hasText: "The fit was stopped" }).waitFor();
  assert.equal(await page.locator("#train-fitted").count(), 0);
  assert.equal(await focused(page), "train-fit-start");
  await clean(watched);
});

test("known optics are taken away and the sample is used, in one step that can be undone", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await page.locator("#train-example").click();
  const result = page.locator('table[aria-label="The sample alone"].numbers td');
  await result.first().waitFor({ state: "attached" });
  const sample = (await result.evaluateAll((cells) => cells.map((cell) => cell.getAttribute("title") ?? ""))).map(Number);
  // By definition: behind · sample · before is what was measured.
  near(product(EXAMPLE.post.mueller, product(sample, EXAMPLE.pre.mueller)), EXAMPLE.measurement.mueller, 1e-12, "put back");
  await page.locator("#train-condition", { hasText: /Condition number \d/ }).waitFor();
  assert.equal(await page.locator('table[aria-label="Growth of σ"] td').count(), 16);
  // Other ends: only the mirror is known.
  await page.locator("#train-before").selectOption("0");
  await page.waitForFunction((first) => document.querySelector('table[aria-label="The sample alone"].numbers td')?.getAttribute("title") !== first, String(sample[0]));
  assert.equal((await exported(page)).pre, undefined);
  await page.locator("#undo").click();
  await page.locator(`table[aria-label="The sample alone"].numbers td[title="${sample[0]}"]`).waitFor({ state: "attached" });
  await page.locator("#train-use-removed").click();
  const grid = await page.locator("#matrix-grid td").evaluateAll((boxes) => boxes.map((box) => (box.getAttribute("title") ?? "").split(" = ")[1] ?? ""));
  near(grid.map((text) => Number(text.replace("\u2212", "-"))), sample, 0, "in the grid");
  assert.equal(await page.locator("#noise-covariance").isChecked(), true);
  const after = await exported(page);
  assert.deepEqual(after.train.map((/** @type {any} */ element) => element.disabled ?? false), [true, false, false, true]);
  assert.equal(after.pre ?? after.post, undefined);
  // The film alone, from what is left.
  await page.locator("#train-fit-start").click();
  await page.locator("#train-fit-quality", { hasText: /within its noise/ }).waitFor({ timeout: 20_000 });
  await page.locator("#undo").click();
  assert.equal(await page.locator("#noise-uniform").isChecked(), true);
  assert.deepEqual(EXAMPLE.train, (await exported(page)).train);
  // A polarizer takes too much with it.
  await paste(page, JSON.stringify({ train: [{ kind: "linearDiattenuator", label: "sheet", parameters: { transmittanceMax: { value: 1 }, transmittanceMin: { value: 0 }, axisDeg: { value: 0 } } }] }));
  await page.locator("#train-before").selectOption("1");
  await page.locator("#train-removed .wrong", { hasText: /cannot be taken away/ }).waitFor();
  await clean(watched);
});

test("a link and JSON bring back everything: order, roles, bounds, ties, source, ends, and what was typed", async () => {
  const watched = await openTrain();
  const { page } = watched;
  await page.locator("#train-example").click();
  await page.locator("#train-1-retardanceDeg-low").fill("20");
  await page.locator("#train-1-retardanceDeg-high").fill("100");
  await page.locator("#train-2-alpha-role").selectOption("tie");
  await page.locator("#train-2-on").uncheck();
  await page.locator("#train-reflection").check();
  await page.locator("#train-direct").check();
  await page.locator("#train-source-3").fill("0.25");
  await page.locator("#train-source-1").fill("-0.5");
  await page.locator("#train-1-axisDeg-value").fill("31,,");
  const before = await exported(page);
  assert.equal(before.removal.reflection, true);
  await page.locator("#copy-link").click();
  await page.waitForFunction(() => location.hash.startsWith("#v1."));
  const hash = await page.evaluate(() => location.hash);
  const second = await browser.open("hosted", { ...CLIPBOARD, hash });
  await second.page.locator("#train-states").waitFor();
  assert.deepEqual(await exported(second.page), before);
  assert.equal(await second.page.locator("#train-1-axisDeg-value").inputValue(), "31,,");
  assert.deepEqual(await second.page.locator("#train-before, #train-behind").evaluateAll((all) => all.map((one) => /** @type {HTMLSelectElement} */ (one).value)), ["1", "1"]);
  await clean(second);
  const third = await openTrain();
  await paste(third.page, JSON.stringify(before));
  await third.page.locator("#status", { hasText: "Read a train of 4 elements" }).waitFor();
  assert.deepEqual(await exported(third.page), before);
  // What is no train, or a wrong one, changes nothing and says why.
  await paste(third.page, '{"train": [{"kind": "prism of glass"}]}');
  await third.page.locator("#problem", { hasText: /kind/ }).waitFor();
  assert.deepEqual(await exported(third.page), before);
  await paste(third.page, EXAMPLE.measurement.mueller.join(" "));
  assert.match((await third.page.locator("#matrix-grid td").first().getAttribute("title")) ?? "", /0\.65445/);
  assert.deepEqual(await exported(third.page), before);
  await clean(third);
  await clean(watched);
});

for (const colorScheme of /** @type {const} */ (["light", "dark"])) {
  for (const width of [1360, 360]) {
    test(`axe finds nothing: ${colorScheme}, ${width} px, empty, full, with errors`, async () => {
      const watched = await openTrain({ colorScheme, viewport: { width, height: 900 } });
      const { page } = watched;
      const check = async (/** @type {string} */ state) => {
        await page.evaluate(() => document.querySelectorAll("details").forEach((fold) => (fold.open = true)));
        await page.evaluate(axe);
        const found = await page.evaluate(async () => {
          const { axe } = /** @type {any} */ (globalThis);
          const { violations } = await axe.run(document, { rules: { "target-size": { enabled: true } } });
          return violations.map((/** @type {any} */ one) => `${one.id}: ${one.nodes.map((/** @type {any} */ node) => `${node.html.slice(0, 120)} ${node.failureSummary}`).join(" | ")}`);
        });
        assert.deepEqual(found, [], state);
        assert.ok(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), `${state}: no sideways scroll`);
      };
      await check("empty");
      await page.locator("#train-example").click();
      await page.locator("#train-fit-start").click();
      await page.locator("#train-fitted").waitFor({ timeout: 20_000 });
      await page.locator("#train-condition").waitFor();
      await check("fitted");
      await page.locator("#train-2-alpha-role").selectOption("tie");
      await page.locator("#train-1-axisDeg-value").fill("x");
      await page.locator("#train-0-matrix").fill("1 2 3");
      await page.locator("#train-1-on").uncheck();
      await check("with errors");
      await page.context().close();
    });
  }
}
