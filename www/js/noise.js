/** What is known of the noise, asked once and quietly. */
import { make, repaint } from "./dom.js";
import { fullText, readNumber, significant } from "./format.js";

/**
 * @typedef {import("./types.js").NoiseChoice} NoiseChoice
 * @typedef {import("./types.js").Noise} Noise
 */

/**
 * The statement that the engine gets, and what is wrong with the choice if anything is.
 * @param {NoiseChoice} choice
 * @param {number | null} decimals printed resolution of the matrix
 * @returns {{ noise: Noise, error: string | null }}
 */
export function noiseOf(choice, decimals) {
  if (choice.kind === "rounding" && decimals !== null) return { noise: { kind: "rounding", decimals }, error: null };
  if (choice.kind === "uniform" && choice.sigma.trim() !== "") {
    const read = readNumber(choice.sigma);
    if (read.error !== null) return { noise: { kind: "none" }, error: read.error };
    if (read.value <= 0) return { noise: { kind: "none" }, error: "σ must be above zero." };
    return { noise: { kind: "uniform", sigma: read.value }, error: null };
  }
  return { noise: { kind: "none" }, error: null };
}

/**
 * The uncertainties that were printed with the numbers, as one σ.
 * @param {number[]} sigma
 * @param {boolean} exactFirst whether the first element has none
 * @returns {NoiseChoice}
 */
export function printedNoise(sigma, exactFirst) {
  const counted = exactFirst ? sigma.slice(1) : sigma;
  const [least, most] = [Math.min(...counted), Math.max(...counted)];
  const mean = Math.sqrt(counted.reduce((sum, value) => sum + value * value, 0) / counted.length);
  if (!(mean > 0)) return { kind: "none", sigma: "", given: null };
  const note =
    least === most
      ? "Read with the numbers."
      : `Read with the numbers: from ${significant(least)} to ${significant(most)}. Their root mean square stands for all of them.`;
  return { kind: "uniform", sigma: fullText(least === most ? least : Number(mean.toPrecision(4))), given: null, note };
}

export class NoisePanel {
  /**
   * @param {HTMLElement} root
   * @param {(choice: NoiseChoice, name: string, merge?: string) => void} change
   */
  constructor(root, change) {
    this.change = change;
    /** @type {NoiseChoice} */
    this.choice = { kind: "none", sigma: "", given: null };
    this.radios = {
      none: this.radio("none"),
      rounding: this.radio("rounding"),
      uniform: this.radio("uniform"),
    };
    this.sigma = make("input", {
      type: "text",
      id: "sigma",
      class: "sigma",
      inputmode: "decimal",
      autocomplete: "off",
      spellcheck: "false",
      "aria-label": "σ, in the unit of the matrix as given",
      "aria-describedby": "sigma-note",
    });
    this.sigma.addEventListener("input", () => {
      change({ kind: "uniform", sigma: this.sigma.value, given: null }, "the change of σ", "sigma");
    });
    this.digits = make("span", { class: "mute" });
    this.note = make("p", { id: "sigma-note", class: "fine" });
    root.append(
      make("h3", { id: "noise-heading" }, "Noise"),
      make(
        "div",
        { class: "options", role: "radiogroup", "aria-labelledby": "noise-heading" },
        make("label", null, this.radios.none, "none stated"),
        make("label", null, this.radios.rounding, make("span", null, "from the digits as pasted ", this.digits)),
        make("span", { class: "with-field" }, make("label", null, this.radios.uniform, "I know σ"), this.sigma),
      ),
      this.note,
    );
  }

  /** @param {"none" | "rounding" | "uniform"} kind */
  radio(kind) {
    const input = make("input", { type: "radio", name: "noise", id: `noise-${kind}`, value: kind });
    input.addEventListener("change", () => {
      this.change({ ...this.choice, kind, given: null }, "the change of the noise");
      if (kind === "uniform" && this.sigma.value === "") this.sigma.focus();
    });
    return input;
  }

  /**
   * @param {NoiseChoice} choice
   * @param {number | null} decimals
   * @param {boolean} filled
   */
  show(choice, decimals, filled) {
    this.choice = choice;
    const { error } = noiseOf(choice, decimals);
    for (const [kind, radio] of Object.entries(this.radios)) radio.checked = kind === choice.kind;
    this.radios.rounding.disabled = decimals === null && choice.kind !== "rounding";
    this.digits.textContent = decimals !== null ? `(${decimals} decimal${decimals === 1 ? "" : "s"})` : filled ? "(not plain from them)" : "";
    if (this.sigma !== document.activeElement && this.sigma.value !== choice.sigma) this.sigma.value = choice.sigma;
    if (error) this.sigma.setAttribute("aria-invalid", "true");
    else this.sigma.removeAttribute("aria-invalid");
    this.note.classList.toggle("wrong", error !== null);
    repaint(this.note, error ?? this.hint(choice, decimals));
  }

  /**
   * @param {NoiseChoice} choice
   * @param {number | null} decimals
   */
  hint(choice, decimals) {
    if (choice.kind === "other") return "The link states a noise that this version cannot use. It is kept in the link; here, none is stated.";
    if (choice.kind === "uniform" && choice.note) return choice.note;
    if (choice.kind === "uniform") return "Standard deviation of one element, in the unit of the matrix as given.";
    if (choice.kind === "rounding" && decimals === null) return "The digits do not show a resolution, so no noise is stated.";
    if (choice.kind === "rounding") return "Rounding alone: the least noise that printed numbers can have.";
    return "Without it, no number here has an uncertainty.";
  }
}
