/** The grid of the measured matrix: sixteen cells, walked by arrows, edited by typing. */
import { make } from "./dom.js";
import { cellText, elementName, place, readNumber, withMinus } from "./format.js";

/**
 * @typedef {{ index: number, text: string }} Change new text for the cell with this place in the sixteen
 * @typedef {object} GridActions
 * @property {(changes: Change[], name: string) => void} edit cells got new text, in one action
 * @property {() => void} editing the editor was opened
 * @property {(message: string) => void} tell
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
    /** The other corner of the selection. */
    this.anchor = { row: 0, column: 0 };
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
      { role: "grid", id: "matrix-grid", class: "grid", "aria-labelledby": labelledBy, "aria-describedby": "grid-hint", "aria-multiselectable": "true" },
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
        const name = elementName(row, column);
        const text = this.textAt(row, column);
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

  /**
   * @param {number} row
   * @param {number} column
   */
  textAt(row, column) {
    return this.cells[place(this.order, row, column)] ?? "";
  }

  /** The rows and columns of the selection, first and last. */
  get span() {
    const { row, column, anchor } = this;
    return {
      top: Math.min(row, anchor.row),
      bottom: Math.max(row, anchor.row),
      left: Math.min(column, anchor.column),
      right: Math.max(column, anchor.column),
    };
  }

  /** Rows of places that are selected. @returns {[number, number][][]} */
  get selected() {
    const { top, bottom, left, right } = this.span;
    return range(top, bottom).map((row) => range(left, right).map((column) => [row, column]));
  }

  /** The selected cells as a spreadsheet reads them. */
  get selectedText() {
    return this.selected.map((places) => places.map(([row, column]) => this.textAt(row, column)).join("\t")).join("\n");
  }

  /** Empty the selected cells, as one step. @param {string} verb what it is called */
  clearSelected(verb) {
    const places = this.selected.flat();
    this.change(places.map(([row, column]) => ({ row, column, text: "" })), `${verb} ${this.nameOf(places)}`);
  }

  /**
   * Put numbers into the cells from the corner of the selection on, as one step.
   * @param {string[][]} block
   * @returns {boolean} whether it fits
   */
  fill(block) {
    const { top, left } = this.span;
    const width = Math.max(...block.map((row) => row.length));
    if (top + block.length > 4 || left + width > 4) {
      this.actions.tell(`${block.length} × ${width} numbers do not fit from ${elementName(top, left)} on. Nothing was changed.`);
      return false;
    }
    const changes = block.flatMap((texts, i) => texts.map((text, j) => ({ row: top + i, column: left + j, text })));
    const places = changes.map(({ row, column }) => /** @type {[number, number]} */ ([row, column]));
    this.anchor = { row: top, column: left };
    this.row = top + block.length - 1;
    this.column = left + width - 1;
    this.rove();
    this.box().focus();
    this.change(changes, `the paste into ${this.nameOf(places)}`);
    return true;
  }

  /** @param {[number, number][]} places */
  nameOf(places) {
    const [fromRow, fromColumn] = places[0] ?? [0, 0];
    const [toRow, toColumn] = places.at(-1) ?? [0, 0];
    const name = elementName(fromRow, fromColumn);
    return places.length === 1 ? name : `${name} to ${elementName(toRow, toColumn)}`;
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
      if (this.row === row && this.column === column) return;
      this.select(row, column, false);
    });
    box.addEventListener("keydown", (event) => this.key(event));
    box.addEventListener("dblclick", () => this.open(this.current));
    box.addEventListener("pointerdown", (event) => {
      if (this.editor || event.button !== 0 || event.pointerType === "touch") return;
      event.preventDefault();
      this.select(row, column, event.shiftKey);
      box.focus();
    });
    box.addEventListener("pointerenter", (event) => {
      if (this.editor || event.pointerType === "touch" || event.buttons !== 1 || !this.walking) return;
      this.select(row, column, true);
      box.focus();
    });
    box.addEventListener("click", (event) => {
      // A phone has no F2 and no double click worth the name: one tap opens.
      if (this.editor || !(event instanceof PointerEvent) || event.pointerType !== "touch") return;
      this.select(row, column, false);
      this.open(this.current);
    });
    return box;
  }

  /** The text of the cell that the keyboard is in. */
  get current() {
    return this.textAt(this.row, this.column);
  }

  box() {
    return /** @type {HTMLTableCellElement} */ (this.boxes[this.row]?.[this.column]);
  }

  /** One cell takes the keyboard; those between it and the anchor are selected. */
  rove() {
    const { top, bottom, left, right } = this.span;
    const several = top !== bottom || left !== right;
    this.boxes.forEach((boxes, row) => {
      boxes.forEach((box, column) => {
        box.tabIndex = row === this.row && column === this.column ? 0 : -1;
        const selected = several && row >= top && row <= bottom && column >= left && column <= right;
        if (selected) box.setAttribute("aria-selected", "true");
        else box.removeAttribute("aria-selected");
      });
    });
  }

  /**
   * @param {number} row
   * @param {number} column
   * @param {boolean} extends_ whether the selection grows to there
   */
  select(row, column, extends_) {
    this.row = Math.min(3, Math.max(0, row));
    this.column = Math.min(3, Math.max(0, column));
    if (!extends_) this.anchor = { row: this.row, column: this.column };
    this.rove();
  }

  /**
   * @param {number} row
   * @param {number} column
   * @param {boolean} [extends_]
   */
  go(row, column, extends_ = false) {
    this.select(row, column, extends_);
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
      this.go(...move, event.shiftKey);
    } else if (event.key === "Enter" || event.key === "F2") {
      event.preventDefault();
      this.open(this.current);
    } else if (event.key === "Delete" || event.key === "Backspace") {
      event.preventDefault();
      this.clearSelected("the clearing of");
    } else if (event.key === "Escape") {
      this.select(row, column, false);
    } else if (command && !event.altKey && event.key.toLowerCase() === "a") {
      event.preventDefault();
      this.anchor = { row: 0, column: 0 };
      this.go(3, 3, true);
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
    this.select(row, column, false);
    const name = elementName(row, column);
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
    this.change([{ row, column, text }], `the edit of ${elementName(row, column)}`);
  }

  /**
   * @param {{ row: number, column: number, text: string }[]} cells
   * @param {string} name of the step
   */
  change(cells, name) {
    const changes = cells
      .map(({ row, column, text }) => {
        const read = readNumber(text);
        return { index: place(this.order, row, column), text: read.error === null ? read.plain : text.trim() };
      })
      .filter(({ index, text }) => text !== this.cells[index]);
    if (changes.length === 0) this.show(this.cells, this.order);
    else this.actions.edit(changes, name);
  }
}

/**
 * Whole numbers from the first to the last.
 * @param {number} first
 * @param {number} last
 */
function range(first, last) {
  return Array.from({ length: last - first + 1 }, (_, k) => first + k);
}
