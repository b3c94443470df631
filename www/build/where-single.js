// The twin of js/where.js in the single file: everything lies in data elements of the page.

/** @typedef {import("../js/types.js").Example} Example */

/** Whether the page is the single file. */
export const isSingleFile = true;

/** Of the browser, and not of the work: no measured number is kept there. */
const ADDRESS = "halfshade-address";

/** Where a colleague finds the page, as the person said once; empty where nobody did. */
export function publicAddress() {
  try {
    return localStorage.getItem(ADDRESS) ?? "";
  } catch {
    return "";
  }
}

/**
 * @param {string} address anything else than a web address forgets it
 */
export function setPublicAddress(address) {
  const plain = address.trim().split("#")[0] ?? "";
  try {
    localStorage.setItem(ADDRESS, /^https?:\/\/\S+$/.test(plain) ? plain : "");
  } catch {
    // Storage can be switched off: then links hold the fragment alone.
  }
}

/**
 * Compiles the engine.
 * @returns {Promise<WebAssembly.Module>}
 */
export async function loadModule() {
  const binary = atob(dataOf("halfshade-wasm"));
  const bytes = new Uint8Array(binary.length);
  for (let index = 0; index < bytes.length; index += 1) bytes[index] = binary.charCodeAt(index);
  return WebAssembly.compile(bytes);
}

/**
 * Reads the worker's script.
 * @returns {Promise<() => Worker>} starts a worker, as often as wanted
 */
export async function loadWorker() {
  const address = URL.createObjectURL(new Blob([dataOf("halfshade-worker")], { type: "text/javascript" }));
  const trusted = trustedAddress(address);
  return () => new Worker(trusted);
}

/**
 * The examples with their texts.
 * @returns {Promise<Example[]>}
 */
export async function loadExamples() {
  return JSON.parse(dataOf("halfshade-examples"));
}

/**
 * The configuration of the invented train.
 * @returns {Promise<import("../js/link.js").Configuration>}
 */
export async function loadTrainExample() {
  return JSON.parse(dataOf("halfshade-train"));
}

/**
 * The only address that the page's Trusted Types policy lets through.
 * @param {string} address
 * @returns {string} at run time a TrustedScriptURL, where the browser knows them
 */
function trustedAddress(address) {
  /** @type {{ trustedTypes?: { createPolicy(name: string, rules: object): { createScriptURL(text: string): string } } }} */
  const { trustedTypes } = /** @type {object} */ (globalThis);
  if (!trustedTypes) return address;
  const policy = trustedTypes.createPolicy("halfshade", {
    createScriptURL(/** @type {string} */ text) {
      if (text !== address) throw new TypeError("Only the engine's worker may be started.");
      return text;
    },
  });
  return policy.createScriptURL(address);
}

/** @param {string} id */
function dataOf(id) {
  return document.getElementById(id)?.textContent ?? "";
}
