// Drives a Firefox by its own remote protocol, Marionette: JSON over a socket, each message
// behind its length in bytes. Its commands are those of the W3C's WebDriver.

import { spawn } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { connect } from "node:net";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { needFirefox } from "../../www/build/tools.mjs";

// The names of the W3C's WebDriver for an element and for keys.
const ELEMENT = "element-6066-11e4-a52e-4f735466cecf";
const CONTROL = "\uE009";

const PREFERENCES = {
  "marionette.port": 0,
  // A page of a file may read no other file, as for everybody; drivers relax this.
  "security.fileuri.strict_origin_policy": true,
  "browser.shell.checkDefaultBrowser": false,
  "browser.startup.page": 0,
  "browser.aboutwelcome.enabled": false,
  "datareporting.policy.dataSubmissionEnabled": false,
  "toolkit.telemetry.reportingpolicy.firstRun": false,
  // It talks to nobody but the page.
  "app.update.disabledForTesting": true,
  "app.normandy.enabled": false,
  "extensions.update.enabled": false,
  "network.captive-portal-service.enabled": false,
  "network.connectivity-service.enabled": false,
  "services.settings.server": "data:,none",
};

/** Starts a Firefox with a profile that has never been used. */
export async function openFirefox() {
  const path = await needFirefox();
  const profile = mkdtempSync(join(tmpdir(), "halfshade-firefox-"));
  const lines = Object.entries(PREFERENCES).map(([name, value]) => `user_pref("${name}", ${JSON.stringify(value)});`);
  writeFileSync(join(profile, "user.js"), lines.join("\n"));
  const child = spawn(path, ["--headless", "--marionette", "--no-remote", "--profile", profile], {
    stdio: "ignore",
    // Firefox refuses to run as root in the home of another.
    env: { ...process.env, HOME: profile },
  });
  const ended = new Promise((resolve) => child.once("exit", resolve).once("error", resolve));
  const remove = () => rmSync(profile, { recursive: true, force: true, maxRetries: 5 });
  try {
    const port = await until("Firefox opens no port for tests", () => Number(textOf(join(profile, "MarionetteActivePort"))));
    const firefox = new Firefox(await socketTo(port), async () => {
      await ended;
      remove();
    });
    await firefox.send("WebDriver:NewSession", { strictFileInteractability: true });
    return firefox;
  } catch (error) {
    child.kill("SIGKILL");
    await ended;
    remove();
    throw error;
  }
}

/** A Firefox with one page. */
export class Firefox {
  /**
   * @param {import("node:net").Socket} socket
   * @param {() => Promise<void>} ended
   */
  constructor(socket, ended) {
    this.socket = socket;
    this.ended = ended;
    this.count = 0;
    /** @type {Map<number, { resolve: (result: any) => void, reject: (error: Error) => void }>} */
    this.waiting = new Map();
    let buffer = Buffer.alloc(0);
    socket.on("data", (data) => {
      buffer = Buffer.concat([buffer, data]);
      for (;;) {
        const colon = buffer.indexOf(":");
        const end = colon + 1 + Number(buffer.subarray(0, Math.max(colon, 0)).toString());
        if (colon < 0 || buffer.length < end) return;
        this.take(JSON.parse(buffer.subarray(colon + 1, end).toString()));
        buffer = buffer.subarray(end);
      }
    });
    socket.on("close", () => {
      for (const { reject } of this.waiting.values()) reject(new Error("Firefox closed the connection."));
      this.waiting.clear();
    });
    socket.on("error", () => {});
  }

  /** @param {[number, number, { error: string, message: string } | null, any] | Record<string, unknown>} message the first is a greeting */
  take(message) {
    if (!Array.isArray(message)) return;
    const [, id, error, result] = message;
    const asked = this.waiting.get(id);
    this.waiting.delete(id);
    if (error) asked?.reject(new Error(`${error.error}: ${error.message}`));
    else asked?.resolve(result);
  }

  /**
   * @param {string} command
   * @param {Record<string, unknown>} [parameters]
   * @returns {Promise<any>}
   */
  send(command, parameters = {}) {
    this.count += 1;
    const text = JSON.stringify([0, this.count, command, parameters]);
    return new Promise((resolve, reject) => {
      this.waiting.set(this.count, { resolve, reject });
      this.socket.write(`${Buffer.byteLength(text)}:${text}`);
    });
  }

  /** @param {string} address */
  async goto(address) {
    await this.send("WebDriver:Navigate", { url: address });
  }

  /**
   * @param {string} script the body of a function
   * @param {unknown[]} args
   * @returns {Promise<any>} what it returns
   */
  async evaluate(script, ...args) {
    return (await this.send("WebDriver:ExecuteScript", { script, args })).value;
  }

  /** @param {string} selector */
  async click(selector) {
    const { value } = await this.send("WebDriver:FindElement", { using: "css selector", value: selector });
    await this.send("WebDriver:ElementClick", { id: value[ELEMENT] });
  }

  /** @param {string} key pressed with Ctrl */
  async shortcut(key) {
    const press = (/** @type {string} */ type, /** @type {string} */ value) => ({ type, value });
    const actions = [press("keyDown", CONTROL), press("keyDown", key), press("keyUp", key), press("keyUp", CONTROL)];
    await this.send("WebDriver:PerformActions", { actions: [{ type: "key", id: "keyboard", actions }] });
  }

  async close() {
    await this.send("Marionette:Quit", { flags: ["eForceQuit"] });
    this.socket.destroy();
    await this.ended();
  }
}

/**
 * Waits until something is there.
 * @template T
 * @param {string} failure
 * @param {() => T | Promise<T>} look
 * @returns {Promise<T>}
 */
export async function until(failure, look) {
  const start = performance.now();
  for (;;) {
    const found = await look();
    if (found) return found;
    if (performance.now() - start > 20_000) throw new Error(`${failure}, for 20 seconds.`);
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
}

/** @param {string} path */
function textOf(path) {
  try {
    return readFileSync(path, "utf8");
  } catch {
    return "";
  }
}

/**
 * @param {number} port
 * @returns {Promise<import("node:net").Socket>}
 */
function socketTo(port) {
  return new Promise((resolve, reject) => {
    const socket = connect(port, "127.0.0.1");
    socket.once("connect", () => resolve(socket)).once("error", reject);
  });
}
