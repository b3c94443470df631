// `npm run benchmark`: builds the page and measures it in a real browser, against its goals.

import { readFileSync } from "node:fs";
import { cpus } from "node:os";
import { join } from "node:path";
import { gzipSync } from "node:zlib";
import { build } from "../../www/build/build.mjs";
import { DIST, needChromium, runMain } from "../../www/build/tools.mjs";

// An invented kelp film that is not realizable, so that the test against the noise has to run.
const MUELLER = [
  0.955, 0.0226, 0.0327, 0.0038,
  0.019, 0.6733, 0.254, -0.6306,
  0.0297, 0.25, 0.7353, 0.5698,
  0.0003, 0.6339, -0.5648, 0.4469,
];

await runMain(async () => {
  await build();
  await needChromium();
  // Only now, because the browser's driver is one of the packages that the build installs.
  const { openBrowser } = await import("./browser.mjs");
  const browser = await openBrowser();
  /** @type {(string | number)[][]} */
  let rows;
  try {
    const ready = [];
    for (let count = 0; count < 7; count += 1) {
      const { page } = await browser.open("single");
      ready.push(await page.evaluate(() => performance.getEntriesByName("halfshade-ready")[0]?.startTime ?? NaN));
      await page.context().close();
    }
    const { page } = await browser.open("hosted");
    const wasm = gzipSync(readFileSync(join(DIST, "halfshade_bg.wasm")), { level: 9 }).length;
    rows = [
      ["examine, no draws", await examineQuickly(page), "ms", 1],
      ["examine, 2000 draws, in the worker", await examineFully(page), "ms", 60],
      ["the same under a covariance", await askOnce(page, "examine", 1), "ms", 600],
      ["causes looked for", await askOnce(page, "diagnose", -1), "ms", 2000],
      ["all twelve models fitted", await fitAll(page, false), "ms", 100],
      ["the same under a covariance", await fitAll(page, true), "ms", 1500],
      ["paste to painted verdict", await pasteAndWait(page, 1), "ms", 100],
      ...(await typeAndWait(page)),
      ["1000 matrices pasted to first verdict", await pasteAndWait(page, 1000), "ms", 200],
      ["all plots redrawn at ratio 2", await redraw(browser), "ms", 50],
      ["single file to ready", median(ready), "ms", 1000],
      ["engine, gzip", wasm / 1000, "kB", 200],
    ];
  } finally {
    await browser.close();
  }
  console.log(`\n${cpus()[0]?.model ?? "unknown processor"}; medians\n`);
  for (const [what, value, unit, goal] of rows) {
    const digits = Number(value).toPrecision(3);
    console.log(`${String(what).padEnd(38)} ${digits.padStart(8)} ${unit}   goal < ${goal} ${unit}`);
  }
});

/**
 * @param {import("playwright-core").Page} page the hosted page
 * @returns {Promise<number>} milliseconds of one call
 */
async function examineQuickly(page) {
  const times = await page.evaluate(async ({ request, address }) => {
    const { quick } = await import(address);
    const blocks = [];
    for (let block = 0; block < 20; block += 1) {
      // The browser's clock is coarse, so many calls are timed together.
      const start = performance.now();
      for (let call = 0; call < 100; call += 1) quick.examine(request);
      blocks.push((performance.now() - start) / 100);
    }
    return blocks;
  }, input(page, 0));
  return median(times);
}

/**
 * @param {import("playwright-core").Page} page the hosted page
 * @returns {Promise<number>} milliseconds from the question to the answer
 */
async function examineFully(page) {
  const times = await page.evaluate(async ({ request, address }) => {
    const { ask } = await import(address);
    const single = [];
    for (let call = 0; call < 30; call += 1) {
      const start = performance.now();
      await ask("examine", [{ ...request, seed: call + 1 }], { channel: "benchmark" });
      single.push(performance.now() - start);
    }
    return single;
  }, input(page, 2000));
  return median(times);
}

