// `npm test`: runs everything, and installs what that needs. Some parts alone:
// `npm test -- --only rust,page`; their names are the first words of the list below.

import { readdirSync } from "node:fs";
import { join } from "node:path";
import { build } from "../www/build/build.mjs";
import { ROOT, StepError, needChromium, needFirefox, needPython, needRust, run, runMain } from "../www/build/tools.mjs";

const REQUIREMENTS = "tests/reference/requirements.txt";
const FIXTURES = "tests/reference/fixtures.py";
const WEIGHTED = "tests/reference/weighted.py";
const FITTING = "tests/reference/fitting.py";
const HARMONIC = "tests/reference/harmonic.py";
const TRAIN = "tests/reference/train.py";

/** @type {[name: string, what: string, step: () => Promise<void>][]} */
const STEPS = [
  ["format", "the Rust source is formatted", () => cargo("fmt", "--check")],
  ["lint", "clippy finds nothing", () => cargo("clippy", "--locked", "--all-targets", "--", "-D", "warnings")],
  ["docs", "the documentation is complete", () => cargo("doc", "--locked", "--no-deps")],
  ["rust", "the engine's tests", () => cargo("test", "--locked")],
  ["fixtures", "the fixtures can be made again", fixtures],
  ["published", "the published values, recomputed", () => python(FIXTURES, "--published")],
  ["build", "the page is built", build],
  ["types", "the types of the scripts", types],
  ["node", "the engine's interface in Node", () => nodeTests("tests/node")],
  ["page", "the page in a browser", () => nodeTests("tests/page")],
];

await runMain(async () => {
  const steps = chosen(process.argv.slice(2));
  /** @type {string[]} */
  const report = [];
  let failures = 0;
  for (const [name, what, step] of steps) {
    console.log(`\n=== ${name}: ${what}`);
    const start = performance.now();
    let outcome = "passed";
    try {
      await step();
    } catch (error) {
      console.error(error instanceof StepError ? error.message : error);
      outcome = "FAILED";
      failures += 1;
    }
    const seconds = ((performance.now() - start) / 1000).toFixed(1);
    report.push(`${outcome}  ${name.padEnd(10)} ${seconds.padStart(6)} s`);
  }
  console.log(`\n${report.join("\n")}\n\n${steps.length - failures} passed, ${failures} failed`);
  if (failures > 0) process.exitCode = 1;
});

/**
 * The steps that the command line asks for.
 * @param {string[]} args
 */
function chosen(args) {
  if (args.length === 0) return STEPS;
  const names = (args.length === 1 ? args[0]?.replace(/^--only=/, "") : args[1])?.split(",") ?? [];
  const known = STEPS.map(([name]) => name);
  const unknown = names.find((name) => !known.includes(name));
  if (!args[0]?.startsWith("--only") || args.length > 2 || unknown !== undefined) {
    throw new StepError(`Say --only with a list of these: ${known.join(",")}`);
  }
  return STEPS.filter(([name]) => names.includes(name));
}

/** @param {string[]} args */
async function cargo(...args) {
  await needRust();
  await run("cargo", args, { RUSTDOCFLAGS: "-D warnings" });
}

/** @param {string[]} args */
async function python(...args) {
  await run(await needPython(REQUIREMENTS), args);
}

async function fixtures() {
  await python(FIXTURES, "--check");
  await python(WEIGHTED, "--check");
  await python(FITTING, "--check");
  await python(HARMONIC, "--check");
  await python(TRAIN, "--check");
}

async function types() {
  await build();
  await run(process.execPath, [join("node_modules", "typescript", "bin", "tsc")]);
}

/**
 * Runs the files `*.test.mjs` of a folder against a fresh build.
 * @param {string} folder
 */
async function nodeTests(folder) {
  await build();
  const files = readdirSync(join(ROOT, folder)).filter((file) => file.endsWith(".test.mjs"));
  if (files.length === 0) throw new StepError(`There is no test in ${folder}.`);
  /** @type {Record<string, string>} */
  const browsers = {};
  if (folder.endsWith("page")) {
    // Found or installed once, before the files run side by side.
    browsers.HALFSHADE_CHROMIUM = await needChromium();
    browsers.HALFSHADE_FIREFOX = await needFirefox();
  }
  await run(process.execPath, ["--test", ...files.map((file) => `${folder}/${file}`)], browsers);
}
