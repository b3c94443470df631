/** What is known of the noise, asked once and quietly. */
import { make, repaint } from "./dom.js";
import { fullText, readNumber, significant, tableOf } from "./format.js";

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
  /** @type {Noise} */
  const none = { kind: "none" };
  if (choice.problem) return { noise: none, error: choice.problem };
  switch (choice.kind) {
    case "rounding":
      return { noise: decimals === null ? none : { kind: "rounding", decimals }, error: null };
    case "uniform":
    case "relative": {
      if (choice.sigma.trim() === "") return { noise: none, error: null };
      if (choice.given) return { noise: /** @type {Noise} */ (choice.given), error: null };
      const read = readNumber(choice.sigma);
      if (read.error !== null) return { noise: none, error: read.error };
      if (read.value <= 0) return { noise: none, error: "σ must be above zero." };
      return { noise: choice.kind === "uniform" ? { kind: "uniform", sigma: read.value } : { kind: "relative", fraction: read.value / 100 }, error: null };
    }
    case "perElement":
    case "covariance":
    case "replicates":
      return { noise: choice.given ? /** @type {Noise} */ (choice.given) : none, error: null };
    default:
      return { noise: none, error: null };
  }
}

/** More repeats than this have their whole covariance, not one σ. */
const MOST_POOLED = 40;

/**
 * Repeats as a noise statement.
 * @param {number[][]} matrices
 * @param {number} sigma of their mean
 * @returns {NoiseChoice}
 */
export function repeatsNoise(matrices, sigma) {
  const note = `From the scatter of ${matrices.length} repeats about their mean, ${matrices.length > MOST_POOLED ? "with their whole covariance" : `pooled over the elements: σ = ${significant(sigma, 3)} of the mean`}. Tests and intervals account for its being an estimate.`;
  return { kind: "replicates", sigma: "", given: { kind: "replicates", matrices }, note };
}

/**
 * A request as the engine takes it: with repeats, which have their own mean, without a matrix.
 * @param {import("./types.js").Request} request
 * @returns {import("../halfshade.js").ExamineRequest}
 */
export function forEngine(request) {
  return request.noise.kind === "replicates" ? { ...request, mueller: null } : request;
}

/**
 * The uncertainties that were printed with the numbers, as a noise statement.
 * @param {number[]} sigma
 * @returns {NoiseChoice}
 */
export function printedNoise(sigma) {
  const counted = sigma.filter((value, k) => k > 0 || value > 0);
  const [least, most] = [Math.min(...counted), Math.max(...counted)];
  if (!(most > 0)) return { kind: "none", sigma: "", given: null };
  if (least === most) return { kind: "uniform", sigma: fullText(most), given: null, note: "Read with the numbers." };
  const note = `Read with the numbers: from ${significant(least)} to ${significant(most)}.`;
  return { kind: "perElement", sigma: tableOf(sigma, 4), given: { kind: "perElement", sigma }, note };
}

/** How many numbers a statement has. */
const COUNTS = { perElement: 16, covariance: 256 };
const DELAY_MS = 200;

export class NoisePanel {
  /**
   * @param {HTMLElement} root
   * @param {object} actions
   * @param {(choice: NoiseChoice, name: string, merge?: string) => void} actions.change
   * @param {(text: string) => number[]} actions.numbers all numbers of a text, sixteen or a multiple; throws why not
   * @param {(file: File) => Promise<number[]>} actions.numbersOfFile
   */
  constructor(root, { change, numbers, numbersOfFile }) {
    this.change = change;
    this.numbers = numbers;
    /** @type {NoiseChoice} */
    this.choice = { kind: "none", sigma: "", given: null };
    this.radios = {
      none: this.radio("none"),
      rounding: this.radio("rounding"),
      uniform: this.radio("uniform"),
      relative: this.radio("relative"),
      perElement: this.radio("perElement"),
      covariance: this.radio("covariance"),
    };
    this.sigma = this.field("sigma", "σ, in the unit of the matrix as given", "uniform");
    this.fraction = this.field("fraction", "σ in per cent of the first element", "relative");
    this.area = make("textarea", { id: "noise-text", rows: "4", wrap: "off", spellcheck: "false", autocomplete: "off", "aria-describedby": "sigma-note" });
    /** @type {ReturnType<typeof setTimeout> | undefined} */
    let timer;
    this.area.addEventListener("input", () => {
      clearTimeout(timer);
      timer = setTimeout(() => this.readArea(), DELAY_MS);
    });
    this.area.addEventListener("blur", () => {
      clearTimeout(timer);
      if (this.area.value !== this.choice.sigma) this.readArea();
    });
    const file = make("input", { type: "file", id: "noise-file", hidden: true });
    file.addEventListener("change", async () => {
      const [chosen] = file.files ?? [];
      file.value = "";
      const { kind } = this.choice;
      if (!chosen || (kind !== "perElement" && kind !== "covariance")) return;
      try {
        const read = await numbersOfFile(chosen);
        this.take(kind, tableOf(read, kind === "covariance" ? 16 : 4), read);
      } catch (error) {
        change({ kind, sigma: "", given: null, problem: error instanceof Error ? error.message : String(error) }, "the noise from a file");
      }
    });
    this.many = make("div", { id: "noise-many" }, this.area, make("button", { type: "button", id: "noise-open", class: "small", onclick: () => file.click() }, "From a file…"), file);
    this.digits = make("span", { class: "mute" });
    this.note = make("p", { id: "sigma-note", class: "fine" });
    this.before = make("details", { id: "noise-detects", hidden: true });
    this.fold = make(
      "details",
      { id: "noise-more" },
      make("summary", null, "More ways to say it"),
      make("span", { class: "with-field" }, make("label", null, this.radios.relative, "σ in per cent of the first element"), this.fraction),
      make("label", { class: "line" }, this.radios.perElement, "a σ for each element"),
      make("label", { class: "line" }, this.radios.covariance, "covariance of the elements, 16 × 16"),
    );
    root.append(
      make("h3", { id: "noise-heading" }, "Noise"),
      make(
        "div",
        { class: "options", role: "radiogroup", "aria-labelledby": "noise-heading" },
        make("label", null, this.radios.none, "none stated"),
        make("label", null, this.radios.rounding, make("span", null, "from the digits as pasted ", this.digits)),
        make("span", { class: "with-field" }, make("label", null, this.radios.uniform, "I know σ"), this.sigma),
        this.fold,
      ),
      this.many,
      this.note,
      this.before,
    );
  }

