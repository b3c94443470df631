// `npm run screenshots`: takes the pictures that the README shows, from the built page.

import { join } from "node:path";
import { build } from "../../www/build/build.mjs";
import { ROOT, needChromium, runMain } from "../../www/build/tools.mjs";

const FOLDER = join(ROOT, "tests", "page", "screenshots");
const EXAMPLE = "Stretched tunicate film";
/** @type {[name: string, options: import("playwright-core").BrowserContextOptions][]} */
const SCREENS = [
  ["wide", { viewport: { width: 1360, height: 900 } }],
  ["narrow", { viewport: { width: 360, height: 740 } }],
  ["dark", { viewport: { width: 1360, height: 900 }, colorScheme: "dark" }],
];

await runMain(async () => {
  await build();
  await needChromium();
  // Only now, because the browser's driver is one of the packages that the build installs.
  const { openBrowser } = await import("./browser.mjs");
  const browser = await openBrowser();
  try {
    for (const [name, options] of SCREENS) {
      const { page } = await browser.open("hosted", options);
      const titles = await page.locator("#example option").allTextContents();
      const label = titles.find((title) => title.includes(EXAMPLE)) ?? "";
      await page.locator("#example").selectOption({ label });
      await page.locator("#verdict-reason", { hasText: "(p = " }).waitFor();
      for (const task of ["realizability", "properties"]) {
        await page.locator(`nav a[data-task="${task}"]`).click();
        // Two frames: the plots are drawn in the one after the page has changed.
        await page.evaluate(() => new Promise((resolve) => requestAnimationFrame(() => requestAnimationFrame(resolve))));
        await page.screenshot({ path: join(FOLDER, `${task}-${name}.png`), fullPage: true });
      }
      await page.context().close();
    }
  } finally {
    await browser.close();
  }
});
