// The page in Firefox: what a person pastes there, and what a colleague sees who opens the
// link in a profile that has never seen the page. The other tests run in Chromium.

import assert from "node:assert/strict";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { pathToFileURL } from "node:url";
import { serve } from "../../www/build/serve.mjs";
import { DIST } from "../../www/build/tools.mjs";
import { openFirefox, until } from "./firefox.mjs";

/** @typedef {import("./firefox.mjs").Firefox} Firefox */

// An invented kelp film; one row a line.
const FILM = [
  ["0.9550", "0.0226", "0.0327", "0.0038"],
  ["0.0190", "0.6733", "0.2540", "-0.6306"],
  ["0.0297", "0.2500", "0.7353", "0.5698"],
  ["0.0003", "0.6339", "-0.5648", "0.4469"],
];

/** @type {Awaited<ReturnType<typeof serve>>} */
let site;
/** @type {Firefox[]} */
let browsers = [];
before(async () => {
  site = await serve(DIST, { path: "/some/place/" });
  browsers = await Promise.all([openFirefox(), openFirefox(), openFirefox()]);
});
after(async () => {
  await Promise.all(browsers.map((browser) => browser.close()));
  await site?.close();
});

/**
 * Opens the page, and waits until it is ready.
 * @param {Firefox} browser
 * @param {string} address
 */
async function open(browser, address) {
  // The same address with another fragment would not load again.
  await browser.goto("about:blank");
  await browser.goto(address);
  await until("The page does not get ready", () => browser.evaluate("return document.documentElement.dataset.ready === 'true'"));
}

/** @param {Firefox} browser */
async function seen(browser) {
  // The size of the noise that would explain the matrix comes last, from the worker.
  const reason = await until("There is no verdict", () =>
    browser.evaluate("const text = document.getElementById('verdict-reason')?.textContent ?? ''; return /on each element would explain it/.test(text) ? text : ''"),
  );
  return {
    reason,
    verdict: await browser.evaluate("return document.getElementById('task-heading').textContent"),
    cells: await browser.evaluate("return [...document.querySelectorAll('#matrix-grid td')].map((cell) => cell.title)"),
  };
}

/**
 * Goes to an empty page with a text field, which has the keyboard.
 * @param {Firefox} browser
 */
async function goToField(browser) {
  await browser.goto("about:blank");
  await browser.evaluate("document.body.append(document.createElement('textarea'))");
  await browser.click("textarea");
}

/** Puts a text on the clipboard, by Ctrl+C. @param {Firefox} browser @param {string} text */
async function copy(browser, text) {
  await goToField(browser);
  await browser.evaluate("const field = document.querySelector('textarea'); field.value = arguments[0]; field.select();", text);
  await browser.shortcut("c");
}

/** The text on the clipboard, by Ctrl+V. @param {Firefox} browser */
async function clipboard(browser) {
  await goToField(browser);
  await browser.shortcut("v");
  return until("Nothing is on the clipboard", () => browser.evaluate("return document.querySelector('textarea').value"));
}

for (const form of /** @type {const} */ (["hosted", "single"])) {
  test(`Firefox, ${form}: Ctrl+V, a verdict, and a link that shows a colleague the same`, async () => {
    const [mine, ...others] = browsers;
    const theirs = others[form === "hosted" ? 0 : 1];
    assert.ok(mine && theirs);
    const address = form === "hosted" ? site.url : pathToFileURL(join(DIST, "halfshade.html")).href;
    await copy(mine, FILM.map((row) => row.join("\t")).join("\r\n"));
    await open(mine, address);
    await mine.shortcut("v");
    await until("The paste was not read", () => mine.evaluate("return document.querySelector('#matrix-grid td').title.includes('=')"));
    const here = await seen(mine);
    assert.equal(here.verdict, "Not realizable as it stands; no noise is stated");
    assert.deepEqual(here.cells, FILM.flatMap((row, i) => row.map((number, j) => `m${i}${j} = ${number.replace("-", "\u2212")}`)));

    await mine.click("#copy-link");
    await until("The link was not copied", () => mine.evaluate("return /Link copied/.test(document.getElementById('status').textContent)"));
    const link = /\S*#v1\.\S+/.exec(await clipboard(mine))?.[0] ?? "";
    assert.ok(link.startsWith(form === "hosted" ? `${site.url}#v1.` : "#v1."), link);
    await open(theirs, link.startsWith("#") ? address + link : link);
    assert.deepEqual(await seen(theirs), here);
    assert.match(await theirs.evaluate("return document.getElementById('banner').textContent"), /Loaded from a link/);
  });
}
