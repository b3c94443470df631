/** The Realizability task: can the matrix be physical, how sure is that, what is nearest. */
import { METHODS } from "../definitions.js";
import { fold, make, repaint, sentence } from "../dom.js";
import { eigenvaluesTable, exported } from "../exports.js";
import { elementName, fixed, significant } from "../format.js";
import { colouredCells, matrixTable } from "../matrix-view.js";
import { DRAWINGS, Plot } from "../plots.js";
import { BLIND, GLOSS, changeInWords, checksOf, eigenvalueText, verdictOf } from "../words.js";
import { CausesPanel } from "./causes.js";
import { definitionNodes } from "./definition.js";

/**
 * @typedef {import("../types.js").Shown} Shown
 * @typedef {import("../types.js").Examination} Examination
 * @typedef {import("../types.js").Request} Request
 *
 * @typedef {object} PanelActions
 * @property {() => void} useNearest
 * @property {(mueller: number[], name: string) => void} use
 * @property {(message: string) => void} tell
 * @property {(error: unknown) => void} failed
 * @property {import("../types.js").FormatValue} format
 */

export class RealizabilityPanel {
  /**
   * @param {HTMLElement} root
   * @param {PanelActions} actions
   */
  constructor(root, actions) {
    this.actions = actions;
    this.plot = new Plot({
      name: "eigenvalues",
      drawing: /** @type {import("../plots.js").Drawing} */ (DRAWINGS["eigenvalues"]),
      maxWidth: 820,
      title: "Coherency eigenvalues",
      failed: actions.failed,
      tell: actions.tell,
    });
    this.head = make("div", { class: "verdict" });
    this.below = make("div", null);
    this.causes = new CausesPanel(actions);
    root.append(this.head, this.causes.element, this.plot.element, this.below);
  }

  clear() {
    this.plot.show(null);
    repaint(this.head);
    repaint(this.below);
    this.causes.element.hidden = true;
  }

  /** @param {Shown} shown */
  show({ result, request, pending, work }) {
    if (!result || !request) {
      this.clear();
      return;
    }
    const { format, useNearest } = this.actions;
    const { realizability, nearest } = result;
    const verdict = verdictOf(result, request, pending, format);
    const changes = realizability.verdict !== "realizable" && nearest.mueller !== null;
    repaint(
      this.head,
      make("p", { class: "kicker" }, "Can it be physical?"),
      make("h1", { id: "task-heading", class: `tone-${verdict.tone}`, tabindex: "-1" }, verdict.title),
      make("p", { id: "verdict-reason" }, sentence(verdict.reason)),
      verdict.next.length > 0 ? make("p", { class: "next" }, sentence(verdict.next)) : null,
      make("p", { class: "fine" }, GLOSS),
      changes
        ? make("p", { class: "row" }, make("button", { type: "button", id: "use-nearest", class: "primary", onclick: useNearest }, "Use the nearest realizable matrix"))
        : null,
    );
    this.causes.show(request, realizability.verdict === "beyondNoise" && !pending);
    const values = realizability.eigenvalues;
    if (values) {
      this.plot.show({ eigenvalues: values, eigenvalueSe: realizability.eigenvalueSe }, eigenvalueTable(values, realizability.eigenvalueSe, format), () => exported({ tables: [eigenvaluesTable(result)] }));
    } else {
      this.plot.show(null);
    }
    repaint(
      this.below,
      make(
        "div",
        { class: "columns" },
        this.nearest(result, changes),
        make(
          "div",
          null,
          make("h2", null, "Checks"),
          make(
            "table",
            { class: "checks" },
            make("tbody", null, checksOf(result, request, pending, format).map((check) =>
              make(
                "tr",
                null,
                make("th", { scope: "row" }, check.name, make("span", { class: "note" }, check.note)),
                make("td", null, check.answer),
                make("td", { class: "number" }, check.value),
              ),
            )),
          ),
          make("h2", null, "What no such check can see"),
          make("ul", { class: "plain" }, BLIND.map((each) => make("li", null, each))),
          make("p", { class: "fine" }, "A realizable matrix stays realizable under each of these. Air, and then a sample that is known, shows them."),
        ),
      ),
      make(
        "div",
        { class: "folds" },
        fold("about-coherency", "What the eigenvalues are", definitionNodes("coherency", METHODS)),
        fold("about-test", "How it is tested against the noise", definitionNodes("significance", METHODS), testNumbers(result, request, work.examine)),
        fold("about-nearest", "What the nearest realizable matrix is", definitionNodes("nearest", METHODS)),
        fold("about-stokes", "What the Stokes condition is", definitionNodes("stokes", METHODS)),
      ),
    );
  }

