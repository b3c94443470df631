/** What was understood of the pasted text, with a control for each guess, and the text itself. */
import { choice, fold, make, repaint } from "./dom.js";
import { elementName, readNumber, withMinus } from "./format.js";
import { tinyMatrix } from "./matrix-view.js";

/**
 * @typedef {import("./types.js").Measurement} Measurement
 * @typedef {import("./types.js").Parsed} Parsed
 * @typedef {import("./types.js").ReadOptions} ReadOptions
 *
 * @typedef {Error & { code?: string, at?: import("./types.js").Place | null }} ReadError
 * @typedef {{ parsed: Parsed, error: null } | { parsed: null, error: ReadError } | { parsed: null, error: null }} ReadOutcome
 *
 * @typedef {object} ReadingActions
 * @property {(text: string) => void} type the text was edited
 * @property {() => void} typed the edit of the text is over
 * @property {(options: ReadOptions) => void} reread
 * @property {(order: "rows" | "columns") => void} order
 * @property {(normalised: boolean) => void} normalised
 * @property {(absolute: boolean) => void} absolute
 * @property {(by: number) => void} divide all elements, and σ
 * @property {() => void} clear
 */

/** Names of delimiters as people call them. */
const DELIMITERS = new Map([
  ["\t", "tabs"],
  ["tab", "tabs"],
  [",", "commas"],
  ["comma", "commas"],
  [";", "semicolons"],
  ["semicolon", "semicolons"],
  [" ", "spaces"],
  ["space", "spaces"],
  ["whitespace", "spaces"],
]);
const DELAY_MS = 150;

export class ReadingPanel {
  /**
   * @param {HTMLElement} root
   * @param {ReadingActions} actions
   */
  constructor(root, actions) {
    this.actions = actions;
    this.open = false;
    this.line = make("div", { id: "reading-line" });
    this.area = make("textarea", {
      id: "raw-text",
      rows: "6",
      wrap: "off",
      spellcheck: "false",
      autocomplete: "off",
      "aria-label": "The matrix as text",
    });
    this.message = make("div", { id: "raw-error", class: "errors" });
    this.box = make(
      "div",
      { id: "raw-box", hidden: true },
      this.area,
      make("p", { class: "fine" }, "A table, a Python or MATLAB matrix, JSON, sixteen numbers in a line: the text is read as you type."),
    );
    root.append(this.line, this.box, this.message);

    /** @type {ReturnType<typeof setTimeout> | undefined} */
    let timer;
    this.area.addEventListener("input", () => {
      clearTimeout(timer);
      timer = setTimeout(() => actions.type(this.area.value), DELAY_MS);
    });
    this.area.addEventListener("blur", () => {
      clearTimeout(timer);
      if (this.area.value !== this.text) actions.type(this.area.value);
      actions.typed();
    });
    this.text = "";
  }

  /**
   * @param {Measurement} measurement
   * @param {ReadOutcome} outcome
   * @param {boolean} filled whether the grid holds anything
   */
  show(measurement, outcome, filled) {
    this.text = measurement.text;
    const error = outcome.error;
    if (this.area !== document.activeElement && this.area.value !== measurement.text) this.area.value = measurement.text;
    if (error) this.open = true;
    this.box.hidden = !this.open;
    repaint(this.line, this.sayWhat(measurement, outcome, filled));
    repaint(this.message, error ? explain(error, measurement.text, (start, end) => this.select(start, end)) : null);
    if (error) {
      this.area.setAttribute("aria-invalid", "true");
      this.area.setAttribute("aria-describedby", "raw-error");
    } else {
      this.area.removeAttribute("aria-invalid");
      this.area.removeAttribute("aria-describedby");
    }
  }

  /**
   * Move the keyboard to a span of the text.
   * @param {number} start
   * @param {number} end
   */
  select(start, end) {
    this.open = true;
    this.box.hidden = false;
    this.area.focus();
    this.area.setSelectionRange(start, end);
  }

