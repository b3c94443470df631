// A working day with the page: blocks of cells, many matrices, files in and out, copies for
// other programs, pictures as files, a session without a mouse.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { fileURLToPath } from "node:url";
import { FORMS, openBrowser } from "./browser.mjs";

/** @typedef {import("playwright-core").Page} Page */

// An invented kelp film.
const FILM = ["0.9550 0.0226 0.0327 0.0038", "0.0190 0.6733 0.2540 -0.6306", "0.0297 0.2500 0.7353 0.5698", "0.0003 0.6339 -0.5648 0.4469"].join("\n");
const NUMBERS = FILM.split(/\s/).map(Number);
const SAMPLES = fileURLToPath(new URL("../samples/files/", import.meta.url));
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
    const target = document.activeElement ?? document.body;
    target.dispatchEvent(new ClipboardEvent("paste", { clipboardData, bubbles: true, cancelable: true }));
  }, text);
}

/** The sixteen cells as they are written. @param {Page} page */
async function cells(page) {
  const titles = await page.locator("#matrix-grid td").evaluateAll((boxes) => boxes.map((box) => box.getAttribute("title") ?? ""));
  return titles.map((title) => (title.split(" = ")[1] ?? "").replaceAll("\u2212", "-"));
}

/** @param {Page} page */
async function numbers(page) {
  return (await cells(page)).map(Number);
}

/** @param {Page} page @param {string | RegExp} title */
async function verdict(page, title) {
  await page.locator("#task-heading", { hasText: title }).waitFor({ timeout: 15000 });
}

/** @param {Page} page @param {string} selector @param {RegExp} pattern */
async function says(page, selector, pattern) {
  await page.locator(selector, { hasText: pattern }).first().waitFor({ timeout: 5000 });
}

/** Files dropped on the page. @param {Page} page @param {{ name: string, content: number[] | string }} file */
async function drop(page, file) {
  await page.evaluate(({ name, content }) => {
    const dataTransfer = new DataTransfer();
    dataTransfer.items.add(new File([typeof content === "string" ? content : new Uint8Array(content)], name));
    document.body.dispatchEvent(new DragEvent("drop", { dataTransfer, bubbles: true, cancelable: true }));
  }, file);
}

/** What a click saves. @param {Page} page @param {string} selector */
async function saved(page, selector) {
  const [download] = await Promise.all([page.waitForEvent("download"), page.locator(selector).click()]);
  return { name: download.suggestedFilename(), bytes: readFileSync(await download.path()) };
}

/** @param {import("./browser.mjs").WatchedPage} watched */
async function clean({ page, violations, errors, requestsAfterReady }) {
  assert.deepEqual({ violations, errors, requestsAfterReady }, { violations: [], errors: [], requestsAfterReady: [] });
  await page.context().close();
}

test("blocks of cells are selected, copied, cut, pasted and cleared, one step of undo each", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  await paste(page, FILM);
  const cell = (/** @type {number} */ k) => page.locator("#matrix-grid td").nth(k);
  const selected = () => page.locator('#matrix-grid td[aria-selected="true"]').count();
  await cell(5).focus();
  await page.keyboard.press("Shift+ArrowRight");
  await page.keyboard.press("Shift+ArrowDown");
  assert.equal(await selected(), 4);
  await page.keyboard.press("Control+c");
  assert.equal(await page.evaluate(() => navigator.clipboard.readText()), "0.6733\t0.2540\n0.2500\t0.7353");
  await page.keyboard.press("Control+x");
  assert.deepEqual((await cells(page)).filter((text) => text === "").length, 4);
  await page.keyboard.press("Control+z");
  assert.deepEqual(await numbers(page), NUMBERS);
  // The block goes to where the keyboard is, as far as it fits.
  await cell(0).focus();
  await page.keyboard.press("Control+v");
  assert.deepEqual((await numbers(page)).slice(0, 6), [0.6733, 0.254, 0.0327, 0.0038, 0.25, 0.7353]);
  assert.equal(await page.locator("#undo").getAttribute("title"), "Undo the paste into m00 to m11");
  await page.keyboard.press("Control+z");
  assert.deepEqual(await numbers(page), NUMBERS);
  await cell(15).focus();
  await page.keyboard.press("Control+v");
  await says(page, "#status", /2 × 2 numbers do not fit from m33 on/);
  assert.deepEqual(await numbers(page), NUMBERS);
  // All of it, by keyboard and by mouse.
  await page.keyboard.press("Control+a");
  assert.equal(await selected(), 16);
  await page.keyboard.press("Delete");
  assert.deepEqual(await cells(page), Array(16).fill(""));
  await page.keyboard.press("Control+z");
  await cell(0).click();
  await cell(3).click({ modifiers: ["Shift"] });
  assert.equal(await selected(), 4);
  await page.keyboard.press("Escape");
  assert.equal(await selected(), 0);
  // One tab stop; a click elsewhere takes what was typed.
  assert.equal(await page.locator('#matrix-grid td[tabindex="0"]').count(), 1);
  await cell(1).dblclick();
  await page.keyboard.press("Control+a");
  await page.keyboard.type("0,5");
  await page.locator("#task").click();
  assert.equal((await cells(page))[1], "0.5");
  // The other names of the elements.
  await page.locator("#first-index").selectOption("1");
  assert.equal(await cell(0).getAttribute("title"), "m11 = 0.9550");
  await says(page, "#task", /of m11/);
  await clean(watched);
});

