/** Pastes that land outside a text field, and copies that a spreadsheet can read. */
import { isTextField } from "./dom.js";
import { readNumber } from "./format.js";

/**
 * @typedef {object} PasteActions
 * @property {(text: string) => void} matrix text that is to be read as matrices
 * @property {(fragment: string) => void} link
 * @property {(text: string) => boolean} cell one number for the cell under the keyboard; false when it is in none
 * @property {() => string | null} copyCell text of the cell under the keyboard
 * @property {() => void} leaveEditor a whole matrix was pasted into the editor of a cell
 */

const LINK = /#?(v\d+\.[A-Za-z0-9_%-]+\.[A-Za-z0-9]+)\s*$/;

/**
 * The fragment in a pasted link, if the text is one.
 * @param {string} text
 * @returns {string | null}
 */
export function linkIn(text) {
  const trimmed = text.trim();
  if (/\s/.test(trimmed) && !/#v\d+\./.test(trimmed)) return null;
  return LINK.exec(trimmed)?.[1] ?? null;
}

/**
 * Whether the text holds more than one number can.
 * @param {string} text
 */
export function isMany(text) {
  return /[\s;\[\](){}]/.test(text.trim());
}

/** @param {PasteActions} actions */
export function listen(actions) {
  document.addEventListener("paste", (event) => {
    // Only plain text: the HTML flavour of a spreadsheet holds numbers cut to the column's width.
    const text = event.clipboardData?.getData("text/plain") ?? "";
    if (text.trim() === "") return;
    const active = document.activeElement;
    const inGrid = active?.closest?.("#matrix-grid") ?? null;
    if (isTextField(active) && !(inGrid && isMany(text))) return;
    event.preventDefault();
    const link = linkIn(text);
    if (link) {
      actions.link(link);
    } else if (!isMany(text) && readNumber(text).error === null && actions.cell(text)) {
      // One number went into the cell under the keyboard.
    } else {
      if (inGrid) actions.leaveEditor();
      actions.matrix(text);
    }
  });

  document.addEventListener("copy", (event) => {
    if (!event.clipboardData || isTextField(document.activeElement)) return;
    const selected = String(document.getSelection() ?? "");
    const text = selected === "" ? actions.copyCell() : selected;
    if (text === null || text === "") return;
    // Spreadsheets and programs do not read the typographic minus.
    event.clipboardData.setData("text/plain", text.replace(/\u2212/g, "-"));
    event.preventDefault();
  });
}

/**
 * Write to the clipboard.
 * @param {string} text
 * @returns {Promise<boolean>} whether the browser let us
 */
export async function writeClipboard(text) {
  try {
    await navigator.clipboard.writeText(text);
    return true;
  } catch {
    return false;
  }
}