  /** Show the text and put the keyboard there. */
  focusText() {
    this.select(0, this.area.value.length);
  }

  /**
   * @param {Measurement} measurement
   * @param {ReadOutcome} outcome
   * @param {boolean} filled
   * @returns {(Node | null)[]}
   */
  sayWhat(measurement, { parsed, error }, filled) {
    const toggle = make(
      "button",
      {
        type: "button",
        id: "as-text",
        class: "inline",
        "aria-expanded": String(this.open),
        "aria-controls": "raw-box",
        onclick: () => {
          this.open = !this.open;
          this.box.hidden = !this.open;
          toggle.textContent = this.open ? "Hide text" : "As text";
          toggle.setAttribute("aria-expanded", String(this.open));
          if (this.open) this.area.focus();
        },
      },
      this.open ? "Hide text" : "As text",
    );
    if (!filled && !error) {
      return [make("p", { class: "said first" }, make("b", null, "Paste a matrix"), " (Ctrl+V anywhere). ", toggle)];
    }
    const clear = make("button", { type: "button", id: "clear", class: "inline", onclick: () => this.actions.clear() }, "Clear");
    if (error) return [make("p", { class: "said" }, toggle, " ", clear)];
    const reading = parsed?.reading;
    const several = (parsed?.matrices.length ?? 0) > 1;
    const delimiter = DELIMITERS.get(reading?.delimiter ?? "");
    const headers = reading?.headerRowCount ?? 0;
    return [
      make(
        "p",
        { class: "said" },
        several ? `Read ${parsed?.matrices.length} matrices, ` : "Read as 4 × 4, ",
        choice({
          id: "order",
          label: "Order of the sixteen numbers",
          value: measurement.convention.order,
          options: [
            ["rows", "row by row"],
            ["columns", "column by column"],
          ],
          change: (value) => this.actions.order(value === "columns" ? "columns" : "rows"),
        }),
        ", ",
        choice({
          id: "decimal",
          label: "Decimal mark of the text",
          value: reading?.decimalChar === "," ? "comma" : "point",
          options: [
            ["point", "decimal point"],
            ["comma", "decimal comma"],
          ],
          change: (value) => this.actions.reread({ decimal: value === "comma" ? "comma" : "point" }),
        }),
        delimiter ? `, between ${delimiter}` : null,
        headers > 0 ? `, ${headers} header line${headers > 1 ? "s" : ""} skipped` : null,
        "; ",
        choice({
          id: "normalised",
          label: `Whether ${elementName(0, 0)} is exact`,
          value: measurement.normalised ? "yes" : "no",
          options: [
            ["no", "not normalised"],
            ["yes", `normalised to ${elementName(0, 0)}`],
          ],
          change: (value) => this.actions.normalised(value === "yes"),
        }),
        ", ",
        choice({
          id: "absolute",
          label: "Unit of the matrix",
          value: measurement.absolute ? "yes" : "no",
          options: [
            ["no", "relative units"],
            ["yes", "absolute transmittance or reflectance"],
          ],
          change: (value) => this.actions.absolute(value === "yes"),
        }),
        ". ",
        toggle,
        " ",
        clear,
      ),
      this.scale(measurement),
      parsed && parsed.alternatives.length > 0 && !measurement.options.decimal ? this.alternatives(parsed) : null,
      parsed && parsed.notes.length > 0 ? notes(parsed) : null,
    ];
  }

  /**
   * What a large first element means.
   * @param {Measurement} measurement
   */
  scale({ cells, absolute }) {
    const first = readNumber(cells[0] ?? "").value ?? 0;
    if (first <= 1.5) return null;
    const name = elementName(0, 0);
    if (!absolute) return make("p", { class: "fine", id: "scale-note" }, `${name} is ${withMinus(cells[0] ?? "")}: per cent, volts or counts are fine. Figures are relative to ${name}, and σ is in the same unit.`);
    return make(
      "p",
      { class: "fine", id: "scale-note" },
      `An absolute ${name} of ${withMinus(cells[0] ?? "")} means gain. If it is in per cent: `,
      make("button", { type: "button", id: "per-cent", class: "inline", onclick: () => this.actions.divide(100) }, "divide by 100"),
    );
  }

