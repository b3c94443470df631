/** The grid of the measured matrix: sixteen cells, walked by arrows, edited by typing. */
import { make } from "./dom.js";
import { cellText, place, readNumber, withMinus } from "./format.js";

/**
 * @typedef {object} GridActions
 * @property {(index: number, text: string, name: string) => void} edit a cell got new text
 * @property {() => void} editing the editor was opened
 */

export class Grid {
  /**
   * @param {HTMLElement} root
   * @param {string} labelledBy id of the heading
   * @param {GridActions} actions
   */
  constructor(root, labelledBy, actions) {
    this.actions = actions;
    this.row = 0;
    this.column = 0;
    /** @type {HTMLInputElement | null} */
    this.editor = null;
    /** @type {string[]} */
    this.cells = Array(16).fill("");
    /** @type {"rows" | "columns"} */
    this.order = "rows";
    /** @type {HTMLTableCellElement[][]} */
    this.boxes = [0, 1, 2, 3].map((row) => [0, 1, 2, 3].map((column) => this.makeCell(row, column)));
    this.hint = make("p", { id: "grid-hint", class: "fine grid-hint" });
    this.errors = make("ul", { id: "grid-errors", class: "errors", hidden: true });
    const table = make(
      "table",
      { role: "grid", id: "matrix-grid", class: "grid", "aria-labelledby": labelledBy, "aria-describedby": "grid-hint" },
      make("tbody", null, this.boxes.map((boxes) => make("tr", null, boxes))),
    );
    root.append(table, this.hint, this.errors);
    this.rove();
  }

  /**
   * Show these cells. An open editor is left alone.
   * @param {string[]} cells laid out as `order` says
   * @param {"rows" | "columns"} order
   */
  show(cells, order) {
    this.cells = cells;
    this.order = order;
    const empty = cells.every((text) => text === "");
    /** @type {HTMLLIElement[]} */
    const complaints = [];
    this.boxes.forEach((boxes, row) => {
      boxes.forEach((box, column) => {
        const name = `m${row}${column}`;
        const text = cells[place(order, row, column)] ?? "";
        const { error } = readNumber(text);
        const wrong = error !== null && text !== "";
        if (!(this.editor && box.contains(this.editor))) {
          box.textContent = text === "" ? "" : cellText(text);
          box.setAttribute("aria-label", `${name}, ${text === "" ? "empty" : withMinus(text)}`);
        }
        box.title = text === "" ? name : `${name} = ${withMinus(text)}`;
        box.dataset.name = name;
        box.classList.toggle("long", cellText(text).length > 8);
        box.classList.toggle("empty", text === "");
        if (wrong) {
          box.setAttribute("aria-invalid", "true");
          box.setAttribute("aria-errormessage", `error-${name}`);
          complaints.push(make("li", { id: `error-${name}` }, `${name}: ${error}`));
        } else {
          box.removeAttribute("aria-invalid");
          box.removeAttribute("aria-errormessage");
        }
      });
    });
    this.errors.replaceChildren(...complaints);
    this.errors.hidden = complaints.length === 0;
    if (!this.editor) this.hint.textContent = empty ? "Type into the cells, or paste a whole matrix." : "";
  }

  /** Whether the keyboard is in the grid, outside an editor. */
  get walking() {
    return !this.editor && this.boxes.flat().some((box) => box === document.activeElement);
  }

  /** The text of the cell that the keyboard is in. */
  get current() {
    return this.cells[place(this.order, this.row, this.column)] ?? "";
  }

  /**
   * Put text into the cell that the keyboard is in.
   * @param {string} text
   */
  fill(text) {
    this.commit(this.row, this.column, text);
  }

  /** Close the editor without taking its text. */
  cancel() {
    const box = this.box();
    this.editor = null;
    box.replaceChildren();
    this.show(this.cells, this.order);
  }

  /**
   * @param {number} row
   * @param {number} column
   */
  makeCell(row, column) {
    const box = make("td", { tabindex: "-1" });
    box.addEventListener("focus", () => {
      this.row = row;
      this.column = column;
      this.rove();
    });
    box.addEventListener("keydown", (event) => this.key(event));
    box.addEventListener("dblclick", () => this.open(this.current));
    box.addEventListener("click", (event) => {
      // A phone has no F2 and no double click worth the name: one tap opens.
      if (!this.editor && event instanceof PointerEvent && event.pointerType === "touch") this.open(this.current);
    });
    return box;
  }

