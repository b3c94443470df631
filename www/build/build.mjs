// Builds dist/: the hosted folder and the single file. Does nothing where nothing has changed.
// As a command: `npm run build`.

import { createHash } from "node:crypto";
import { existsSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { fileURLToPath } from "node:url";
import { DIST, ROOT, needCargoTools, needPackages, needRust, run, runMain } from "./tools.mjs";

const SOURCES = ["Cargo.toml", "Cargo.lock", "Trunk.toml", "rust-toolchain.toml", "package-lock.json", "src", "www", "demo-data"];
const STAMP = join(ROOT, "target", "dist-stamp");

/** Installs what is missing and builds dist/. */
export async function build() {
  await needPackages();
  await needRust();
  const state = fingerprint();
  if (existsSync(join(DIST, "halfshade.html")) && existsSync(STAMP) && readFileSync(STAMP, "utf8") === state) {
    console.log("dist/ is up to date.");
    return;
  }
  await needCargoTools();
  // A failed build leaves the old dist/ in place, and it must not pass for the new one.
  rmSync(STAMP, { force: true });
  await run("trunk", ["build", "--release"]);
  writeFileSync(STAMP, state);
}

/** A text that changes with every change of the sources. */
function fingerprint() {
  const hash = createHash("sha256");
  for (const source of SOURCES) {
    const path = join(ROOT, source);
    const inner = statSync(path).isDirectory() ? readdirSync(path, { recursive: true, encoding: "utf8" }) : [""];
    for (const name of inner.sort()) {
      const file = join(path, name);
      if (statSync(file).isFile()) hash.update(`${file}\n`).update(readFileSync(file)).update("\n");
    }
  }
  return hash.digest("hex");
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await runMain(build);
