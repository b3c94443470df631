// The engine in two instances of one compiled module: on the main thread for drawing and quick
// answers, in a worker for everything that takes longer.

import * as engine from "../halfshade.js";
import { loadModule, loadWorker } from "./where.js";

/** @typedef {Omit<typeof engine, "default" | "initSync">} Engine */
/** @typedef {import("./worker.js").Answer} Answer */

/**
 * Every failure of the engine and of its façade.
 *
 * Codes of the façade itself: `superseded` and `cancelled` (nothing went wrong, the answer is just
 * not wanted any more: see `isDropped`), `engine-broke-down` (the engine stopped in the middle and
 * was started again), `engine-not-loaded`, `webassembly-switched-off`. All others are the engine's.
 */
export class EngineError extends Error {
  /**
   * @param {string} code
   * @param {string} message
   * @param {unknown} [at] the place that the engine names: a field, or line and character
   */
  constructor(code, message, at) {
    super(message);
    this.name = "EngineError";
    this.code = code;
    this.at = at;
  }
}

/**
 * Whether a request ended because a newer one or `cancel` took its place. Nothing need be shown.
 * @param {unknown} error
 */
export function isDropped(error) {
  return error instanceof EngineError && (error.code === "superseded" || error.code === "cancelled");
}

/** @typedef {{ id: number, name: string, args: unknown[], channel: string, resolve: (value: any) => void, reject: (error: EngineError) => void }} Request */

/** How long a running request that nobody waits for any more may keep the worker, in milliseconds. */
const PATIENCE_MS = 50;

/** @type {Promise<void> | undefined} */
let starting;
/** @type {WebAssembly.Module | undefined} */
let module;
/** @type {(() => Worker) | undefined} */
let newWorker;
/** @type {Worker | undefined} */
let worker;
/** @type {Request[]} */
let waiting = [];
/** @type {Request | undefined} */
let running;
let lastId = 0;

/**
 * Loads both instances. Further calls give the same promise.
 * @returns {Promise<void>} fails with an EngineError
 */
export function startEngine() {
  starting ??= load();
  return starting;
}

/**
 * The engine's functions on the main thread, for what takes less than a frame: reading, links,
 * rounding, drawing, `examine` with `draws: 0`. They throw an EngineError.
 */
export const quick = /** @type {Engine} */ (guardAll());

/**
 * Asks the worker. In a channel only the newest request counts: an older one that has no answer
 * yet fails as `superseded`.
 * @template {keyof Engine} Name
 * @param {Name} name a function of the engine
 * @param {Parameters<Engine[Name]>} args
 * @param {{ channel?: string }} [options] the channel; without one, the function's name
 * @returns {Promise<ReturnType<Engine[Name]>>} fails with an EngineError
 */
export function ask(name, args, { channel = name } = {}) {
  drop(channel, new EngineError("superseded", "A newer request took the place of this one."));
  return new Promise((resolve, reject) => {
    lastId += 1;
    waiting.push({ id: lastId, name, args, channel, resolve, reject });
    startEngine().then(next, (error) => {
      waiting = waiting.filter((request) => request.reject !== reject);
      reject(error);
    });
  });
}

/**
 * Ends what the worker does for a channel; its request fails as `cancelled`.
 * @param {string} channel
 */
export function cancel(channel) {
  const isRunning = running?.channel === channel;
  drop(channel, new EngineError("cancelled", "The calculation was cancelled."));
  if (isRunning) restart();
}

async function load() {
  if (typeof WebAssembly === "undefined") {
    throw new EngineError(
      "webassembly-switched-off",
      "A policy of this browser has switched WebAssembly off, and Halfshade can't calculate without it. " +
        "The administrator can allow it for this page alone, with the policy JavaScriptJitAllowedForSites.",
    );
  }
  try {
    const [compiled, starter] = await Promise.all([loadModule(), loadWorker()]);
    await engine.default({ module_or_path: compiled });
    module = compiled;
    newWorker = starter;
    hire();
  } catch (thrown) {
    const reason = thrown instanceof Error ? thrown.message : String(thrown);
    throw new EngineError("engine-not-loaded", `The engine could not be loaded: ${reason}`);
  }
}

/** Starts a worker, if there is none. */
function hire() {
  if (worker || !newWorker) return;
  const fresh = newWorker();
  fresh.onmessage = ({ data }) => receive(data);
  fresh.onerror = () => {
    const request = running;
    restart();
    request?.reject(brokeDown("The worker stopped"));
  };
  fresh.postMessage({ module });
  worker = fresh;
}

/** Ends the worker. The next request starts another one. */
function restart() {
  worker?.terminate();
  worker = undefined;
  running = undefined;
  next();
}

/** Sends the next request, if the worker is free. */
function next() {
  if (running || waiting.length === 0) return;
  hire();
  running = waiting.shift();
  if (running) worker?.postMessage({ id: running.id, name: running.name, args: running.args });
}

/** @param {Answer} answer */
function receive(answer) {
  const request = running;
  if (request?.id !== answer.id) return;
  running = undefined;
  if ("value" in answer) {
    request.resolve(answer.value);
  } else if (answer.error.fatal) {
    restart();
    request.reject(brokeDown(answer.error.message));
  } else {
    const { code, message, at } = answer.error;
    request.reject(new EngineError(code ?? "", message, at));
  }
  next();
}

/**
 * Takes a channel's request out of the queue. A running one may finish quickly; otherwise its
 * worker ends, so that it holds up nobody.
 * @param {string} channel
 * @param {EngineError} error
 */
function drop(channel, error) {
  for (const request of waiting) if (request.channel === channel) request.reject(error);
  waiting = waiting.filter((request) => request.channel !== channel);
  const request = running;
  if (request?.channel !== channel) return;
  request.reject(error);
  setTimeout(() => {
    if (running === request) restart();
  }, PATIENCE_MS);
}

/** The functions of the main thread's instance, each of which reports a breakdown as an EngineError. */
function guardAll() {
  /** @type {Record<string, unknown>} */
  const guarded = {};
  for (const [name, value] of Object.entries(engine)) {
    if (name === "default" || name === "initSync" || typeof value !== "function") continue;
    guarded[name] = guard(/** @type {(...args: unknown[]) => unknown} */ (value));
  }
  return guarded;
}

/** @param {(...args: unknown[]) => unknown} call */
function guard(call) {
  return (/** @type {unknown[]} */ ...args) => {
    if (!module) throw new EngineError("engine-not-loaded", "The engine is still loading.");
    try {
      return call(...args);
    } catch (thrown) {
      const { code, message, at } = /** @type {{ code?: string, message: string, at?: unknown }} */ (thrown);
      if (code !== undefined) throw new EngineError(code, message, at);
      // The engine's panic hook has asked for a new instance. The next call makes it, but only
      // after it has put its text into the old one, so this call is one without a text.
      engine.engineInfo();
      throw brokeDown(message);
    }
  };
}

/** @param {string} reason */
function brokeDown(reason) {
  return new EngineError(
    "engine-broke-down",
    `The engine broke down on this input and was started again (${reason}). ` +
      "Your numbers are still here. Please report what led to this.",
  );
}
