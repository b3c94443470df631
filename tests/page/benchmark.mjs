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
      ["examine, 2000 draws, in the worker", await examineFully(page), "ms", 30],
      ["paste to painted verdict", await pasteAndWait(page), "ms", 100],
      ["single file to ready", median(ready), "ms", 1000],
      ["engine, gzip", wasm / 1000, "kB", 200],
    ];
  } finally {
    await browser.close();
  }
  console.log(`\n${cpus()[0]?.model ?? "unknown processor"}; medians\n`);
  for (const [what, value, unit, goal] of rows) {
    const digits = Number(value).toPrecision(3);
    console.log(`${String(what).padEnd(36)} ${digits.padStart(8)} ${unit}   goal < ${goal} ${unit}`);
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
 * @param {import("playwright-core").Page} page
 * @returns {Promise<number>} milliseconds from the paste event to the frame with the verdict
 */
async function pasteAndWait(page) {
  const times = await page.evaluate(async (numbers) => {
    const frame = () => new Promise((resolve) => requestAnimationFrame(resolve));
    const pause = (/** @type {number} */ duration) => new Promise((resolve) => setTimeout(resolve, duration));
    const verdict = (/** @type {number} */ since) =>
      performance.getEntriesByName("halfshade-verdict").find((mark) => mark.startTime >= since);
    const single = [];
    for (let count = 0; count < 15; count += 1) {
      const changed = numbers.map((value, index) => (index === 0 ? value : value * (1 - count / 1000)));
      const clipboard = new DataTransfer();
      const rows = [0, 4, 8, 12].map((first) => changed.slice(first, first + 4).join("\t"));
      clipboard.setData("text/plain", rows.join("\n"));
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
  }, MUELLER);
  return median(times);
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
