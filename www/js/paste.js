/** Pastes that land outside a text field, and copies that a spreadsheet can read. */
import { isTextField } from "./dom.js";
import { readNumber } from "./format.js";

/**
 * @typedef {object} PasteActions
 * @property {(text: string) => void} matrix text that is to be read as matrices
 * @property {(fragment: string) => void} link
 * @property {(block: string[][]) => boolean} block a few numbers for the cells under the keyboard; false when it is in none
 * @property {() => string | null} copySelected text of the selected cells, if the keyboard is in one
 * @property {() => void} cutSelected empty them
 * @property {() => void} leaveEditor a whole matrix was pasted into the editor of a cell
 */

const LINK = /#?(v\d+\.[A-Za-z0-9_%-]+\.[A-Za-z0-9]+)(?![A-Za-z0-9_.%-])/;
/** A link that a mail program has broken into lines, or cut. */
const BROKEN_LINK = /(?:^|#)(v\d+\.[A-Za-z0-9_%-]{8}[\s\S]*)$/;

/**
 * The fragment in a pasted link, if the text is one.
 * @param {string} text
 * @returns {string | null}
 */
export function linkIn(text) {
  const trimmed = text.trim();
  const isOne = /#v\d+\.[A-Za-z0-9_%-]{8}/.test(trimmed) || /^v\d+\.[A-Za-z0-9_%-]{8}/.test(trimmed);
  if (!isOne) return null;
  return LINK.exec(trimmed)?.[1] ?? BROKEN_LINK.exec(trimmed)?.[1]?.split(/\n\s*\n|\nHalfshade:/)[0]?.replace(/[\s>\u200b-\u200f\ufeff]+/g, "") ?? null;
}

/**
 * Whether the text holds more than one number can.
 * @param {string} text
 */
export function isMany(text) {
  return /[\s;\[\](){}]/.test(text.trim());
}

/**
 * Fewer numbers than a matrix has, as rows.
 * @param {string} text
 * @returns {string[][] | null}
 */
export function blockIn(text) {
  const rows = text
    .replace(/\s+$/, "")
    .split(/\r\n|\r|\n/)
    .map((line) => line.trim().split(/\t|;|\s+/).filter((cell) => cell !== ""));
  const cells = rows.flat();
  const few = cells.length > 0 && cells.length < 16 && rows.every((row) => row.length > 0);
  return few && cells.every((cell) => readNumber(cell).error === null) ? rows : null;
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
    const block = inGrid ? blockIn(text) : null;
    if (link) {
      actions.link(link);
    } else if (block) {
      if (isTextField(active)) actions.leaveEditor();
      actions.block(block);
    } else {
      if (inGrid) actions.leaveEditor();
      actions.matrix(text);
    }
  });

  /** @param {ClipboardEvent} event @returns {boolean} whether cells were copied */
  const copy = (event) => {
    if (!event.clipboardData || isTextField(document.activeElement)) return false;
    const selected = String(document.getSelection() ?? "");
    const cells = selected === "" ? actions.copySelected() : null;
    const text = cells ?? selected;
    if (text === "") return false;
    // Spreadsheets and programs do not read the typographic minus.
    event.clipboardData.setData("text/plain", text.replace(/\u2212/g, "-"));
    event.preventDefault();
    return cells !== null;
  };
  document.addEventListener("copy", copy);
  document.addEventListener("cut", (event) => {
    if (copy(event)) actions.cutSelected();
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