  /** @param {Parsed} parsed */
  alternatives(parsed) {
    const readings = [{ reading: parsed.reading, matrices: parsed.matrices }, ...parsed.alternatives];
    return make(
      "div",
      { class: "notice", role: "group", "aria-label": "Two readings" },
      make("p", null, "This text can be read in more than one way. The first is used until you choose."),
      readings.map((each, index) => {
        const decimal = each.reading.decimalChar === "," ? "comma" : "point";
        const first = each.matrices[0];
        /** @type {ReadOptions} */
        const options = each.reading.delimiter ? { decimal, delimiter: each.reading.delimiter } : { decimal };
        return make(
          "div",
          { class: "alternative" },
          first ? tinyMatrix(`Reading ${index + 1}`, first.mueller, first.decimals) : null,
          make("button", { type: "button", id: `use-reading-${index}`, onclick: () => this.actions.reread(options) }, `Use the decimal ${decimal}`),
        );
      }),
    );
  }
}

/** @param {Parsed} parsed */
function notes(parsed) {
  const shown = parsed.notes.slice(0, 20);
  const rest = parsed.notes.length - shown.length;
  const list = make(
    "ul",
    { class: "notes" },
    shown.map((note) =>
      make("li", { class: note.severity }, note.message, note.at && "line" in note.at ? ` (line ${note.at.line}, character ${note.at.character})` : null),
    ),
    rest > 0 ? make("li", null, `and ${rest} more`) : null,
  );
  if (shown.length <= 2) return list;
  return fold("reading-notes", `${parsed.notes.length} notes on the text`, list);
}

/**
 * The reason why a text could not be read, with the line and the bad span marked.
 * @param {ReadError} error
 * @param {string} text
 * @param {(start: number, end: number) => void} select
 */
function explain(error, text, select) {
  const span = spanOf(text, error.at);
  if (!span) return [make("p", null, error.message)];
  const goTo = make(
    "button",
    { type: "button", id: "go-to-error", class: "inline", onclick: () => select(span.start, span.end) },
    `Line ${span.line}, character ${span.character}`,
  );
  return [
    make("p", null, goTo, `: ${error.message}`),
    make(
      "p",
      { class: "bad-line" },
      make("code", null, span.before, make("mark", null, span.bad === "" ? "⌁" : span.bad), span.after),
    ),
  ];
}

/**
 * Where a place (line and character count from 1) is in the text.
 * @param {string} text
 * @param {import("./types.js").Place | null | undefined} at
 */
export function spanOf(text, at) {
  if (!at?.line) return null;
  const lines = text.split(/\r\n|\r|\n/);
  const content = lines[at.line - 1];
  if (content === undefined) return null;
  // Places count characters; a string of JavaScript counts halves of some of them.
  const letters = [...content];
  const first = Math.max(0, (at.character ?? 1) - 1);
  const before = letters.slice(0, first).join("");
  const bad = letters.slice(first, first + Math.max(1, at.length ?? 1)).join("");
  const after = letters.slice(first + Math.max(1, at.length ?? 1)).join("");
  // The field turns every line end into one character.
  const start = lines.slice(0, at.line - 1).reduce((sum, line) => sum + line.length + 1, 0) + before.length;
  return { line: at.line, character: at.character ?? 1, before: clip(before, -40), bad: clip(bad, 60), after: clip(after, 40), start, end: start + bad.length };
}

/**
 * @param {string} text
 * @param {number} size negative: keep the end
 */
function clip(text, size) {
  if (text.length <= Math.abs(size)) return text;
  return size < 0 ? `…${text.slice(size)}` : `${text.slice(0, size)}…`;
}