test("several matrices: a series is walked through, repeats give mean and σ, a pair its difference", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  const other = NUMBERS.map((value, k) => (k === 0 ? value : value + (k % 2 ? 0.002 : -0.002)));
  const rows = (/** @type {number[]} */ sixteen) => sixteen.join("\t");
  await paste(page, `450\t${rows(NUMBERS)}\n500\t${rows(other)}`);
  await says(page, "#many", /2 matrices/);
  await page.locator("#many-use").selectOption("series");
  await page.locator("#pick-next").click();
  assert.deepEqual(await numbers(page), other);
  assert.equal(await page.locator("#pick-next").isDisabled(), true);
  assert.equal(await page.locator("#pick option").nth(1).textContent(), "2: 500");
  await page.locator("#many-use").selectOption("pair");
  await says(page, "#pair-difference", /at most 0\.002/);
  await page.locator("#many-use").selectOption("repeats");
  const mean = NUMBERS.map((value, k) => (value + (other[k] ?? 0)) / 2);
  (await numbers(page)).forEach((value, k) => assert.ok(Math.abs(value - (mean[k] ?? 0)) < 1e-12));
  // Derived: 15 elements scatter by ±0.001 about the mean of two, so the variance of one is
  // 2·15·0.001²/16 and σ of the mean its root over √2.
  const sigma = Math.sqrt((30 * 1e-6) / 16 / 2);
  await says(page, "#sigma-note", new RegExp(`scatter of 2 repeats.*σ = ${sigma.toPrecision(3)} of the mean`));
  await verdict(page, /./);
  // All of it comes back by a link.
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await says(fresh.page, "#many", /2 matrices: .*repeats/);
  await fresh.page.locator("#many-use").selectOption("series");
  await fresh.page.locator("#pick-next").click();
  assert.deepEqual(await numbers(fresh.page), other);
  await clean(fresh);
});

test("uncertainties printed with the numbers become the noise", async () => {
  const watched = await browser.open("hosted");
  const { page } = watched;
  await paste(page, FILM.replace(/(\d\.\d{4})/g, "$1(40)"));
  await verdict(page, "Not realizable, but within noise");
  assert.equal(await page.locator("#sigma").inputValue(), "0.004");
  await says(page, "#noise", /Read with the numbers/);
  assert.deepEqual(await numbers(page), NUMBERS);
  await clean(watched);
});

