// The engine on a thread of its own, for what takes longer than a frame. The build bundles this
// file into one script.
//
// The first message is { module }; every further one is { id, name, args }, and is answered by
// { id, value } or { id, error: { message, code, at, fatal } }.

import * as engine from "../halfshade.js";

/** @typedef {{ module: WebAssembly.Module } | { id: number, name: string, args: unknown[] }} Message */
/** @typedef {{ message: string, code?: string, at?: unknown, fatal: boolean }} Failure */
/** @typedef {{ id: number, value: unknown } | { id: number, error: Failure }} Answer */

const functions = /** @type {Record<string, (...args: unknown[]) => unknown>} */ ({ ...engine });

// Starting from a compiled module is synchronous, so no message can arrive before the engine is there.
addEventListener("message", ({ data }) => {
  /** @type {Message} */
  const message = data;
  if ("module" in message) engine.initSync({ module: message.module });
  else postMessage(answer(message));
});

/**
 * @param {{ id: number, name: string, args: unknown[] }} request
 * @returns {Answer}
 */
function answer({ id, name, args }) {
  try {
    const call = functions[name];
    if (!call) throw new TypeError(`The engine has no function ${name}.`);
    return { id, value: call(...args) };
  } catch (thrown) {
    const { message, code, at } = /** @type {Failure} */ (thrown);
    // What the engine refuses has a code; anything else means that it broke down.
    return { id, error: { message, code, at, fatal: code === undefined } };
  }
}
