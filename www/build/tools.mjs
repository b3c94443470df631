// Finds, or installs into the project's own folder, what the build and the tests need.
// Only Node's own modules are used here, because this runs before node_modules exists.

import { spawn, spawnSync } from "node:child_process";
import { existsSync, readFileSync } from "node:fs";
import { delimiter, join } from "node:path";
import { fileURLToPath } from "node:url";

const WINDOWS = process.platform === "win32";

/** The project's folder. */
export const ROOT = fileURLToPath(new URL("../../", import.meta.url));
/** The folder that is served. */
export const DIST = join(ROOT, "dist");

const CARGO_TOOLS = join(ROOT, "target", "tools");
const WASM_TARGET = "wasm32-unknown-unknown";
const TRUNK = "0.21.14";

/** A failure whose message tells all: it is printed without a stack. */
export class StepError extends Error {}

/**
 * The environment of every command: the project's own tools come first on the PATH.
 * @returns {NodeJS.ProcessEnv}
 */
export function environment() {
  const path = [join(CARGO_TOOLS, "bin"), join(ROOT, "node_modules", ".bin"), process.env.PATH];
  return { ...process.env, PATH: path.join(delimiter) };
}

/**
 * Runs a command in the project's folder and shows its output.
 * @param {string} command
 * @param {string[]} args
 * @param {Record<string, string>} [variables] added to the environment
 * @returns {Promise<void>} fails with a StepError where the command fails
 */
export async function run(command, args, variables = {}) {
  console.log(`> ${[command, ...args].join(" ")}`);
  const child = spawn(command, args, {
    cwd: ROOT,
    env: { ...environment(), ...variables },
    stdio: "inherit",
  });
  await new Promise((resolve, reject) => {
    child.on("error", (error) => reject(new StepError(`${command} did not start: ${error.message}`)));
    child.on("exit", (code, signal) => {
      if (code === 0) resolve(undefined);
      else reject(new StepError(`${command} ended with ${signal ?? `exit code ${code}`}`));
    });
  });
}

/**
 * Runs a command silently.
 * @param {string} command
 * @param {string[]} args
 * @returns {string | undefined} what it printed; undefined where it failed or does not exist
 */
function output(command, args) {
  const result = spawnSync(command, args, { cwd: ROOT, env: environment(), encoding: "utf8" });
  return result.status === 0 ? result.stdout : undefined;
}

/** Installs the packages of package-lock.json, unless they are there. */
export async function needPackages() {
  if (packagesPresent()) return;
  const args = ["ci", "--ignore-scripts", "--no-audit", "--no-fund"];
  const npm = process.env.npm_execpath;
  if (npm) await run(process.execPath, [npm, ...args]);
  else await run("npm", args);
}

/** Whether node_modules holds what package-lock.json names, in the same versions. */
function packagesPresent() {
  const installed = join(ROOT, "node_modules", ".package-lock.json");
  if (!existsSync(installed)) return false;
  const present = JSON.parse(readFileSync(installed, "utf8")).packages;
  const wanted = JSON.parse(readFileSync(join(ROOT, "package-lock.json"), "utf8")).packages;
  return Object.entries(wanted).every(
    // Optional packages are those of other platforms.
    ([path, { version, optional }]) =>
      path === "" || (present[path] ? present[path].version === version : optional),
  );
}

/** Makes sure of the Rust toolchain of rust-toolchain.toml with its WebAssembly target. */
export async function needRust() {
  if (output("cargo", ["--version"]) && !output("rustup", ["--version"])) {
    // A Rust without rustup: only its own package manager can add a target.
    const library = join(output("rustc", ["--print", "sysroot"])?.trim() ?? "", "lib", "rustlib", WASM_TARGET);
    if (existsSync(library)) return;
    throw new StepError(`This Rust has no target ${WASM_TARGET}. Install rustup from https://rustup.rs and start again.`);
  }
  if (!output("rustup", ["--version"])) {
    throw new StepError("Rust is missing. Install rustup from https://rustup.rs and start again.");
  }
  const channel = valueIn("rust-toolchain.toml", /^channel = "(.+)"/m);
  const installed = output("rustup", ["target", "list", "--installed", "--toolchain", channel]);
  if (installed?.split(/\s+/).includes(WASM_TARGET)) return;
  if (installed === undefined) {
    const components = ["--component", "rustfmt", "--component", "clippy"];
    await run("rustup", ["toolchain", "install", channel, "--profile", "minimal", ...components]);
  }
  await run("rustup", ["target", "add", WASM_TARGET, "--toolchain", channel]);
}

/** Builds trunk and wasm-bindgen into target/tools, unless they are there in the right version. */
export async function needCargoTools() {
  const bindgen = valueIn("Cargo.toml", /^wasm-bindgen = "=(.+)"/m);
  if (!output("trunk", ["--version"])?.includes(TRUNK)) {
    await installCargoTool("trunk", TRUNK, ["--locked"]);
  }
  if (!output("wasm-bindgen", ["--version"])?.includes(bindgen)) {
    // Its lock file names a version that can't be had any more, so without --locked.
    await installCargoTool("wasm-bindgen-cli", bindgen, []);
  }
}

/**
 * An unoptimised tool does the same work, and is built in a third of the time.
 * @param {string} name
 * @param {string} version
 * @param {string[]} options
 */
