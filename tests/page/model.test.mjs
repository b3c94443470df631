// The task Model selection, by keyboard too: the table, the choice, the place of the
// depolarization, profile, samples, files, the link, and both themes for everyone.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { createRequire } from "node:module";
import { after, before, test } from "node:test";
import { openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

// Invented: a kelp film, δ = 58°, with some diattenuation and α = 0.132, σ = 0.004.
const FILM = ["0.9468 -0.0564 0.0692 0.0017", "-0.0107 0.6453 0.2882 -0.4184", "0.0482 0.0963 0.5972 0.5529", "-0.0764 0.5075 -0.4868 0.4276"].join("\n");
const AXE = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");

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

/** @param {Page} page @param {string} selector @param {RegExp} pattern */
async function says(page, selector, pattern) {
  await page.locator(selector, { hasText: pattern }).first().waitFor({ timeout: 5000 });
}

/** @param {import("./browser.mjs").WatchedPage} watched */
async function clean({ page, violations, errors, requestsAfterReady }) {
  assert.deepEqual({ violations, errors, requestsAfterReady }, { violations: [], errors: [], requestsAfterReady: [] });
  await page.context().close();
}

/** @param {Page} page */
async function open(page) {
  await paste(page, FILM);
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.004");
  await page.locator('nav a[data-task="model"]').click();
  await says(page, "#model-reason", /parameters suffice/);
}

test("the smallest model, another one by keyboard, undo, and a link with the choice", async () => {
  const watched = await browser.open("hosted", { permissions: ["clipboard-read", "clipboard-write"] });
  const { page } = watched;
  await open(page);
  const recommended = await page.locator("tr.recommended input").getAttribute("id");
  assert.equal(await page.locator("tr.recommended").count(), 1);
  assert.equal(await page.locator("tr.recommended input").isChecked(), true);
  assert.equal(await page.locator(".candidates tbody tr").count(), 12);
  // By keyboard: one group of choices.
  await page.locator(`#${recommended}`).focus();
  for (let k = 0; k < 12 && !(await page.locator("#model-pureDiagonal").isChecked()); k += 1) await page.keyboard.press("ArrowDown");
  assert.equal(await page.evaluate(() => document.activeElement?.id), "model-pureDiagonal");
  await says(page, "#model-panel h2", /diagonal depolarizer/);
  await page.locator("#fit-side").focus();
  await page.locator("#fit-side").selectOption({ value: "before" });
  await says(page, "#model-reason", /./);
  await page.waitForFunction(() => document.querySelectorAll(".candidates tbody tr").length === 12);
  assert.equal(await page.locator("#model-pureDiagonal").isChecked(), true);
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  // Back to the recommended one, step by step.
  await page.locator("#undo").click();
  assert.equal(await page.locator("#fit-side").inputValue(), "parallel");
  while (!(await page.locator(`#${recommended}`).isChecked())) await page.locator("#undo").click();
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await says(fresh.page, "#model-panel h2", /diagonal depolarizer/);
  assert.equal(await fresh.page.locator("#fit-side").inputValue(), "before");
  assert.equal(await fresh.page.locator("#model-pureDiagonal").isChecked(), true);
  await clean(fresh);
});

test("profile, samples with a stop, files, and the fitted matrix as the measured one", async () => {
  const watched = await browser.open("hosted", { permissions: ["clipboard-read", "clipboard-write"] });
  const { page } = watched;
  await open(page);
  await page.locator("#model-pureIsotropic").check();
  await says(page, "#model-panel h2", /isotropic/);
  await says(page, "#model-panel", /Constant stray light looks the same/);
  await page.locator("#profile-alpha").focus();
  await page.keyboard.press("Enter");
  await says(page, "#profile-said", /rises by 3\.84.*from 0\.\d+ to 0\.\d+/);
  await page.waitForFunction(() => /95 %/.test(document.getElementById("plot-profile")?.getAttribute("aria-label") ?? ""));
  await page.locator("#bootstrap").click();
  await page.locator("#samples-heading").waitFor({ timeout: 20000 });
  await says(page, "#samples", /500 simulated measurements/);
  await page.locator("#bootstrap").click();
  await page.locator("#stop-bootstrap").click();
  await says(page, "#samples", /simulated measurements|Stopped/);

  const save = async (/** @type {string} */ id) => {
    const [download] = await Promise.all([page.waitForEvent("download"), page.locator(id).click()]);
    return { name: download.suggestedFilename(), text: readFileSync(await download.path(), "utf8") };
  };
  const json = await save("#save-fit-json");
  assert.match(json.name, /\.json$/);
  assert.match(json.text, /"alpha"/);
  JSON.parse(json.text);
  assert.match((await save("#save-fit-csv")).text, /alpha,/);
  assert.match((await save("#save-fit-python")).text, /^# Halfshade [\s\S]*import numpy as np[\s\S]*print\(M\)\n$/);

  await page.locator("#use-fit").click();
  await says(page, "#model-reason", /parameters suffice/);
  await page.locator("#undo").click();
  assert.match((await page.locator("#matrix-grid td").first().getAttribute("title")) ?? "", /0\.9468/);
  // Without noise nothing is tested, and the page says so.
  await page.locator("#noise-none").check();
  await says(page, "#model-reason", /No noise is stated/);
  // What is no transmittance has no model.
  await paste(page, FILM.replace("0.9468", "-0.9468"));
  await says(page, "#model-panel", /No model can be fitted/);
  await clean(watched);
});

for (const colorScheme of /** @type {const} */ (["light", "dark"])) {
  for (const width of [1280, 360]) {
    test(`axe finds nothing: ${colorScheme}, ${width} px`, async () => {
      const watched = await browser.open("hosted", { viewport: { width, height: 900 }, colorScheme });
      const { page } = watched;
      await open(page);
      await page.locator("#model-pureIsotropic").check();
      await page.locator("#profile-alpha").click();
      await says(page, "#profile-said", /3\.84/);
      for (const id of ["correlation", "fitted-matrix", "about-fit"]) await page.locator(`#${id} summary`).click();
      await page.evaluate(AXE);
      const found = await page.evaluate(async () => /** @type {any} */ (globalThis).axe.run(document, { runOnly: ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"] }));
      assert.deepEqual(found.violations.map((/** @type {any} */ each) => [each.id, each.nodes.map((/** @type {any} */ node) => node.html.slice(0, 120))]), []);
      assert.equal(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), true);
      await clean(watched);
    });
  }
}