/**
 * A slow question in the worker.
 * @param {import("playwright-core").Page} page the hosted page
 * @param {"examine" | "diagnose"} what the first without draws for intervals, under correlated
 *   errors of condition 1000; the second under one σ
 * @param {1 | -1} sign of the last row: −1 is a violation beyond the noise
 * @returns {Promise<number>} milliseconds
 */
async function askOnce(page, what, sign) {
  const { request, address } = input(page, 1);
  const mueller = request.mueller.map((value, k) => (k >= 12 ? sign * value : value));
  // Eigenvalues σ² (1 and fifteen times 1/1000): the identity and a matrix of ones.
  const variance = (/** @type {number} */ i, /** @type {number} */ j) => 1.6e-5 * ((i === j ? 1e-3 : 0) + 0.999 / 16);
  const covariance = Array.from({ length: 256 }, (_, k) => variance(Math.floor(k / 16), k % 16));
  const asked = { ...request, mueller, ...(what === "examine" ? { noise: { kind: "covariance", covariance } } : {}) };
  const times = await page.evaluate(async ({ asked, address, what }) => {
    const { ask } = await import(address);
    const single = [];
    for (let call = 0; call < 5; call += 1) {
      const start = performance.now();
      await ask(what, [{ ...asked, seed: call + 1 }], { channel: "benchmark" });
      single.push(performance.now() - start);
    }
    return single;
  }, { asked, address, what });
  return median(times);
}

/**
 * @param {import("playwright-core").Page} page
 * @param {boolean} isCovariance
 */
async function fitAll(page, isCovariance) {
  const { request, address } = input(page, 1);
  const { draws, seed, ...target } = request;
  const variance = (/** @type {number} */ i, /** @type {number} */ j) => 1.6e-5 * ((i === j ? 1e-3 : 0) + 0.999 / 16);
  const covariance = Array.from({ length: 256 }, (_, k) => variance(Math.floor(k / 16), k % 16));
  const asked = { ...target, ...(isCovariance ? { noise: { kind: "covariance", covariance } } : {}) };
  const times = await page.evaluate(async ({ asked, address }) => {
    const { ask } = await import(address);
    const single = [];
    for (let call = 0; call < 5; call += 1) {
      const start = performance.now();
      await ask("fit", [{ target: asked, seed: call + 1 }], { channel: "benchmark" });
      single.push(performance.now() - start);
    }
    return single;
  }, { asked, address });
  return median(times);
}

/**
 * Both tasks' plots, drawn anew because the colours of the system change.
 * @param {Awaited<ReturnType<typeof import("./browser.mjs").openBrowser>>} browser
 * @returns {Promise<number>} milliseconds of work in the frames of both tasks
 */
async function redraw(browser) {
  const { page } = await browser.open("hosted", { deviceScaleFactor: 2, viewport: { width: 1360, height: 900 } });
  await pasteAndWait(page, 1);
  await page.evaluate(() => {
    const store = /** @type {any} */ (window);
    const original = window.requestAnimationFrame.bind(window);
    store.work = [];
    window.requestAnimationFrame = (callback) =>
      original((time) => {
        const start = performance.now();
        callback(time);
        store.work.push(performance.now() - start);
      });
  });
  let sum = 0;
  // Each task draws its own plots only.
  for (const task of ["realizability", "properties"]) {
    await page.locator(`nav a[data-task="${task}"]`).click();
    await page.waitForTimeout(300);
    const times = [];
    for (let turn = 0; turn < 12; turn += 1) {
      await page.evaluate(() => (/** @type {any} */ (window).work.length = 0));
      await page.emulateMedia({ colorScheme: turn % 2 ? "light" : "dark" });
      await page.waitForTimeout(250);
      const work = await page.evaluate(() => /** @type {number[]} */ (/** @type {any} */ (window).work));
      times.push(work.reduce((total, each) => total + each, 0));
    }
    sum += median(times);
  }
  await page.context().close();
  return sum;
}

