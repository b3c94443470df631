// The one module that knows where the engine, the worker and the examples come from.
// In the single file, build/where-single.js stands in its place.

/** @typedef {import("./types.js").Example} Example */

const EXAMPLES = new URL("../demo-data/", import.meta.url);

/** Whether the page is the single file. */
export const isSingleFile = false;

/** Where a colleague finds the page: this one is there already. */
export function publicAddress() {
  return "";
}

/**
 * A public address is asked for in the single file alone.
 * @param {string} _address
 */
export function setPublicAddress(_address) {}

/**
 * Compiles the engine.
 * @returns {Promise<WebAssembly.Module>}
 */
export async function loadModule() {
  const response = await get(new URL("../halfshade_bg.wasm", import.meta.url));
  // Some servers send a type that the streaming compiler refuses.
  if (response.headers.get("Content-Type") !== "application/wasm") {
    return WebAssembly.compile(await response.arrayBuffer());
  }
  return WebAssembly.compileStreaming(response);
}

/**
 * Loads the worker's script. It is kept, so that a restart asks the server for nothing.
 * @returns {Promise<() => Worker>} starts a worker, as often as wanted
 */
export async function loadWorker() {
  const response = await get(new URL("worker.js", import.meta.url));
  const script = new Blob([await response.text()], { type: "text/javascript" });
  const address = URL.createObjectURL(script);
  return () => new Worker(address);
}

/**
 * Loads the examples with their texts.
 * @returns {Promise<Example[]>}
 */
export async function loadExamples() {
  /** @type {Omit<Example, "text">[]} */
  const index = await (await get(new URL("index.json", EXAMPLES))).json();
  const read = async (/** @type {Omit<Example, "text">} */ entry) => {
    const response = await get(new URL(entry.file, EXAMPLES));
    return { ...entry, text: await response.text() };
  };
  return Promise.all(index.map(read));
}

/**
 * Loads the configuration of the invented train.
 * @returns {Promise<import("./link.js").Configuration>}
 */
export async function loadTrainExample() {
  return (await get(new URL("train/kelp-film-behind-a-window.json", EXAMPLES))).json();
}

/** @param {URL} address */
async function get(address) {
  const response = await fetch(address);
  if (!response.ok) throw new Error(`${address.pathname} could not be loaded (HTTP ${response.status}).`);
  return response;
}