test("each way to state the noise, what is wrong with it, and the link that carries it", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  await paste(page, FILM);
  await page.locator("#noise-more summary").click();
  await page.locator("#noise-relative").check();
  await page.locator("#fraction").fill("0.4188482");
  await verdict(page, "Not realizable, but within noise");
  // The same σ for each element gives the same answer as one σ.
  await page.locator("#noise-perElement").check();
  await page.locator("#noise-text").fill(Array(16).fill("0.004").join(" "));
  await verdict(page, "Not realizable, but within noise");
  await page.locator("#noise-text").fill("0.004 0.004");
  await says(page, "#sigma-note", /16 numbers|4 rows|found/);
  assert.equal(await page.locator("#noise-text").getAttribute("aria-invalid"), "true");
  // A covariance: its diagonal alone, and one that is none.
  const covariance = Array.from({ length: 16 }, (_, i) => Array.from({ length: 16 }, (_, j) => String(i === j ? 1.6e-5 : 0)));
  await page.locator("#noise-covariance").check();
  await page.locator("#noise-text").fill(covariance.map((row) => row.join("\t")).join("\n"));
  await verdict(page, "Not realizable, but within noise");
  await says(page, "#verdict-reason", /−0\.0038\(21\) of m00/);
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  const [first = []] = covariance;
  first[1] = "1e-05";
  await page.locator("#noise-text").fill(covariance.map((row) => row.join("\t")).join("\n"));
  await says(page, "#sigma-note", /not symmetric: row 2, column 1/);
  await verdict(page, "Not realizable as it stands; no noise is stated");
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await verdict(fresh.page, "Not realizable, but within noise");
  assert.equal(await fresh.page.locator("#noise-covariance").isChecked(), true);
  await says(fresh.page, "#verdict-reason", /−0\.0038\(21\) of m00/);
  await clean(fresh);
});

test("every statement of the noise by keyboard, a covariance from a file, and what the instrument adds", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  const focused = () => page.evaluate(() => document.activeElement?.id ?? "");
  const tabTo = async (/** @type {string} */ id) => {
    for (let k = 0; k < 60 && (await focused()) !== id; k += 1) await page.keyboard.press("Tab");
    assert.equal(await focused(), id);
  };
  const type = async (/** @type {string} */ text) => {
    await page.keyboard.press("ControlOrMeta+a");
    await page.keyboard.type(text);
  };
  await paste(page, FILM);
  await verdict(page, /no noise is stated|digits/);
  // One group of choices: Tab reaches the chosen one, arrows the others.
  await tabTo("noise-none");
  await page.keyboard.press("ArrowDown");
  assert.equal(await page.locator("#noise-rounding").isChecked(), true);
  await says(page, "#sigma-note", /Rounding alone/);
  await page.keyboard.press("ArrowDown");
  assert.equal(await focused(), "sigma");
  await type("0.004");
  await verdict(page, "Not realizable, but within noise");
  // The picture says its error bars in words.
  assert.match((await page.locator("#plot-eigenvalues").getAttribute("aria-label")) ?? "", /each with its standard error: λ1 = 1\.\d+ ± 0\.\d+/);
  await page.locator("#noise-more summary").focus();
  await page.keyboard.press("Enter");
  await page.locator("#noise-uniform").focus();
  await page.keyboard.press("ArrowDown");
  assert.equal(await focused(), "fraction");
  await type("0.42");
  await verdict(page, "Not realizable, but within noise");
  await page.locator("#noise-relative").focus();
  await page.keyboard.press("ArrowDown");
  assert.equal(await focused(), "noise-text");
  await page.keyboard.insertText(Array(16).fill("0.004").join(" "));
  await verdict(page, "Not realizable, but within noise");
  await page.locator("#noise-perElement").focus();
  await page.keyboard.press("ArrowDown");
  assert.equal(await page.locator("#noise-covariance").isChecked(), true);
  const covariance = Array.from({ length: 16 }, (_, i) => Array.from({ length: 16 }, (_, j) => (i === j ? 1.6e-5 : 2e-6)).join(",")).join("\n");
  await tabTo("noise-open");
  const [chooser] = await Promise.all([page.waitForEvent("filechooser"), page.keyboard.press("Enter")]);
  await chooser.setFiles({ name: "covariance.csv", mimeType: "text/csv", buffer: Buffer.from(covariance) });
  await page.waitForFunction(() => /** @type {HTMLTextAreaElement} */ (document.getElementById("noise-text")).value.trim().split(/\s+/).length === 256);
  await verdict(page, "Not realizable, but within noise");
  // A file with too few numbers says so and changes nothing else.
  await page.locator("#noise-file").setInputFiles({ name: "short.csv", mimeType: "text/csv", buffer: Buffer.from(Array(16).fill("1").join(",")) });
  await says(page, "#sigma-note", /256 numbers are needed, and 16 were found/);
  await page.locator("#undo").click();
  await verdict(page, "Not realizable, but within noise");

  // The instrument: contrast wrong by 2 %, on top of a small noise.
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.0005");
  await verdict(page, "Not realizable, beyond noise");
  await page.locator("#instrument summary").focus();
  await page.keyboard.press("Enter");
  await tabTo("instrument-generator-contrastSigma");
  await type("2");
  await tabTo("instrument-analyser-contrastSigma");
  await type("2");
  await verdict(page, "Not realizable, but within noise");
  await says(page, "#verdict-reason", /with the stated uncertainty of the instrument/);
  await tabTo("instrument-darkSigma");
  await type("-1");
  await says(page, "#instrument-note", /not below zero/);
  await type("0.1");
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  // A retarder that measures no circular part has no such statement.
  await page.locator("#instrument-generator-retardanceDeg").fill("180");
  await page.locator("#instrument-generator-retardanceSigmaDeg").fill("1");
  await says(page, "#instrument-note", /measures no circular part/);
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await verdict(fresh.page, "Not realizable, but within noise");
  assert.equal(await fresh.page.locator("#instrument-generator-contrastSigma").inputValue(), "2");
  assert.equal(await fresh.page.locator("#instrument-darkSigma").inputValue(), "0.1");
  await clean(fresh);
});

