/** Uncertainties of the instrument, which no repeat averages out: the systematic part beside the noise. */
import { make, repaint } from "./dom.js";
import { fullText, readNumber } from "./format.js";

/**
 * @typedef {import("../halfshade.js").Systematic} Systematic
 * @typedef {{ [path: string]: string }} Stated what was typed, by the path of the field
 */

const SIDES = /** @type {const} */ ([
  ["generator", "generator"],
  ["analyser", "analyser"],
]);

/** What is asked of each side. Only an uncertainty makes a statement. */
const QUANTITIES = /** @type {const} */ ([
  { name: "retardanceDeg", label: "retarder taken for", unit: "°", usual: "90", per: 1, isUncertainty: false },
  { name: "polarizerDeg", label: "polarizer at", unit: "°", usual: "0", per: 1, isUncertainty: false },
  { name: "retardanceSigmaDeg", label: "retardance ±", unit: "°", usual: "0", per: 1, isUncertainty: true },
  { name: "azimuthSigmaDeg", label: "azimuth ±", unit: "°", usual: "0", per: 1, isUncertainty: true },
  { name: "contrastSigma", label: "contrast ±", unit: "%", usual: "0", per: 100, isUncertainty: true },
]);

const DARK = "darkSigma";

/**
 * The statement for the engine; none without an uncertainty.
 * @param {Stated} stated
 * @returns {{ systematic: Systematic | null, error: string | null }}
 */
export function systematicOf(stated) {
  /** @type {{ [side: string]: { [name: string]: number } }} */
  const sides = {};
  let isStated = false;
  /** @type {string | null} */
  let error = null;
  /** @param {string} path @param {number} per @param {boolean} isUncertainty */
  const numberOf = (path, per, isUncertainty) => {
    const text = stated[path] ?? "";
    if (text.trim() === "") return null;
    const read = readNumber(text);
    if (read.error !== null) {
      error ??= read.error;
      return null;
    }
    if (isUncertainty && read.value < 0) error ??= "An uncertainty is not below zero.";
    if (isUncertainty && read.value > 0) isStated = true;
    // Per cent, without a rounding of their own.
    return per === 1 ? read.value : Number((read.value / per).toPrecision(15));
  };
  for (const [side] of SIDES) {
    for (const { name, per, isUncertainty } of QUANTITIES) {
      const value = numberOf(`${side}.${name}`, per, isUncertainty);
      if (value !== null) (sides[side] ??= {})[name] = value;
    }
  }
  const dark = numberOf(DARK, 100, true);
  if (error !== null || !isStated) return { systematic: null, error };
  return { systematic: { ...sides, ...(dark !== null ? { darkSigma: dark } : {}) }, error: null };
}

/**
 * What has to be typed for a statement.
 * @param {Systematic | undefined} systematic
 * @returns {Stated}
 */
export function typedOf(systematic) {
  /** @type {Stated} */
  const stated = {};
  if (!systematic) return stated;
  /** @param {number} value @param {number} per */
  const text = (value, per) => fullText(per === 1 ? value : Number((value * per).toPrecision(15)));
  for (const [side] of SIDES) {
    for (const { name, per } of QUANTITIES) {
      const value = systematic[side]?.[name];
      if (value !== undefined) stated[`${side}.${name}`] = text(value, per);
    }
  }
  if (systematic.darkSigma !== undefined) stated[DARK] = text(systematic.darkSigma, 100);
  return stated;
}

/**
 * In words, for a report.
 * @param {Systematic} systematic
 */
export function systematicInWords(systematic) {
  const parts = [];
  for (const [side, title] of SIDES) {
    const given = systematic[side] ?? {};
    const said = QUANTITIES.filter(({ name }) => given[name] !== undefined).map(({ name, label, unit, per }) => `${label} ${fullText(Number(((given[name] ?? 0) * per).toPrecision(12)))}${unit === "%" ? " %" : unit}`);
    if (said.length > 0) parts.push(`${title}: ${said.join(", ")}`);
  }
  if (systematic.darkSigma) parts.push(`constant light ± ${fullText(Number((100 * systematic.darkSigma).toPrecision(12)))} % of m00`);
  return parts.join("; ");
}

export class InstrumentPanel {
  /**
   * @param {HTMLElement} root
   * @param {(stated: Stated, merge: string) => void} change
   */
  constructor(root, change) {
    this.change = change;
    /** @type {Stated} */
    this.stated = {};
    /** @type {{ [path: string]: HTMLInputElement }} */
    this.fields = {};
    this.note = make("p", { id: "instrument-note", class: "fine" });
    this.fold = make(
      "details",
      { id: "instrument" },
      make("summary", null, "Uncertainty of the instrument"),
      make(
        "table",
        { class: "fields" },
        make("thead", null, make("tr", null, make("td", null), SIDES.map(([, title]) => make("th", { scope: "col" }, title)))),
        make(
          "tbody",
          null,
          QUANTITIES.map((quantity) =>
            make(
              "tr",
              null,
              make("th", { scope: "row" }, quantity.label, make("span", { class: "unit" }, quantity.unit)),
              SIDES.map(([side, title]) => make("td", null, this.field(`${side}.${quantity.name}`, `${quantity.label} (${quantity.unit}), ${title}`, quantity.usual))),
            ),
          ),
          make("tr", null, make("th", { scope: "row" }, "constant light ±", make("span", { class: "unit" }, "% of m00")), make("td", { colspan: "2" }, this.field(DARK, "constant light ± (% of m00)", "0"))),
        ),
      ),
      this.note,
    );
    root.append(this.fold);
  }

  /**
   * @param {string} path
   * @param {string} label
   * @param {string} usual
   */
  field(path, label, usual) {
    const id = `instrument-${path.replace(".", "-")}`;
    const input = make("input", { type: "text", id, class: "sigma", inputmode: "decimal", autocomplete: "off", spellcheck: "false", placeholder: usual, "aria-label": label, "aria-describedby": "instrument-note" });
    input.addEventListener("input", () => {
      const { [path]: _, ...others } = this.stated;
      this.change(input.value.trim() === "" ? others : { ...others, [path]: input.value }, id);
    });
    this.fields[path] = input;
    return input;
  }

  /**
   * @param {Stated} stated
   * @param {boolean} hasNoise whether a random part is stated, which it stands beside
   * @param {string | null} refused why the engine does not take it
   */
  show(stated, hasNoise, refused) {
    this.stated = stated;
    for (const [path, field] of Object.entries(this.fields)) {
      const text = stated[path] ?? "";
      if (field !== document.activeElement && field.value !== text) field.value = text;
    }
    const { systematic, error } = systematicOf(stated);
    const wrong = error ?? refused ?? (systematic && !hasNoise ? "State the noise above as well: this stands beside it." : null);
    if (Object.keys(stated).length > 0) this.fold.open = true;
    this.note.classList.toggle("wrong", wrong !== null);
    repaint(this.note, wrong ?? "Standard uncertainties that are the same in every measurement, for sides of a polarizer at rest and a retarder that turns. They add to the noise in every number; between the two of a pair they mostly cancel.");
  }
}
