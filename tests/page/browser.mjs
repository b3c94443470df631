// Opens the built page in a real browser, in each of its two forms, and watches what it does.

import { join } from "node:path";
import { pathToFileURL } from "node:url";
import { chromium } from "playwright-core";
import { serve } from "../../www/build/serve.mjs";
import { DIST, needChromium } from "../../www/build/tools.mjs";

/** @typedef {import("playwright-core").Page} Page */
/** @typedef {import("playwright-core").BrowserContextOptions} ContextOptions */
/** @typedef {"hosted" | "single"} Form */

/** Both forms of the page, for tests that go over them. */
export const FORMS = /** @type {Form[]} */ (["hosted", "single"]);

/**
 * Starts a browser and a server with the hosted folder under a sub-path.
 * @returns {Promise<{
 *   open: (form: Form, options?: ContextOptions & { hash?: string }) => Promise<WatchedPage>,
 *   close: () => Promise<void>,
 * }>} `open` gives a page in a profile of its own, when the page says that it is ready
 */
export async function openBrowser() {
  const site = await serve(DIST, { path: "/some/place/" });
  const browser = await chromium.launch({
    executablePath: await needChromium(),
    args: ["--disable-background-networking", "--disable-component-update", "--disable-default-apps", "--no-first-run"],
  });
  const addresses = { hosted: site.url, single: pathToFileURL(join(DIST, "halfshade.html")).href };
  return {
    async open(form, { hash = "", ...options } = {}) {
      const context = await browser.newContext(options);
      const watched = await watch(await context.newPage());
      await watched.page.goto(addresses[form] + hash);
      await ready(watched);
      watched.requestsAfterReady.length = 0;
      return watched;
    },
    async close() {
      await browser.close();
      await site.close();
    },
  };
}

/**
 * `violations` and `errors` (of the page, and those it writes to the console) count from the start.
 * @typedef {{ page: Page, violations: string[], errors: string[], requestsAfterReady: string[] }} WatchedPage
 */

/** @param {WatchedPage} watched */
async function ready({ page, violations, errors }) {
  try {
    await page.waitForSelector("html[data-ready=true]", { state: "attached", timeout: 15_000 });
  } catch (cause) {
    throw new Error(["The page did not get ready.", ...violations, ...errors].join("\n"), { cause });
  }
}

/**
 * @param {Page} page
 * @returns {Promise<WatchedPage>}
 */
async function watch(page) {
  /** @type {WatchedPage} */
  const watched = { page, violations: [], errors: [], requestsAfterReady: [] };
  await page.exposeFunction("reportViolation", (/** @type {string} */ text) => watched.violations.push(text));
  await page.addInitScript(() => {
    const observer = new MutationObserver(() => {
      if (document.documentElement?.dataset.ready !== "true") return;
      performance.mark("halfshade-ready");
      observer.disconnect();
    });
    observer.observe(document, { attributes: true, attributeFilter: ["data-ready"], subtree: true });
    addEventListener("securitypolicyviolation", (event) => {
      const { reportViolation } = /** @type {{ reportViolation: (text: string) => void }} */ (/** @type {unknown} */ (globalThis));
      reportViolation(`${event.effectiveDirective}: ${event.blockedURI} ${event.sample}`);
    });
  });
  page.on("request", (request) => {
    // A blob lies in the page's own memory.
    if (!/^(blob|data):/.test(request.url())) watched.requestsAfterReady.push(request.url());
  });
  page.on("pageerror", (error) => watched.errors.push(String(error)));
  page.on("console", (message) => {
    if (message.type() === "error") watched.errors.push(message.text());
  });
  return watched;
}