test("repeats pasted: their mean is judged by their scatter, and a link carries them", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  // Invented: a quarter-wave film three times, with errors of a few thousandths.
  const film = [0.9, 0, 0, 0, 0, 0.9, 0, 0, 0, 0, 0, 0.9, 0, 0, -0.9, 0];
  const error = (/** @type {number} */ n) => 0.014 * (((Math.sin(n) * 43758.5) % 1) - 0.5 * Math.sign(Math.sin(n)));
  const repeats = [0, 1, 2].map((n) => film.map((value, k) => (value + error(16 * n + k + 1)).toFixed(4)).join("\t")).join("\n");
  await paste(page, repeats);
  await page.locator("#many-use").selectOption("repeats");
  await says(page, "#sigma-note", /scatter of 3 repeats/);
  await verdict(page, /Realizable|within noise/);
  await page.locator('nav a[data-task="properties"]').click();
  await says(page, "#properties-panel", /95 %/);
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await says(fresh.page, "#sigma-note", /scatter of 3 repeats/);
  await says(fresh.page, "#properties-panel", /95 %/);
  await clean(fresh);
});

for (const form of FORMS) {
  test(`${form}: files come in by button and by drop, and a saved session opens again`, async () => {
    const watched = await browser.open(form, { acceptDownloads: true });
    const { page } = watched;
    for (const name of ["stack.npy", "fortran.npy", "big_endian.npy", "rows_last.npy"]) {
      await page.locator("#file").setInputFiles(SAMPLES + name);
      await says(page, "#many", new RegExp(`5 matrices from ${name}`));
    }
    const expected = JSON.parse(readFileSync(`${SAMPLES}expected.json`, "utf8"))["stack.npy"];
    await page.locator("#pick").selectOption({ value: "3" });
    assert.deepEqual(await numbers(page), expected[3]);
    await page.locator("#many-use").selectOption("series");
    await page.locator("#noise-uniform").check();
    await page.locator("#sigma").fill("0.01");
    const { name, bytes } = await saved(page, "#save-file");
    assert.match(name, /^halfshade-.*\.json$/);
    await page.locator("#clear").click();
    await drop(page, { name, content: bytes.toString("utf8") });
    await says(page, "#banner", /Loaded from a file made with version/);
    assert.deepEqual(await numbers(page), expected[3]);
    assert.equal(await page.locator("#sigma").inputValue(), "0.01");
    await says(page, "#many", /5 matrices from rows_last\.npy/);

    // A text file goes where a paste goes, whatever its encoding.
    const utf16 = readFileSync(`${SAMPLES}utf16le.txt`);
    await drop(page, { name: "utf16.txt", content: [...utf16] });
    await says(page, "#reading", /decimal comma/);
    // Both axes could count the matrices: the person is asked.
    const header = "{'descr': '<f8', 'fortran_order': False, 'shape': (4, 4, 4)}";
    const cube = Buffer.concat([Buffer.from("\x93NUMPY\x01\x00", "latin1"), Buffer.from([header.length, 0]), Buffer.from(header), Buffer.from(new Float64Array(64).map((_, k) => k).buffer)]);
    await drop(page, { name: "cube.npy", content: [...cube] });
    await says(page, "#banner", /more than one way/);
    await page.locator("#stack-last").click();
    await page.waitForFunction(() => document.querySelector("#matrix-grid td:nth-child(2)")?.getAttribute("title") === "m01 = 4");
    // What cannot be read is explained, and loses nothing.
    for (const [name, content, reason] of /** @type {[string, number[] | string, RegExp][]} */ ([
      ["a.npy", [...cube.subarray(0, 200)], /damaged/],
      ["a.zip", [0x50, 0x4b, 3, 4, 0, 0, 1], /binary file/],
      ["a.json", '{"v": 7, "app": "9.9.9"}', /newer version/],
      ["b.json", '{"v": 1, "app": "0.1.0", "measurement": {"mueller": [1]}}', /mueller|16/],
    ])) {
      await drop(page, { name, content });
      await says(page, "#problem", reason);
      assert.equal((await cells(page))[1], "4");
    }
    await clean(watched);
  });
}

