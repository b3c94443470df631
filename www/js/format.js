/** Numbers as text: strict reading of one number, and how cells are written. */

/** The letters that stand for a minus sign in pasted numbers. */
const MINUS = /[\u2212\ufe63\uff0d]/g;
const NUMBER = /^([+-]?)(\d*)(?:[.,](\d*))?(?:[eE]([+-]?\d{1,4}))?$/;

/** More characters than this do not fit in a cell of the grid. */
const CELL_WIDTH = 10;

/**
 * @typedef {{ value: number, plain: string, decimals: number, error: null }
 *   | { value: null, plain: string, decimals: null, error: string }} OneNumber
 */

/**
 * Read one number, with a decimal point or comma. Anything else is an error that
 * says what is wrong: nothing is guessed, and an empty text is not zero.
 * @param {string} text
 * @returns {OneNumber}
 */
export function readNumber(text) {
  const plain = text.replace(MINUS, "-").replace(/[\u00a0\u2007\u2009\u202f]/g, " ").trim();
  /** @param {string} error @returns {OneNumber} */
  const refuse = (error) => ({ value: null, plain, decimals: null, error });
  if (plain === "") return refuse("This cell is empty.");
  const match = NUMBER.exec(plain);
  const [, sign = "", whole = "", fraction = "", exponent = "0"] = match ?? [];
  if (!match || whole + fraction === "") {
    if ((plain.match(/[.,]/g) ?? []).length > 1) return refuse(`“${text.trim()}” has two decimal marks.`);
    return refuse(`“${text.trim()}” is not a number. Write it like 0.1234 or −1.2e-3.`);
  }
  const written = `${sign === "-" ? "-" : ""}${whole || "0"}${fraction ? `.${fraction}` : ""}${exponent === "0" ? "" : `e${exponent}`}`;
  const value = Number(written);
  if (!Number.isFinite(value)) return refuse(`“${text.trim()}” is too large.`);
  return { value, plain: written, decimals: fraction.length - Number(exponent), error: null };
}

/**
 * A number in full, ASCII, so that it reads back to the same bits. Where the printed
 * resolution is known, its trailing zeros are kept.
 * @param {number} value
 * @param {number | null} [decimals]
 * @returns {string}
 */
export function fullText(value, decimals = null) {
  // Many zeros behind a few short numbers help nobody.
  if (decimals !== null && decimals >= 0 && decimals <= 8 && Math.abs(value) < 1e15) {
    const fixed = value.toFixed(decimals);
    if (Number(fixed) === value) return Object.is(value, -0) ? `-${fixed.replace("-", "")}` : fixed;
  }
  return Object.is(value, -0) ? "-0" : String(value);
}

/**
 * The same text with a true minus sign, for reading.
 * @param {string} text
 */
export function withMinus(text) {
  return text.replace(/-/g, "\u2212");
}

/**
 * How a cell shows its text: as written where it fits, else cut with an ellipsis.
 * @param {string} text
 * @returns {string}
 */
export function cellText(text) {
  if (text.length <= CELL_WIDTH) return withMinus(text);
  const read = readNumber(text);
  if (read.error !== null) return text;
  const size = Math.abs(read.value);
  const short = size !== 0 && (size < 1e-4 || size >= 1e5) ? read.value.toExponential(2) : read.value.toFixed(5);
  return `${withMinus(short)}…`;
}

/**
 * A value without uncertainty, to `digits` decimals; tiny ones as a power of ten.
 * @param {number} value
 * @param {number} digits
 * @returns {string}
 */
export function fixed(value, digits) {
  const text = value.toFixed(digits);
  if (Number(text) === 0) {
    return Math.abs(value) > 1e-14 && digits > 2 ? withMinus(value.toExponential(1)) : (0).toFixed(digits);
  }
  return withMinus(text);
}

/**
 * A value to so many significant digits, for running text.
 * @param {number} value
 * @param {number} [digits]
 * @returns {string}
 */
export function significant(value, digits = 2) {
  if (value === 0) return "0";
  const size = Math.abs(value);
  if (size < 1e-4 || size >= 1e6) return withMinus(value.toExponential(digits - 1));
  return withMinus(String(Number(value.toPrecision(digits))));
}

/**
 * Sixteen things as four rows.
 * @template T
 * @param {T[]} matrix
 * @returns {T[][]}
 */
export function rows(matrix) {
  return [0, 1, 2, 3].map((row) => matrix.slice(4 * row, 4 * row + 4));
}

/** What the first row and column are called. A matter of display alone. */
let firstIndex = 0;

/**
 * Count rows and columns from 0, as m00 to m33, or from 1.
 * @param {number} first
 */
export function countFrom(first) {
  firstIndex = first === 1 ? 1 : 0;
}

/**
 * What an element is called.
 * @param {number} row
 * @param {number} column
 */
export function elementName(row, column) {
  return `m${row + firstIndex}${column + firstIndex}`;
}

/**
 * Where the element of this row and column stands in sixteen numbers laid out so.
 * @param {"rows" | "columns"} order
 * @param {number} row
 * @param {number} column
 */
export function place(order, row, column) {
  return order === "columns" ? 4 * column + row : 4 * row + column;
}

/**
 * Numbers as lines of text.
 * @param {number[]} numbers
 * @param {number} width
 */
export function tableOf(numbers, width) {
  const lines = [];
  for (let k = 0; k < numbers.length; k += width) lines.push(numbers.slice(k, k + width).map((value) => fullText(value)).join("\t"));
  return lines.join("\n");
}
