/** Several matrices at once: what they are to each other, and the one that is shown. */
import { choice, fold, make, repaint } from "./dom.js";
import { DEFINITIONS } from "./definitions.js";
import { quick } from "./engine.js";
import { fixed, fullText, significant } from "./format.js";
import { colouredCells } from "./matrix-view.js";
import { figureText } from "./words.js";

/**
 * @typedef {import("./types.js").Many} Many
 * @typedef {import("./types.js").Use} Use
 * @typedef {import("./types.js").Parsed} Parsed
 *
 * @typedef {object} ManyActions
 * @property {(use: Use) => void} use
 * @property {(index: number) => void} pick
 * @property {import("./types.js").FormatValue} format
 */

/** More choices than this do not help in a list. */
const LONGEST_LIST = 200;

/**
 * The matrices of a text or a file, where they are several.
 * @param {Parsed | null} parsed
 * @param {Use} use
 * @param {{ name: string, sha256: string }} [file] none: they are in the text
 * @returns {Many | null}
 */
export function manyOf(parsed, use, file = { name: "", sha256: "" }) {
  if (!parsed || parsed.matrices.length < 2) return null;
  return {
    use,
    matrices: parsed.matrices.map((matrix) => matrix.mueller),
    labels: parsed.matrices.map((matrix) => matrix.label),
    coordinates: parsed.matrices.map((matrix) => matrix.coordinate),
    source: file.name,
    sha256: file.sha256,
  };
}

/**
 * What a matrix is called in a list.
 * @param {Many} many
 * @param {number} index
 */
export function nameOf({ labels, coordinates }, index) {
  const label = labels[index];
  const coordinate = coordinates[index];
  const more = label ?? (coordinate !== null && coordinate !== undefined ? fullText(coordinate) : "");
  return `${index + 1}${more ? `: ${more}` : ""}`;
}

export class ManyPanel {
  /**
   * @param {HTMLElement} root
   * @param {ManyActions} actions
   */
  constructor(root, actions) {
    this.root = root;
    this.actions = actions;
  }

  /**
   * @param {Many | null} many
   * @param {number} pick
   * @param {import("./types.js").Request | null} request what is known of the one that is shown
   */
  show(many, pick, request) {
    this.root.hidden = !many;
    if (!many) {
      repaint(this.root);
      return;
    }
    const count = many.matrices.length;
    const use = choice({
      id: "many-use",
      label: "What these matrices are",
      value: many.use,
      options: [
        ...(many.use === "ask" ? /** @type {[string, string][]} */ ([["ask", "… choose what they are"]]) : []),
        ["pick", "to pick one from"],
        ["repeats", "repeats of one measurement"],
        ["series", "a series"],
        ...(count === 2 ? /** @type {[string, string][]} */ ([["pair", "a pair to compare"]]) : []),
      ],
      change: (value) => this.actions.use(/** @type {Use} */ (value)),
    });
    repaint(
      this.root,
      make("p", { class: many.use === "ask" ? "said notice-line" : "said" }, `${count.toLocaleString("en").replace(/,/g, "\u202f")} matrices${many.source ? ` from ${many.source}` : ""}: `, use, "."),
      many.use === "repeats" ? make("p", { class: "fine" }, "Shown is their mean.") : this.stepper(many, pick),
      many.use === "pair" && request ? difference(many, pick, request, this.actions.format) : null,
    );
  }

  /**
   * @param {Many} many
   * @param {number} pick
   */
  stepper(many, pick) {
    const count = many.matrices.length;
    /** @param {string} id @param {string} label @param {string} sign @param {number} to */
    const step = (id, label, sign, to) => {
      const button = make("button", { type: "button", id, class: "small", "aria-label": label, onclick: () => this.actions.pick(to) }, sign);
      button.disabled = to < 0 || to >= count;
      return button;
    };
    /** @type {HTMLElement} */
    let list;
    if (count <= LONGEST_LIST) {
      list = choice({
        id: "pick",
        label: "Which matrix is shown",
        value: String(pick),
        options: many.matrices.map((_, index) => [String(index), nameOf(many, index)]),
        change: (value) => this.actions.pick(Number(value)),
      });
    } else {
      const field = make("input", { type: "text", inputmode: "numeric", id: "pick", class: "sigma", "aria-label": `Which matrix is shown, 1 to ${count}`, autocomplete: "off" });
      field.value = String(pick + 1);
      field.addEventListener("change", () => {
        const index = Number(field.value) - 1;
        if (Number.isInteger(index) && index >= 0 && index < count) this.actions.pick(index);
        else field.value = String(pick + 1);
      });
      list = field;
    }
    return make("p", { class: "said stepper" }, "Shown: ", step("pick-previous", "Previous matrix", "‹", pick - 1), list, step("pick-next", "Next matrix", "›", pick + 1));
  }
}

/**
 * The other one of a pair minus the one that is shown, under the same noise.
 * @param {Many} many
 * @param {number} pick
 * @param {import("./types.js").Request} request
 * @param {import("./types.js").FormatValue} format
 */
function difference(many, pick, { normalised, absolute, convention, noise, mueller }, format) {
  const other = many.matrices[1 - pick];
  if (!other) return null;
  const stated = { normalised, absolute, convention, noise };
  /** @type {import("./types.js").Comparison} */
  let found;
  try {
    found = quick.compare({ first: { ...stated, mueller }, second: { ...stated, mueller: other } });
  } catch (error) {
    return make("p", { class: "wrong" }, error instanceof Error ? error.message : String(error));
  }
  const values = found.differenceInSigma ?? found.difference;
  const largest = Math.max(...values.map(Math.abs));
  const full = found.differenceInSigma ? Math.max(3, largest) : largest;
  const same = found.pValue === null ? "" : found.pValue >= 0.05 ? "no difference beyond noise" : "they differ beyond noise";
  return fold(
    "pair-difference",
    `Matrix ${2 - pick} minus matrix ${pick + 1}: ${same || `at most ${significant(largest)}`}`,
    colouredCells(`Difference of the pair${found.differenceInSigma ? " in σ" : ""}`, values, { full, write: (value) => (found.differenceInSigma ? fixed(value, 1) : significant(value, 3)) }),
    found.chiSquare !== null && found.pValue !== null
      ? make("p", { class: "fine" }, `In σ of the difference. χ² = ${significant(found.chiSquare, 3)} for ${found.degreesOfFreedom} degrees of freedom, p = ${significant(found.pValue)}, with the same noise in both.`)
      : make("p", { class: "fine" }, "State the noise to have the difference tested."),
    make(
      "table",
      { class: "data" },
      make("thead", null, make("tr", null, make("th", { scope: "col" }, "figure"), make("th", { scope: "col" }, "difference"))),
      make(
        "tbody",
        null,
        found.figures
          .filter(({ value }) => value !== null)
          .map(({ name, value, se, unit }) => make("tr", null, make("th", { scope: "row" }, DEFINITIONS[name]?.title ?? name), make("td", { class: "number" }, figureText({ value, se, low: null, high: null, method: null, bias: null, debiased: null, unit, reason: null }, format) ?? "", unit === "deg" ? "°" : ""))),
      ),
    ),
  );
}