test("ten megabytes, pasted and dropped, never stop the page", async () => {
  const watched = await browser.open("hosted");
  const { page } = watched;
  const line = NUMBERS.join("\t");
  const text = Array(Math.ceil(10e6 / line.length)).fill(line).join("\n");
  const watch = () =>
    page.evaluate(() => {
      const store = /** @type {any} */ (window);
      store.longest = 0;
      let last = performance.now();
      const tick = () => {
        const now = performance.now();
        store.longest = Math.max(store.longest, now - last);
        last = now;
        store.timer = setTimeout(tick, 10);
      };
      tick();
    });
  await watch();
  await drop(page, { name: "large.txt", content: text });
  await page.locator("#many", { hasText: /matrices from large\.txt/ }).waitFor({ timeout: 60000 });
  const longest = await page.evaluate(() => /** @type {any} */ (window).longest);
  assert.ok(longest < 2500, `the page stood still for ${longest} ms`);
  assert.deepEqual(await numbers(page), NUMBERS);
  // A stop is a stop, and the page goes on.
  await paste(page, text);
  await page.locator("#stop-reading").click();
  await says(page, "#status", /reading was stopped/);
  await paste(page, FILM);
  await verdict(page, /Not realizable/);
  await clean(watched);
});

test("each form of copies reads back to the same numbers", async () => {
  const watched = await browser.open("hosted", { ...CLIPBOARD, acceptDownloads: true });
  const { page } = watched;
  await paste(page, FILM);
  await page.locator("#nearest-matrix summary").click();
  /** @type {string[]} */
  const seen = [];
  /** @type {number[] | null} */
  let first = null;
  for (const form of ["tsv", "csv", "csvEuropean", "json", "latex", "python", "matlab"]) {
    await page.locator("#form").selectOption(form);
    await page.locator("#copy-nearest").click();
    await page.waitForTimeout(30);
    const copied = await page.evaluate(() => navigator.clipboard.readText());
    assert.equal(seen.includes(copied), false, form);
    seen.push(copied);
    const other = await browser.open("hosted");
    await paste(other.page, copied);
    await verdict(other.page, /^Realizable/);
    const found = await numbers(other.page);
    first ??= found;
    assert.deepEqual(found, first, form);
    await other.page.context().close();
    const { name, bytes } = await saved(page, "#save-results");
    assert.match(name, /-results\.(tsv|csv|json|tex|py|m)$/);
    const text = bytes.toString("utf8");
    assert.match(text, /retardanceDeg|retardance/);
    assert.ok(text.length > 2000, `${form}: ${text.length}`);
  }
  await page.locator('nav a[data-task="properties"]').click();
  await page.locator("#form").selectOption("tsv");
  await page.locator("#copy-figures").click();
  const figures = await page.evaluate(() => navigator.clipboard.readText());
  assert.match(figures, /figure\tvalue\tstandard uncertainty/);
  await clean(watched);
});