  box() {
    return /** @type {HTMLTableCellElement} */ (this.boxes[this.row]?.[this.column]);
  }

  rove() {
    for (const box of this.boxes.flat()) box.tabIndex = -1;
    this.box().tabIndex = 0;
  }

  /**
   * @param {number} row
   * @param {number} column
   */
  go(row, column) {
    this.row = Math.min(3, Math.max(0, row));
    this.column = Math.min(3, Math.max(0, column));
    this.rove();
    this.box().focus();
  }

  /** @param {KeyboardEvent} event */
  key(event) {
    if (this.editor) return;
    const { row, column } = this;
    const command = event.ctrlKey || event.metaKey;
    /** @type {{ [key: string]: [number, number] }} */
    const moves = {
      ArrowUp: [row - 1, column],
      ArrowDown: [row + 1, column],
      ArrowLeft: [row, column - 1],
      ArrowRight: [row, column + 1],
      Home: [command ? 0 : row, 0],
      End: [command ? 3 : row, 3],
    };
    const move = moves[event.key];
    if (move && !event.altKey) {
      event.preventDefault();
      this.go(...move);
    } else if (event.key === "Enter" || event.key === "F2") {
      event.preventDefault();
      this.open(this.current);
    } else if (event.key === "Delete" || event.key === "Backspace") {
      event.preventDefault();
      this.fill("");
    } else if (event.key.length === 1 && event.key !== " " && !command && !event.altKey) {
      event.preventDefault();
      this.open(event.key);
    }
  }

  /**
   * Open the editor in the present cell.
   * @param {string} text what it starts with
   */
  open(text) {
    if (this.editor) return;
    const { row, column } = this;
    const name = `m${row}${column}`;
    const editor = make("input", {
      type: "text",
      inputmode: "decimal",
      autocomplete: "off",
      spellcheck: "false",
      "aria-label": `${name}, editing`,
      "aria-describedby": "grid-hint",
    });
    editor.value = text;
    const box = this.box();
    this.editor = editor;
    box.replaceChildren(editor);
    box.removeAttribute("aria-label");
    editor.focus();
    editor.setSelectionRange(text.length, text.length);
    this.tell(name, text);
    this.actions.editing();
    editor.addEventListener("input", () => this.tell(name, editor.value));
    editor.addEventListener("blur", () => {
      if (this.editor === editor) this.close(row, column, editor.value);
    });
    editor.addEventListener("keydown", (event) => {
      if (event.isComposing) return;
      if (event.key === "Enter" || event.key === "F2") {
        event.preventDefault();
        event.stopPropagation();
        this.close(row, column, editor.value);
        this.go(event.key === "Enter" ? row + 1 : row, column);
      } else if (event.key === "Escape") {
        event.preventDefault();
        this.cancel();
        this.go(row, column);
      } else if (event.key === "Tab") {
        const next = 4 * row + column + (event.shiftKey ? -1 : 1);
        this.close(row, column, editor.value);
        if (next < 0 || next > 15) {
          // At the end of the grid Tab goes on to what follows it.
          this.box().focus();
          return;
        }
        event.preventDefault();
        this.go(Math.floor(next / 4), next % 4);
      }
    });
  }

  /**
   * Say what the typed text means, where that is not plain from it.
   * @param {string} name
   * @param {string} text
   */
  tell(name, text) {
    const read = readNumber(text);
    this.hint.textContent = read.error === null ? `${name} = ${withMinus(read.plain)}` : "";
  }

  /**
   * @param {number} row
   * @param {number} column
   * @param {string} text
   */
  close(row, column, text) {
    const box = this.boxes[row]?.[column];
    this.editor = null;
    box?.replaceChildren();
    this.commit(row, column, text);
  }

  /**
   * @param {number} row
   * @param {number} column
   * @param {string} text
   */
  commit(row, column, text) {
    const read = readNumber(text);
    const index = place(this.order, row, column);
    const kept = read.error === null ? read.plain : text.trim();
    if (kept === this.cells[index]) this.show(this.cells, this.order);
    else this.actions.edit(index, kept, `m${row}${column}`);
  }
}
