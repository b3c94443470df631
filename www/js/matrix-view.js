/** Matrices on the page: as numbers, and as coloured cells. */
import { make } from "./dom.js";
import { matrixText } from "./exports.js";
import { cellText, elementName, fixed, fullText, rows, significant } from "./format.js";
import { writeClipboard } from "./paste.js";

/** The strongest tint, so that text on it stays readable. */
const TINT = 0.42;

/**
 * Sixteen numbers, with a button that copies them in full.
 * @param {string} id
 * @param {string} title
 * @param {number[]} matrix
 * @param {(message: string) => void} tell
 */
export function matrixTable(id, title, matrix, tell) {
  const largest = Math.max(...matrix.map(Math.abs));
  const digits = largest >= 1000 ? 1 : largest >= 10 ? 3 : 5;
  return make(
    "figure",
    { class: "matrix" },
    make("figcaption", null, make("span", null, title), copyButton(`copy-${id}`, title, () => matrixText(title, matrix), tell)),
    make(
      "table",
      { class: "numbers", "aria-label": title },
      make("tbody", null, rows(matrix).map((row) => make("tr", null, row.map((value) => make("td", { title: fullText(value) }, fixed(value, digits)))))),
    ),
  );
}

/**
 * Sixteen numbers in small, to tell two readings apart.
 * @param {string} label
 * @param {number[]} matrix
 * @param {number | null} [decimals] printed resolution
 */
export function tinyMatrix(label, matrix, decimals = null) {
  return make(
    "table",
    { class: "tiny", "aria-label": label },
    make("tbody", null, rows(matrix).map((row) => make("tr", null, row.map((value) => make("td", null, cellText(fullText(value, decimals))))))),
  );
}

/**
 * Sixteen signed numbers on a diverging ground, blue above zero, orange below.
 * @param {string} label
 * @param {number[]} matrix
 * @param {{ full: number, write: (value: number) => string }} scale `full` has the strongest tint
 */
export function colouredCells(label, matrix, { full, write }) {
  return make(
    "table",
    { class: "cells", "aria-label": label },
    make(
      "tbody",
      null,
      rows(matrix).map((row, i) =>
        make(
          "tr",
          null,
          row.map((value, j) => {
            const cell = make("td", { title: `${elementName(i, j)}: ${significant(value, 6)}` }, write(value));
            const share = full > 0 ? Math.min(1, Math.abs(value) / full) : 0;
            cell.style.setProperty("--tint", `${Math.round(100 * TINT * share)}%`);
            if (value > 0) cell.classList.add("above");
            if (value < 0) cell.classList.add("below");
            return cell;
          }),
        ),
      ),
    ),
  );
}

/**
 * @param {string} id
 * @param {string} what
 * @param {() => string} text
 * @param {(message: string) => void} tell
 */
export function copyButton(id, what, text, tell) {
  return make(
    "button",
    {
      type: "button",
      id,
      class: "small",
      "aria-label": `Copy ${what}`,
      onclick: async () => {
        const done = await writeClipboard(text());
        tell(done ? `Copied at full precision: ${what}.` : "The browser did not allow the copy. Select the numbers and press Ctrl+C.");
      },
    },
    "Copy",
  );
}