test("causes are looked for, tried and undone; a pair is compared, and a link carries it", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  const wrong = FILM.split("\n").map((row, i) => (i === 3 ? row.split(" ").map((text) => String(-Number(text))).join(" ") : row)).join("\n");
  await paste(page, wrong);
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.004");
  await verdict(page, "Not realizable, beyond noise");
  await page.locator("#look-for-causes").click();
  await page.locator("#causes-heading").waitFor({ timeout: 20000 });
  await says(page, ".causes", /One side counted the other way round \(p = /);
  await page.locator("#try-0").click();
  await verdict(page, "Not realizable, but within noise");
  await page.locator("#undo").click();
  await verdict(page, "Not realizable, beyond noise");
  await page.locator("#noise-none").check();
  await paste(page, `${FILM}\n\n${FILM.replace("0.6733", "0.7733")}`);
  await page.locator("#many-use").selectOption("pair");
  await says(page, "#pair-difference", /at most 0\.1/);
  await page.locator("#noise-uniform").check();
  await page.locator("#sigma").fill("0.004");
  await says(page, "#pair-difference", /they differ beyond noise/);
  await page.locator("#sigma").fill("0.2");
  await says(page, "#pair-difference", /no difference beyond noise/);
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  await clean(watched);
  const fresh = await browser.open("hosted", { hash: /#\S+/.exec(copied)?.[0] ?? "" });
  await says(fresh.page, "#pair-difference", /no difference beyond noise/);
  await clean(fresh);
});

test("units: waves and nanometres, per cent and counts", async () => {
  const watched = await browser.open("hosted");
  const { page } = watched;
  // A quarter-wave plate.
  await paste(page, "100 0 0 0\n0 100 0 0\n0 0 0 100\n0 0 -100 0");
  await says(page, "#scale-note", /per cent, volts or counts are fine/);
  await page.locator('nav a[data-task="properties"]').click();
  await says(page, "#figures", /Retardance90\.0*°/);
  await page.locator("#retardance-unit").selectOption("waves");
  await says(page, "#figures", /Retardance0\.250* waves/);
  await page.locator("#retardance-unit").selectOption("nm");
  await page.locator("#wavelength").fill("632.8");
  await page.locator("#wavelength").press("Enter");
  await says(page, "#figures", /Retardance158\.20* nm/);
  await page.locator("#absolute").selectOption("yes");
  await says(page, "#scale-note", /means gain/);
  await page.locator("#per-cent").click();
  assert.equal((await cells(page))[0], "1");
  await says(page, "#differential", /linear, 0° \/ 90°\s*158\.200/);
  await clean(watched);
});

test("thirty mixed actions are undone one by one, and done again", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  const state = () => page.evaluate(() => [...document.querySelectorAll("#grid, #reading, #many, #noise, #convention")].map((part) => part.textContent).join("|") + /** @type {HTMLInputElement} */ (document.querySelector("#sigma")).value);
  /** @type {string[]} */
  const states = [await state()];
  const step = async (/** @type {Promise<unknown>} */ act) => {
    await act;
    states.push(await state());
  };
  const cell = page.locator("#matrix-grid td");
  for (let round = 0; round < 3; round += 1) {
    await step(paste(page, FILM.replace("0.0226", `0.0${round + 3}`)));
    await step(page.locator("#normalised").selectOption("yes"));
    await step(page.locator("#order").selectOption(round % 2 ? "rows" : "columns"));
    await step(page.locator("#noise-uniform").check());
    await page.locator("#sigma").fill(`0.00${round + 1}`);
    await page.locator("#task").focus();
    states.push(await state());
    await cell.nth(6).focus();
    await step(page.keyboard.press("Delete"));
    await cell.nth(6).focus();
    await step((async () => { await page.keyboard.type("0.25"); await page.keyboard.press("Enter"); })());
    await step(page.locator("#example").selectOption({ index: round + 2 }));
    await step(page.locator("#clear").click());
    await step(paste(page, `${FILM}\n\n${FILM.replace("0.6", "0.5")}`));
  }
  assert.equal(states.length, 31);
  for (let k = 29; k >= 0; k -= 1) {
    await page.locator("#undo").click();
    assert.equal(await state(), states[k], `undo to ${k}`);
  }
  assert.equal(await page.locator("#undo").isDisabled(), true);
  for (let k = 1; k <= 30; k += 1) await page.locator("#redo").click();
  assert.equal(await state(), states[30]);
  await clean(watched);
});

test("closing with unsaved work asks, saved work does not", async () => {
  const { page } = await browser.open("hosted", { acceptDownloads: true });
  let asked = 0;
  page.on("dialog", async (dialog) => {
    asked += 1;
    await dialog.accept();
  });
  await paste(page, FILM);
  await page.locator("#clear").click();
  await page.locator("#undo").click();
  await page.reload();
  await page.waitForSelector("html[data-ready=true]", { state: "attached" });
  assert.equal(asked, 1);
  assert.deepEqual(await numbers(page), NUMBERS);
  await saved(page, "#save-file");
  await page.reload();
  await page.waitForSelector("html[data-ready=true]", { state: "attached" });
  assert.equal(asked, 1);
  await page.context().close();
});

test("a link that was broken by mail, quoted, or cut", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  await paste(page, FILM);
  await page.locator("#copy-link").click();
  await says(page, "#status", /Link copied/);
  const copied = await page.evaluate(() => navigator.clipboard.readText());
  for (const damaged of [
    `See this:\n> ${copied.slice(0, 90)}\n> ${copied.slice(90, 160)}\n> ${copied.slice(160)}\n`,
    copied.replace(/.{60}/g, "$&\r\n"),
    `<${copied}>`,
    `${copied} and some words behind it`,
  ]) {
    await page.locator("#clear").click();
    await paste(page, damaged);
    await says(page, "#banner", /Loaded from a link/);
    assert.deepEqual(await numbers(page), NUMBERS, damaged);
  }
  await paste(page, copied.slice(0, -20));
  await says(page, "#problem", /cut off/);
  await clean(watched);
});

