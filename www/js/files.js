/** Files in, by button and by drop, and out. */
import { quick } from "./engine.js";

/**
 * @typedef {import("./types.js").Parsed} Parsed
 * @typedef {import("./types.js").ReadOptions} ReadOptions
 * @typedef {{ name: string, bytes: Uint8Array<ArrayBuffer>, sha256: string }} OpenedFile
 */

/** What fits in the memory of a page with ease. */
const LARGEST = 64 << 20;

/**
 * Let files be chosen by a button and dropped anywhere.
 * @param {HTMLElement} button
 * @param {{ open: (file: OpenedFile) => void, text: (text: string) => void, failed: (error: unknown) => void }} actions
 */
export function listenForFiles(button, { open, text, failed }) {
  const picker = document.createElement("input");
  picker.type = "file";
  picker.id = "file";
  picker.accept = ".txt,.csv,.tsv,.dat,.npy,.json,.py,.m,.tex,text/*";
  picker.hidden = true;
  button.after(picker);
  /** @param {File | undefined} file */
  const take = (file) => {
    if (file) read(file).then(open, failed);
  };
  button.addEventListener("click", () => picker.click());
  picker.addEventListener("change", () => {
    take(picker.files?.[0]);
    picker.value = "";
  });
  addEventListener("dragover", (event) => {
    if (!event.dataTransfer) return;
    event.preventDefault();
    event.dataTransfer.dropEffect = "copy";
    document.documentElement.classList.add("dropping");
  });
  const over = () => document.documentElement.classList.remove("dropping");
  addEventListener("dragleave", (event) => {
    if (!event.relatedTarget) over();
  });
  addEventListener("drop", (event) => {
    over();
    const data = event.dataTransfer;
    if (!data) return;
    event.preventDefault();
    const dropped = data.getData("text/plain");
    if (data.files.length > 0) take(data.files[0]);
    else if (dropped.trim() !== "") text(dropped);
  });
}

/**
 * @param {File} file
 * @returns {Promise<OpenedFile>}
 */
async function read(file) {
  if (file.size > LARGEST) throw new Error(`${file.name} is larger than 64 MiB, which is more than is read at once.`);
  const buffer = await file.arrayBuffer();
  const digest = new Uint8Array(await crypto.subtle.digest("SHA-256", buffer));
  const sha256 = [...digest].map((byte) => byte.toString(16).padStart(2, "0")).join("");
  return { name: file.name.slice(0, 80), bytes: new Uint8Array(buffer), sha256 };
}

/**
 * The text of a small text file; of anything else null.
 * @param {Uint8Array<ArrayBuffer>} bytes
 * @param {number} largest
 */
export function textIn(bytes, largest) {
  if (bytes.length > largest || bytes[0] === 0x93) return null;
  try {
    return quick.fileText(bytes);
  } catch {
    return null;
  }
}

/**
 * Whether a text is a saved configuration and not data.
 * @param {string} text
 */
export function isConfiguration(text) {
  return /^\uFEFF?\s*\{/.test(text) && /"v"\s*:\s*\d/.test(text) && /"(measurement|app)"\s*:/.test(text);
}

/**
 * Hand a text or a picture over as a file.
 * @param {string} name
 * @param {Blob} content
 */
export function saveFile(name, content) {
  const address = URL.createObjectURL(content);
  const link = document.createElement("a");
  link.href = address;
  link.download = name;
  link.click();
  setTimeout(() => URL.revokeObjectURL(address), 10000);
}

/**
 * A label as a part of a file's name.
 * @param {string} label
 */
export function fileStem(label) {
  const plain = label.normalize("NFKD").replace(/[^A-Za-z0-9]+/g, "-").replace(/^-+|-+$/g, "").slice(0, 40).toLowerCase();
  return plain ? `halfshade-${plain}` : "halfshade";
}