  /**
   * A field for one number.
   * @param {string} id
   * @param {string} label
   * @param {"uniform" | "relative"} kind
   */
  field(id, label, kind) {
    const input = make("input", { type: "text", id, class: "sigma", inputmode: "decimal", autocomplete: "off", spellcheck: "false", "aria-label": label, "aria-describedby": "sigma-note" });
    input.addEventListener("input", () => this.change({ kind, sigma: input.value, given: null }, "the change of σ", id));
    return input;
  }

  /** @param {"none" | "rounding" | "uniform" | "relative" | "perElement" | "covariance"} kind */
  radio(kind) {
    const input = make("input", { type: "radio", name: "noise", id: `noise-${kind}`, value: kind });
    input.addEventListener("change", () => {
      this.change({ kind, sigma: "", given: null }, "the change of the noise");
      if (kind === "uniform") this.sigma.focus();
      if (kind === "relative") this.fraction.focus();
      if (kind === "perElement" || kind === "covariance") this.area.focus();
    });
    return input;
  }

  readArea() {
    const { kind } = this.choice;
    if (kind !== "perElement" && kind !== "covariance") return;
    const text = this.area.value;
    if (text.trim() === "") {
      this.change({ kind, sigma: text, given: null }, "the change of the noise", "noise-text");
      return;
    }
    try {
      this.take(kind, text, this.numbers(text), "noise-text");
    } catch (error) {
      this.change({ kind, sigma: text, given: null, problem: error instanceof Error ? error.message : String(error) }, "the change of the noise", "noise-text");
    }
  }

  /**
   * @param {"perElement" | "covariance"} kind
   * @param {string} text
   * @param {number[]} numbers
   * @param {string} [merge]
   */
  take(kind, text, numbers, merge) {
    const count = COUNTS[kind];
    const given = kind === "perElement" ? { kind, sigma: numbers } : { kind, covariance: numbers };
    const problem = numbers.length === count ? undefined : `${count} numbers are needed, and ${numbers.length} were found.`;
    this.change({ kind, sigma: text, given: problem ? null : given, ...(problem ? { problem } : {}) }, "the change of the noise", merge);
  }

  /**
   * @param {NoiseChoice} choice
   * @param {number | null} decimals
   * @param {boolean} filled
   * @param {string | null} refused why the engine does not take the statement
   * @param {string} detects what the noise can show
   */
  show(choice, decimals, filled, refused, detects) {
    this.choice = choice;
    const error = noiseOf(choice, decimals).error ?? refused;
    for (const [kind, radio] of Object.entries(this.radios)) radio.checked = kind === choice.kind;
    this.radios.rounding.disabled = decimals === null && choice.kind !== "rounding";
    this.digits.textContent = decimals !== null ? `(${decimals} decimal${decimals === 1 ? "" : "s"})` : filled ? "(not plain from them)" : "";
    const isMany = choice.kind === "perElement" || choice.kind === "covariance";
    if (isMany || choice.kind === "relative") this.fold.open = true;
    this.many.hidden = !isMany;
    this.area.setAttribute("aria-label", choice.kind === "covariance" ? "Covariance of the elements, 16 × 16 numbers" : "σ of each element, sixteen numbers");
    for (const [field, kinds] of /** @type {const} */ ([
      [this.sigma, ["uniform"]],
      [this.fraction, ["relative"]],
      [this.area, ["perElement", "covariance"]],
    ])) {
      const mine = /** @type {readonly string[]} */ (kinds).includes(choice.kind);
      const text = mine ? choice.sigma : "";
      if (field !== document.activeElement && field.value !== text) field.value = text;
      if (mine && error) field.setAttribute("aria-invalid", "true");
      else field.removeAttribute("aria-invalid");
    }
    this.note.classList.toggle("wrong", error !== null);
    repaint(this.note, error ?? this.hint(choice, decimals));
    this.before.hidden = detects === "";
    repaint(this.before, make("summary", null, "What this noise can show"), make("p", { class: "fine" }, detects));
  }

  /**
   * @param {NoiseChoice} choice
   * @param {number | null} decimals
   */
  hint(choice, decimals) {
    if (choice.note) return choice.note;
    switch (choice.kind) {
      case "other":
        return "The link states a noise that this version cannot use. It is kept in the link; here, none is stated.";
      case "uniform":
        return "Standard deviation of one element, in the unit of the matrix as given.";
      case "relative":
        return "Standard deviation of one element, of the first element as given.";
      case "perElement":
        return "Sixteen standard deviations, laid out as the matrix, in its unit; 0 for an exact element.";
      case "covariance":
        return "256 numbers: row and column count the elements as they are laid out. Rows of zeros for exact elements.";
      case "rounding":
        return decimals === null ? "The digits do not show a resolution, so no noise is stated." : "Rounding alone: the least noise that printed numbers can have.";
      default:
        return "Without it, no number here has an uncertainty.";
    }
  }
}