test("a whole session without a mouse", async () => {
  const watched = await browser.open("hosted", CLIPBOARD);
  const { page } = watched;
  await page.evaluate((text) => navigator.clipboard.writeText(text), FILM);
  const key = (/** @type {string} */ name) => page.keyboard.press(name);
  /** Tab until this has the keyboard. @param {string} selector */
  const tabTo = async (selector) => {
    for (let presses = 0; presses < 80; presses += 1) {
      if (await page.evaluate((selector) => document.activeElement?.matches(selector) ?? false, selector)) return;
      await key("Tab");
    }
    assert.fail(`no way to ${selector} by Tab`);
  };
  await key("Control+v");
  await verdict(page, "Not realizable as it stands");
  await tabTo("#skip");
  await tabTo('nav a[data-task="properties"]');
  await tabTo("#matrix-grid td");
  await key("Control+Home");
  await key("ArrowRight");
  await key("F2");
  await key("End");
  await page.keyboard.type("1");
  await key("Enter");
  assert.equal((await cells(page))[1], "0.02261");
  await key("Control+z");
  await tabTo("#normalised");
  await key("ArrowDown");
  await says(page, "#undo", /Undo/);
  await tabTo('input[name="noise"]');
  await key("ArrowDown");
  await key("ArrowDown");
  await tabTo("#sigma");
  await page.keyboard.type("0.004");
  await verdict(page, "within noise");
  await tabTo("#convention-fold summary");
  await key("Enter");
  await tabTo("#convention-angles");
  await key("ArrowDown");
  await tabTo("#form");
  await key("ArrowDown");
  await page.locator("#skip").focus();
  await tabTo('nav a[data-task="properties"]');
  await key("Enter");
  await verdict(page, "Properties");
  await tabTo("#plot-sphere");
  await key("ArrowLeft");
  await tabTo("#view-elevation");
  await key("ArrowRight");
  await page.locator("#skip").focus();
  await tabTo("#copy-link");
  await key("Enter");
  await says(page, "#status", /Link copied/);
  await clean(watched);
});