async function installCargoTool(name, version, options) {
  console.log(`Building ${name} ${version} into target/tools: once, for a few minutes.`);
  const fixed = ["--root", CARGO_TOOLS, "--no-default-features", "--debug"];
  await run("cargo", ["install", name, "--version", version, ...fixed, ...options], {
    CARGO_PROFILE_DEV_DEBUG: "0",
  });
}

/**
 * The Python of a virtual environment that holds the packages of a requirements file.
 * @param {string} requirements path from the project's folder
 * @returns {Promise<string>} path of the interpreter
 */
export async function needPython(requirements) {
  const folder = join(ROOT, "target", "venv");
  const python = WINDOWS ? join(folder, "Scripts", "python.exe") : join(folder, "bin", "python");
  const wanted = readFileSync(join(ROOT, requirements), "utf8").match(/^[\w-]+==[^\s;]+/gm) ?? [];
  const present = existsSync(python) && output(python, ["-m", "pip", "freeze", "--all"]);
  const lines = new Set((present || "").toLowerCase().split(/\s+/));
  if (present && wanted.every((line) => lines.has(line.toLowerCase()))) return python;
  if (!present) {
    const system = ["python3", "python"].find((name) => output(name, ["--version"])?.startsWith("Python 3"));
    if (!system) throw new StepError("Python 3 is missing: install it with its venv module and start again.");
    await run(system, ["-m", "venv", "--clear", folder]);
  }
  await run(python, ["-m", "pip", "install", "--disable-pip-version-check", "-r", join(ROOT, requirements)]);
  return python;
}

/**
 * A Chromium or Chrome: that of HALFSHADE_CHROMIUM, an installed one, or a new one from apt-get.
 * @returns {Promise<string>} its path
 */
export async function needChromium() {
  const advice = "Install Chromium or Chrome, or set HALFSHADE_CHROMIUM to the path of one.";
  return findChromium() ?? installed("chromium", findChromium, advice);
}

/**
 * A Firefox: that of HALFSHADE_FIREFOX, an installed one, or a new one from apt-get.
 * @returns {Promise<string>} its path
 */
export async function needFirefox() {
  const advice = "Install Firefox (on Debian the package firefox-esr), or set HALFSHADE_FIREFOX to the path of one.";
  return findFirefox() ?? installed("firefox-esr", findFirefox, advice);
}

/**
 * @param {string} name of the package
 * @param {() => string | undefined} find
 * @param {string} advice where it can't be installed
 * @returns {Promise<string>} the path of a browser from apt-get
 */
async function installed(name, find, advice) {
  if (process.getuid?.() !== 0 || !output("apt-get", ["--version"])) {
    throw new StepError(`A browser is missing. ${advice}`);
  }
  const variables = { DEBIAN_FRONTEND: "noninteractive" };
  await run("apt-get", ["update"], variables);
  await run("apt-get", ["install", "--yes", "--no-install-recommends", name], variables);
  const found = find();
  if (!found) throw new StepError(`apt-get installed no ${name}. ${advice}`);
  return found;
}

/**
 * Looks for a Chromium or Chrome.
 * @returns {string | undefined} its path
 */
export function findChromium() {
  const names = ["chromium", "chromium-browser", "google-chrome-stable", "google-chrome", "chrome", "microsoft-edge"];
  return findBrowser("HALFSHADE_CHROMIUM", names, [
    "/Applications/Google Chrome.app/Contents/MacOS/Google Chrome",
    "/Applications/Chromium.app/Contents/MacOS/Chromium",
    "C:\\Program Files\\Google\\Chrome\\Application\\chrome.exe",
    "C:\\Program Files (x86)\\Microsoft\\Edge\\Application\\msedge.exe",
  ]);
}

/**
 * Looks for a Firefox, first for one with extended support.
 * @returns {string | undefined} its path
 */
function findFirefox() {
  return findBrowser("HALFSHADE_FIREFOX", ["firefox-esr", "firefox"], [
    "/Applications/Firefox.app/Contents/MacOS/firefox",
    "C:\\Program Files\\Mozilla Firefox\\firefox.exe",
  ]);
}

/**
 * @param {string} variable of the environment that may name one
 * @param {string[]} names on the PATH
 * @param {string[]} usual paths
 * @returns {string | undefined} its path
 */
function findBrowser(variable, names, usual) {
  const named = process.env[variable];
  if (named) {
    if (existsSync(named)) return named;
    throw new StepError(`${variable} names ${named}, which does not exist.`);
  }
  const folders = (process.env.PATH ?? "").split(delimiter);
  const candidates = names.flatMap((name) => folders.map((folder) => join(folder, name)));
  return [...candidates, ...usual].find((path) => existsSync(path));
}

/**
 * One value of a file of the project.
 * @param {string} file path from the project's folder
 * @param {RegExp} pattern its first group is the value
 */
function valueIn(file, pattern) {
  const found = readFileSync(join(ROOT, file), "utf8").match(pattern);
  if (!found?.[1]) throw new StepError(`${file} has no line like ${pattern}.`);
  return found[1];
}

/**
 * Runs a script's main function; a failure ends the process with exit code 1.
 * @param {() => Promise<void>} main
 */
export async function runMain(main) {
  try {
    await main();
  } catch (error) {
    console.error(error instanceof StepError ? error.message : error);
    process.exitCode = 1;
  }
}
