// The page on paper: what the browser's own PDF says, read back by another program.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { getDocument } from "pdfjs-dist/legacy/build/pdf.mjs";
import { FORMS, openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

// An invented kelp film.
const ROWS = ["0.9550 0.0226 0.0327 0.0038", "0.0190 0.6733 0.2540 -0.6306", "0.0297 0.2500 0.7353 0.5698", "0.0003 0.6339 -0.5648 0.4469"];
const { version } = JSON.parse(readFileSync(new URL("../../package.json", import.meta.url), "utf8"));

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

/** The film with its noise, tested. @param {Page} page */
async function measure(page) {
  await paste(page, ROWS.join("\n"));
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.004");
  await page.locator("#verdict-reason", { hasText: "(p = " }).waitFor();
  await page.locator("#provenance .hash button").waitFor({ state: "attached" });
  // In a text field a paste belongs to the field.
  await page.locator("#sigma").blur();
}

/** Every page of the printed page as text. @param {Page} page @param {"A4" | "Letter"} [format] */
async function printed(page, format = "A4") {
  const data = new Uint8Array(await page.pdf({ format }));
  const task = getDocument({ data, verbosity: 0 });
  const file = await task.promise;
  /** @type {string[]} */
  const pages = [];
  for (let number = 1; number <= file.numPages; number += 1) {
    const { items } = await (await file.getPage(number)).getTextContent();
    pages.push(items.map((item) => ("str" in item ? item.str + (item.hasEOL ? " " : "") : "")).join("").replace(/\s+/g, " "));
  }
  await task.destroy();
  return pages;
}

for (const form of FORMS) {
  test(`${form}: on paper stand the verdict, all sixteen numbers, and what they stand on`, async () => {
    const watched = await browser.open(form);
    const { page } = watched;
    await measure(page);
    const pages = await printed(page);
    const text = pages.join(" ");
    for (const part of [
      "Not realizable, but within noise",
      ...ROWS.map((row) => row.replaceAll("-", "\u2212")),
      "facing the source: angles counter-clockwise from x; S3 > 0 turns clockwise; time dependence exp(+iωt); numbers given row by row",
      `Halfshade ${version}; configurations of version 1`,
      "not normalised",
      "standard deviation 0.004 of each element",
      "2000 draws, seed 1",
      "No data left this computer.",
      "laser-safety",
      // Closed folds are open on paper.
      "How it is tested against the noise",
      "p = (1 + #{T* ≥ T}) / (1 + B)",
    ]) {
      assert.ok(text.includes(part), `${part}\n${text}`);
    }
    assert.match(text, /Computed \d{4}-\d\d-\d\dT\d\d:\d\d:\d\d[+-]\d\d:\d\d, in UTC \d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ/);
    // The same hash as in tests/node/provenance.test.mjs, recomputed with Python.
    assert.match(text, /SHA-256 of them b1ddbf18…/);
    assert.match(text.replaceAll(" ", ""), /Link\S*#v1\.[\w-]+\.[a-z2-7]{7}/);
    // Controls are for screens.
    for (const control of ["Undo", "Copy link", "Help", "I know σ", "Change it", "PNG", "Copy all 64 digits"]) {
      assert.equal(text.replace(/Link.*?No data/, "").includes(control), false, control);
    }
    assert.deepEqual([watched.violations, watched.errors, watched.requestsAfterReady], [[], [], []]);
    await page.context().close();
  });
}

test("the properties on paper name every figure, in both sizes of paper", async () => {
  const { page } = await browser.open("hosted", { colorScheme: "dark" });
  await measure(page);
  await page.locator('nav a[data-task="properties"]').click();
  for (const format of /** @type {const} */ (["A4", "Letter"])) {
    const text = (await printed(page, format)).join(" ");
    assert.match(text, /Linear retardance 62\.16\(17\) ?°/, text);
    assert.match(text, /Polarimetric entropy/);
    assert.match(text, /Polar decompositions/);
  }
  await page.context().close();
});

test("plots are drawn light and at three times the resolution while printing, and as before after it", async () => {
  const { page } = await browser.open("hosted", { colorScheme: "dark" });
  await measure(page);
  const look = () =>
    page.evaluate(() => {
      const canvas = /** @type {HTMLCanvasElement} */ (document.getElementById("plot-eigenvalues"));
      const { data } = /** @type {CanvasRenderingContext2D} */ (canvas.getContext("2d")).getImageData(0, 0, canvas.width, canvas.height);
      // The darkest of what is drawn in full: ink is dark on paper and light on a dark screen.
      let darkest = 255;
      for (let k = 0; k < data.length; k += 4) if (data[k + 3] === 255) darkest = Math.min(darkest, Math.max(data[k] ?? 0, data[k + 1] ?? 0, data[k + 2] ?? 0));
      return { ratio: canvas.width / canvas.clientWidth, background: data[3] === 0 ? "none" : `${data[0]},${data[1]},${data[2]}`, darkest };
    });
  const screen = await look();
  await page.evaluate(() => dispatchEvent(new Event("beforeprint")));
  const paper = await look();
  await page.evaluate(() => dispatchEvent(new Event("afterprint")));
  assert.equal(Math.round(paper.ratio), 3);
  assert.match(paper.background, /^(none|255,255,255)$/);
  assert.ok(paper.darkest < 80, `ink of ${paper.darkest}`);
  assert.deepEqual(await look(), screen);
  assert.equal(Math.round(screen.ratio), 1);
  // The browser says so itself when it prints.
  await page.evaluate(() => addEventListener("beforeprint", () => (document.body.dataset["printed"] = "yes"), { once: true }));
  await page.pdf();
  assert.equal(await page.evaluate(() => document.body.dataset["printed"]), "yes");
  await page.context().close();
});

test("a long link stays off the paper; a result that is not of the present text says so there", async () => {
  const { page } = await browser.open("hosted");
  await measure(page);
  // Comments are kept with the text, so random ones make the link long.
  const noise = Array.from({ length: 60 }, (_, k) => `# ${Array.from({ length: 8 }, (_, j) => Math.sin(k * 8 + j + 1).toString(36).slice(3)).join("")}`);
  await paste(page, [...noise, ...ROWS].join("\n"));
  await page.locator("#verdict-reason", { hasText: "(p = " }).waitFor();
  const text = (await printed(page)).join(" ");
  assert.match(text, /Link left out: its \d{4} characters are too many for paper/);
  await paste(page, "1 0 0 0\n0 1 0 x");
  await page.locator("#stale").waitFor();
  const stale = (await printed(page)).join(" ");
  assert.match(stale, /belongs to the last matrix that could be read/);
  assert.match(stale, /Link none: the present input is not a whole matrix/);
  await page.context().close();
});

test("with the help open, the help is printed, to its last line", async () => {
  const { page } = await browser.open("single");
  await measure(page);
  await page.locator("#help-button").click();
  const pages = await printed(page);
  assert.ok(pages.length >= 3, `${pages.length} pages`);
  const text = pages.join(" ");
  assert.match(text, /^ ?Help What can be pasted or opened/);
  assert.match(text, /forbids any to another place\. ?$/);
  assert.doesNotMatch(text, /Report block: what/);
  await page.context().close();
});