  /**
   * @param {Examination} result
   * @param {boolean} changes
   */
  nearest({ nearest }, changes) {
    const { mueller, change, changeInSigma, reason } = nearest;
    if (!mueller || !change) {
      return make("div", null, make("h2", null, "Nearest realizable matrix"), make("p", { class: "mute" }, reason ?? "There is none to give."));
    }
    if (!changes) {
      return make("div", null, make("h2", null, "Nearest realizable matrix"), make("p", null, "The matrix itself."), matrixTable("nearest", "The matrix, row by row", mueller, this.actions.tell));
    }
    const values = changeInSigma ?? change;
    const largest = Math.max(...values.map(Math.abs));
    const scale = changeInSigma
      ? { full: Math.max(3, largest), write: (/** @type {number} */ value) => fixed(value, 1) }
      : { full: largest, write: (/** @type {number} */ value) => scaled(value, largest) };
    return make(
      "div",
      null,
      make("h2", null, "Change to the nearest realizable matrix ", make("span", { class: "unit" }, changeInSigma ? "in σ" : unitOf(largest))),
      colouredCells("Change to the nearest realizable matrix", values, scale),
      make("p", { class: "said" }, changeInWords(nearest), " ", make("span", { class: "mute" }, "Blue: larger than measured; orange: smaller.")),
      fold("nearest-matrix", "The nearest realizable matrix itself", matrixTable("nearest", "Nearest realizable matrix", mueller, this.actions.tell)),
    );
  }
}

/** @param {number} largest */
function exponentOf(largest) {
  return largest > 0 ? Math.floor(Math.log10(largest)) : 0;
}

/** @param {number} largest */
function unitOf(largest) {
  const exponent = exponentOf(largest);
  if (exponent >= 0 && exponent <= 3) return "in the unit of the matrix";
  return `in 10${superscript(exponent)} of the unit of the matrix`;
}

/**
 * A change in the power of ten that `unitOf` names.
 * @param {number} value
 * @param {number} largest
 */
function scaled(value, largest) {
  const exponent = exponentOf(largest);
  const shown = exponent >= 0 && exponent <= 3 ? value : value / 10 ** exponent;
  return fixed(shown, 2).includes("e") ? "0.00" : fixed(shown, 2);
}

/** @param {number} exponent */
function superscript(exponent) {
  return [...String(exponent)].map((sign) => (sign === "-" ? "⁻" : "⁰¹²³⁴⁵⁶⁷⁸⁹".charAt(Number(sign)))).join("");
}

/**
 * @param {number[]} values
 * @param {number[] | null} errors
 * @param {import("../types.js").FormatValue} format
 */
function eigenvalueTable(values, errors, format) {
  return make(
    "table",
    { class: "data" },
    make("thead", null, make("tr", null, make("th", { scope: "col" }, `eigenvalue of H / ${elementName(0, 0)}`), make("th", { scope: "col" }, "value"), make("th", { scope: "col" }, "standard error"))),
    make("tbody", null, values.map((value, index) =>
      make(
        "tr",
        null,
        make("th", { scope: "row" }, "λ", make("sub", null, String(index + 1))),
        make("td", { class: "number" }, eigenvalueText(value, errors?.[index] ?? null, format)),
        make("td", { class: "number" }, errors ? significant(errors[index] ?? 0) : "no noise stated"),
      ),
    )),
  );
}

/**
 * @param {Examination} result
 * @param {Request} request
 * @param {{ draws: number, seed: number }} examine
 */
function testNumbers({ realizability }, request, examine) {
  if (realizability.pValue === null) return make("p", { class: "fine" }, request.noise.kind === "none" ? "No noise is stated, so nothing is tested." : "No test was needed or run.");
  return make(
    "p",
    { class: "fine" },
    `Here T = ${significant(realizability.statistic ?? 0, 4)}, p = ${significant(realizability.pValue, 3)} from ${realizability.simulations} simulations, seed ${examine.seed}. The tolerance for a zero eigenvalue is 10⁻¹² of ${elementName(0, 0)}, the accuracy of the arithmetic.`,
  );
}
