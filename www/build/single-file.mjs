// The step after Trunk's build, in the folder that becomes dist/: bundles the worker into one
// script, and packs the whole page into halfshade.html, which works by double click.

import { createHash } from "node:crypto";
import { readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { fileURLToPath } from "node:url";
import { build } from "esbuild";

const SOURCE = fileURLToPath(new URL("../", import.meta.url));

const staging = process.env.TRUNK_STAGING_DIR;
if (!staging) throw new Error("TRUNK_STAGING_DIR is not set: this script is called by trunk.");

const worker = await bundle("worker.js", "iife");
writeFileSync(join(staging, "js", "worker.js"), worker);
const page = pack(staging, await bundle("main.js", "esm"), worker);
writeFileSync(join(staging, "halfshade.html"), page);
console.log(`halfshade.html: ${Math.round(page.length / 1024)} KiB`);

/**
 * Bundles one of the page's scripts as the single file needs it.
 * @param {string} entry a file of www/js
 * @param {"esm" | "iife"} format
 * @returns {Promise<string>} the script, safe inside a script element
 */
async function bundle(entry, format) {
  const result = await build({
    entryPoints: [join(SOURCE, "js", entry)],
    bundle: true,
    write: false,
    format,
    charset: "utf8",
    target: "es2022",
    legalComments: "none",
    logLevel: "warning",
    // The generated loader names its own place only as a default, which the page never uses.
    define: { "import.meta.url": '"about:blank"' },
    plugins: [{ name: "places", setup: (builder) => setPlaces(builder) }],
  });
  // A warning is a function that the engine does not have, or the like.
  if (result.warnings.length > 0) throw new Error(`esbuild is not content with ${entry}.`);
  const text = result.outputFiles[0]?.text;
  if (!text) throw new Error(`esbuild made nothing of ${entry}.`);
  return safeScript(text);
}

/**
 * The loader lies in the build; and in one file everything comes from somewhere else.
 * @param {import("esbuild").PluginBuild} builder
 */
function setPlaces(builder) {
  builder.onResolve({ filter: /\/halfshade\.js$/ }, () => ({ path: join(String(staging), "halfshade.js") }));
  builder.onResolve({ filter: /\/where\.js$/ }, () => ({ path: join(SOURCE, "build", "where-single.js") }));
}

/**
 * @param {string} folder the built hosted folder
 * @param {string} main
 * @param {string} worker
 * @returns {string} the whole page
 */
function pack(folder, main, worker) {
  const style = readFileSync(join(folder, "style.css"), "utf8");
  if (/<\/style|@import|url\((?!["']?data:)/i.test(style)) {
    throw new Error("style.css holds a reference or an end tag, which one file can't have.");
  }
  const script = `\n${main}`;
  const policy = [
    "default-src 'none'",
    `script-src ${sourceHash(script)} 'wasm-unsafe-eval'`,
    `style-src ${sourceHash(style)}`,
    "worker-src blob:",
    "img-src data: blob:",
    "connect-src 'none'",
    "base-uri 'none'",
    "form-action 'none'",
    "require-trusted-types-for 'script'",
    "trusted-types halfshade",
  ].join("; ");
  const wasm = readFileSync(join(folder, "halfshade_bg.wasm")).toString("base64");
  const data = [
    `<script type="text/plain" id="halfshade-wasm">${wasm}</script>`,
    `<script type="text/plain" id="halfshade-worker">\n${worker}</script>`,
    `<script type="application/json" id="halfshade-examples">${readExamples(folder)}</script>`,
    `<script type="application/json" id="halfshade-train">${safeData(readFileSync(join(folder, "demo-data", "train", "kelp-film-behind-a-window.json"), "utf8"))}</script>`,
    `<script type="module">${script}</script>`,
  ].join("\n");

  let html = readFileSync(join(folder, "index.html"), "utf8");
  html = replaceOnce(html, /(<meta http-equiv="Content-Security-Policy"\s+content=")[^"]*/, (_, start) => start + policy);
  html = replaceOnce(html, /<link rel="stylesheet" href="[^"]*style\.css"[^>]*>/, () => `<style>${style}</style>`);
  html = replaceOnce(html, /<script type="module" src="[^"]*"><\/script>\s*/, () => "");
  html = replaceOnce(html, /<\/body>/, () => `${data}\n</body>`);
  const reference = html.match(/<(?:script|link|img|iframe)\b[^>]*\b(?:src|href)="(?!data:)[^"]*"/);
  if (reference) throw new Error(`The single file still refers to another one: ${reference[0]}`);
  return html;
}

/**
 * The examples with their texts.
 * @param {string} folder
 * @returns {string} JSON that is safe inside a script element
 */
function readExamples(folder) {
  const place = join(folder, "demo-data");
  /** @type {{ file: string }[]} */
  const index = JSON.parse(readFileSync(join(place, "index.json"), "utf8"));
  const examples = index.map((entry) => ({ ...entry, text: readFileSync(join(place, entry.file), "utf8") }));
  return safeData(JSON.stringify(examples));
}

/**
 * @param {string} json
 * @returns {string} JSON that is safe inside a script element
 */
function safeData(json) {
  return json.replaceAll("<", "\\u003c");
}

/**
 * An end tag or a comment's start would end or swallow the script element. esbuild writes neither
 * into code, so they stand in strings and patterns, where a backslash changes nothing.
 * @param {string} script
 */
function safeScript(script) {
  return script.replaceAll("\r\n", "\n").replace(/<(?=\/script)/gi, "<\\").replaceAll("<!--", "<\\!--");
}

/**
 * @param {string} text content of an inline element
 * @returns {string} its source expression for a Content-Security-Policy
 */
function sourceHash(text) {
  return `'sha256-${createHash("sha256").update(text).digest("base64")}'`;
}

/**
 * Replaces what must be there exactly once.
 * @param {string} text
 * @param {RegExp} pattern
 * @param {(...found: string[]) => string} replacement
 */
function replaceOnce(text, pattern, replacement) {
  const count = text.match(new RegExp(pattern, "g"))?.length ?? 0;
  if (count !== 1) throw new Error(`index.html has ${count} places like ${pattern}, not one.`);
  return text.replace(pattern, replacement);
}
