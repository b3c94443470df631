// The help: complete, reached and left by the keyboard, without a request, and no obstacle to work.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { FORMS, openBrowser } from "./browser.mjs";

const axe = readFileSync(new URL("../../node_modules/axe-core/axe.min.js", import.meta.url), "utf8");

/** @type {Awaited<ReturnType<typeof openBrowser>>} */
let browser;
before(async () => {
  browser = await openBrowser();
});
after(() => browser.close());

for (const form of FORMS) {
  test(`${form}: the help opens and closes by keyboard, says everything, asks for nothing`, async () => {
    const watched = await browser.open(form, { viewport: { width: 1360, height: 900 } });
    const { page } = watched;
    const focused = () => page.evaluate(() => document.activeElement?.id);
    await page.locator("#help-button").focus();
    await page.keyboard.press("Enter");
    assert.equal(await focused(), "help-heading");
    const text = (await page.locator("#help").textContent()) ?? "";
    for (const part of ["0.123(4)", ".npy", "time dependence", "moment selection", "−0.96 σ", "transposition of the whole matrix", "Stokes condition", "Passivity", "Not determined", "Constant stray light looks the same as α", "8000", "Ctrl+Z", "laser-safety", "np.linalg.eigvalsh", "hashlib.sha256"]) {
      assert.ok(text.includes(part), part);
    }
    // Each entry of the contents leads to its part, which is then in sight and has the keyboard.
    const entries = page.locator(".help-contents button");
    for (let k = 0; k < (await entries.count()); k += 1) {
      const title = await entries.nth(k).textContent();
      await entries.nth(k).focus();
      await page.keyboard.press("Enter");
      assert.equal(await page.evaluate(() => document.activeElement?.textContent), title);
      assert.ok(await page.evaluate(() => {
        const heading = document.activeElement?.getBoundingClientRect();
        const head = document.querySelector(".help-head")?.getBoundingClientRect();
        return heading && head && heading.top >= head.bottom && heading.bottom <= innerHeight;
      }), `${title} is covered`);
    }
    // The keyboard does not leave it, nor reach what is behind it.
    for (let presses = 0; presses < 30; presses += 1) {
      await page.keyboard.press("Tab");
      assert.ok(await page.evaluate(() => document.activeElement === document.body || document.activeElement?.closest("#help")));
    }
    await page.keyboard.press("Escape");
    assert.equal(await page.locator("#help").isVisible(), false);
    assert.equal(await focused(), "help-button");
    assert.equal(await page.evaluate(() => location.hash), "");

    // A matrix that is pasted meanwhile is seen; undo does not work unseen.
    await page.keyboard.press("Enter");
    await page.evaluate(() => {
      const clipboardData = new DataTransfer();
      clipboardData.setData("text/plain", "1 0 0 0\n0 1 0 0\n0 0 1 0\n0 0 0 1");
      document.activeElement?.dispatchEvent(new ClipboardEvent("paste", { clipboardData, bubbles: true, cancelable: true }));
    });
    await page.locator("#task-heading", { hasText: /^Realizable$/ }).waitFor();
    assert.equal(await page.locator("#help").isVisible(), false);
    await page.locator("#help-button").click();
    await page.keyboard.press("Control+z");
    await page.locator("#help-close").click();
    assert.equal(await page.locator("#task-heading").textContent(), "Realizable");
    assert.deepEqual([watched.violations, watched.errors, watched.requestsAfterReady], [[], [], []]);
    await page.context().close();
  });
}

for (const colorScheme of /** @type {const} */ (["light", "dark"])) {
  for (const width of [1360, 320]) {
    test(`axe finds nothing in the help: ${colorScheme}, ${width} px`, async () => {
      const { page } = await browser.open("hosted", { colorScheme, viewport: { width, height: 800 } });
      await page.locator("#help-button").click();
      await page.evaluate(axe);
      const found = await page.evaluate(async () => {
        const { axe } = /** @type {any} */ (globalThis);
        const { violations } = await axe.run(document, { rules: { "target-size": { enabled: true } } });
        return violations.map((/** @type {any} */ one) => `${one.id}: ${one.nodes.map((/** @type {any} */ node) => node.html.slice(0, 120)).join(" | ")}`);
      });
      assert.deepEqual(found, []);
      assert.ok(await page.locator("#help").evaluate((help) => help.scrollWidth <= help.clientWidth), "no sideways scroll");
      await page.context().close();
    });
  }
}
