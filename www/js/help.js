/** The help: a dialog, so that the keyboard stays in it, Escape closes it, and focus returns. */
import { make } from "./dom.js";
import { SECTIONS } from "./help-text.js";

/** @typedef {import("./help-text.js").Piece} Piece */

/**
 * Let a button open the help. What is pasted, dropped or opened meanwhile goes to the
 * page behind it, which must be seen then.
 * @param {HTMLElement} button
 */
export function listenForHelp(button) {
  /** @type {HTMLDialogElement | null} */
  let dialog = null;
  button.addEventListener("click", () => {
    dialog ??= document.body.appendChild(makeDialog());
    dialog.showModal();
    dialog.scrollTop = 0;
  });
  for (const event of ["paste", "drop", "hashchange"]) addEventListener(event, () => dialog?.close());
}

function makeDialog() {
  const dialog = make(
    "dialog",
    { id: "help", class: "help", "aria-labelledby": "help-heading" },
    make(
      "div",
      { class: "help-head" },
      make("h2", { id: "help-heading", tabindex: "-1", autofocus: true }, "Help"),
      make("button", { type: "button", id: "help-close", onclick: () => dialog.close() }, "Close"),
    ),
    make(
      "ul",
      { class: "help-contents", "aria-label": "Contents" },
      SECTIONS.map(({ id, title }) => make("li", null, make("button", { type: "button", class: "inline", onclick: () => goTo(id) }, title))),
    ),
    SECTIONS.map(({ id, title, pieces }) => [make("h3", { id: `help-${id}`, tabindex: "-1" }, title), pieces.map((piece, k) => pieceNode(piece, `${title}, part ${k + 1}`))]),
  );
  // Undo and redo would act behind the dialog, unseen.
  dialog.addEventListener("keydown", (event) => event.stopPropagation());
  return dialog;
}

/** @param {string} id */
function goTo(id) {
  const heading = document.getElementById(`help-${id}`);
  heading?.scrollIntoView();
  heading?.focus({ preventScroll: true });
}

/**
 * @param {Piece} piece
 * @param {string} name for what can be scrolled sideways
 */
function pieceNode(piece, name) {
  if (typeof piece === "string") return make("p", null, piece);
  if (Array.isArray(piece)) return make("ul", null, piece.map((each) => make("li", null, each)));
  if ("formula" in piece) return make("p", { class: "formula" }, piece.formula);
  if ("program" in piece) return make("pre", { tabindex: "0", role: "region", "aria-label": name }, make("code", null, piece.program));
  return make("dl", null, piece.rows.map(([term, text]) => [make("dt", null, term), make("dd", null, text)]));
}