test("pictures leave as SVG and PNG, with what they show inside", async () => {
  const watched = await browser.open("hosted", { acceptDownloads: true });
  const { page } = watched;
  await paste(page, FILM);
  for (const [task, names] of /** @type {const} */ ([
    ["realizability", ["eigenvalues"]],
    ["properties", ["sphere", "ellipses"]],
  ])) {
    await page.locator(`nav a[data-task="${task}"]`).click();
    for (const name of names) {
      const figure = `.plot-${name} figcaption button`;
      const svg = await saved(page, `${figure}:text-is("SVG")`);
      const text = svg.bytes.toString("utf8");
      assert.match(text, /^(<\?xml[^>]*>\s*)?<svg /);
      for (const part of ["<title>", "<desc>", "Halfshade 0."]) assert.ok(text.includes(part), `${name}: ${part}`);
      await page.locator(`.plot-${name} figcaption select`).selectOption("2");
      const png = await saved(page, `${figure}:text-is("PNG")`);
      for (const part of ["iTXtTitle", "iTXtDescription", "iTXtSoftware"]) assert.ok(png.bytes.includes(part), `${name}: ${part}`);
      // It opens in a browser, is as large as it says, and is not one colour.
      const shown = await page.evaluate(async (bytes) => {
        const bitmap = await createImageBitmap(new Blob([new Uint8Array(bytes)], { type: "image/png" }));
        const canvas = new OffscreenCanvas(bitmap.width, bitmap.height);
        const context = /** @type {OffscreenCanvasRenderingContext2D} */ (canvas.getContext("2d"));
        context.drawImage(bitmap, 0, 0);
        const { data } = context.getImageData(0, 0, bitmap.width, bitmap.height);
        return { width: bitmap.width, corner: [...data.slice(0, 4)], colours: new Set(new Uint32Array(data.buffer)).size };
      }, [...png.bytes]);
      assert.ok(shown.width > 500 && shown.colours > 10, name);
      assert.deepEqual(shown.corner, [255, 255, 255, 255], `${name}: opaque and light`);
    }
  }
  await clean(watched);
});

test("a state on the sphere is read by pointer, finger and keyboard, and ringed on the screen only", async () => {
  const watched = await browser.open("hosted", { acceptDownloads: true, hasTouch: true, viewport: { width: 1360, height: 900 } });
  const { page } = watched;
  await paste(page, FILM);
  await page.locator('nav a[data-task="properties"]').click();
  await page.locator(".turn button", { hasText: "S1 in front" }).click();
  const canvas = page.locator("#plot-sphere");
  await canvas.scrollIntoViewIfNeeded();
  const box = await canvas.boundingBox();
  assert.ok(box);
  // Definition of the view: S2 to the right, S3 up; twenty pixels round the unit sphere.
  const [half, radius] = [box.width / 2, box.width / 2 - 20];
  const place = { h: [half, half], plus: [half + radius, half], r: [half, half - radius], l: [half, half + radius] };
  /** @param {number[]} at @returns {[number, number]} */
  const onPage = ([x = 0, y = 0]) => [box.x + x, box.y + y];
  const chosen = () => page.locator("#state").evaluate((select) => /** @type {HTMLSelectElement} */ (select).value);

  await page.mouse.move(...onPage(place.plus));
  // Recomputed: the matrix times (1, 0, 1, 0), half the angles of its Stokes vector.
  await says(page, "#state-text", /^S = \(1\.0000, 0\.0000, 1\.0000, 0\.0000\), .*azimuth 45\.00°.*becomes S = \(0\.9877, 0\.2730, 0\.7650, −0\.5645\), degree of polarization 1\.0015, azimuth 35\.18°, ellipticity −17\.40°\.$/);
  assert.equal(await chosen(), "+45°");
  await page.mouse.move(...onPage([half + radius / 2, half + radius / 2 + 4]));
  assert.equal(await chosen(), "H", "away from every mark it is the chosen one again");
  await page.mouse.click(...onPage(place.r));
  await page.mouse.move(box.x - 30, box.y);
  assert.equal(await chosen(), "R", "a click stays");
  await page.touchscreen.tap(...onPage(place.l));
  assert.equal(await chosen(), "L");
  await page.locator("#state").focus();
  await page.keyboard.press("ArrowUp");
  await page.keyboard.press("ArrowUp");
  assert.equal(await chosen(), "−45°");
  await says(page, "#state-text", /^S = \(1\.0000, 0\.0000, −1\.0000, 0\.0000\)/);

  // A drag turns: a quarter of the width is 45°, and the front goes with the hand.
  await page.mouse.move(...onPage([half, half + 60]));
  await page.mouse.down();
  await page.mouse.move(...onPage([half - box.width / 4, half + 60]), { steps: 6 });
  await page.mouse.up();
  assert.equal(await page.locator("#view-azimuth-number").inputValue(), "45°");
  assert.equal(await chosen(), "−45°");
  const { bytes } = await saved(page, '.plot-sphere figcaption button:text-is("SVG")');
  const text = bytes.toString("utf8");
  assert.match(text, /<circle/);
  // Sixteen units a pixel.
  assert.ok(!text.includes(`r="${Math.round(16 * 6.8)}"`), "no ring in a file");
  await clean(watched);
});