/**
 * @param {import("playwright-core").Page} page
 * @param {number} matrices in one paste
 * @returns {Promise<number>} milliseconds from the paste event to the frame with the verdict
 */
async function pasteAndWait(page, matrices) {
  const times = await page.evaluate(async ({ numbers, matrices }) => {
    const frame = () => new Promise((resolve) => requestAnimationFrame(resolve));
    const pause = (/** @type {number} */ duration) => new Promise((resolve) => setTimeout(resolve, duration));
    const verdict = (/** @type {number} */ since) =>
      performance.getEntriesByName("halfshade-verdict").find((mark) => mark.startTime >= since);
    /** The film, a little weaker each time. @param {number} step */
    const text = (step) => {
      const changed = numbers.map((value, index) => (index === 0 ? value : value * (1 - step / 20_000)).toFixed(6));
      return [0, 4, 8, 12].map((first) => changed.slice(first, first + 4).join("\t")).join("\n");
    };
    const single = [];
    for (let count = 0; count < 15; count += 1) {
      const clipboard = new DataTransfer();
      clipboard.setData("text/plain", Array.from({ length: matrices }, (_, k) => text(20 * count + k)).join("\n\n"));
      const start = performance.now();
      document.body.dispatchEvent(
        new ClipboardEvent("paste", { clipboardData: clipboard, bubbles: true, cancelable: true }),
      );
      while (!verdict(start)) {
        if (performance.now() - start > 5000) throw new Error("No verdict came within five seconds.");
        await frame();
      }
      // A frame's callback runs just before the frame is painted, a timer set in it just after.
      await frame();
      await pause(0);
      single.push(performance.now() - start);
      // The slower answers of this paste must not count against the next one, and the pastes
      // must fall on different moments between two frames.
      await pause(300 + 7 * count);
    }
    return single;
  }, { numbers: MUELLER, matrices });
  return median(times);
}

/**
 * Types over the cells as a person does, each number closed by Tab, which asks for a verdict.
 * @param {import("playwright-core").Page} page with a matrix
 * @returns {Promise<(string | number)[][]>} milliseconds from a key to the frame that shows it
 */
async function typeAndWait(page) {
  const painted = await page.evaluateHandle(() => {
    /** @type {[string, number][]} */
    const painted = [];
    const note = (/** @type {KeyboardEvent} */ { key, timeStamp }) =>
      requestAnimationFrame(() => setTimeout(() => painted.push([key, performance.now() - timeStamp])));
    document.addEventListener("keydown", note, true);
    return painted;
  });
  await page.locator("#matrix-grid td").first().focus();
  for (const number of MUELLER) {
    for (const key of [...String(number), "Tab"]) {
      await page.keyboard.press(key);
      // Not in step with the frames.
      await page.waitForTimeout(23);
    }
  }
  const times = await painted.jsonValue();
  const of = (/** @type {boolean} */ closing) => median(times.filter(([key]) => (key === "Tab") === closing).map(([, time]) => time));
  return [
    ["typing in a cell to painted", of(false), "ms", 50],
    ["Tab behind a number to painted", of(true), "ms", 50],
  ];
}

/**
 * @param {import("playwright-core").Page} page
 * @param {number} draws
 */
function input(page, draws) {
  const convention = { angles: "counterclockwise", positiveS3: "clockwise", zeroAngle: "x", time: "plus", order: "rows" };
  const noise = { kind: "uniform", sigma: 0.004 };
  const request = { mueller: MUELLER, normalised: false, absolute: false, convention, noise, draws, seed: 1 };
  return { request, address: new URL("js/engine.js", page.url()).href };
}

/** @param {number[]} values */
function median(values) {
  return values.sort((a, b) => a - b)[Math.floor(values.length / 2)] ?? NaN;
}
