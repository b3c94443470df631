/** The fit of a train to the measured matrix, and known optics taken away from it. */
import { choice, fold, make, repaint } from "../dom.js";
import { ask, cancel, isDropped } from "../engine.js";
import { elementName, fixed, place, significant } from "../format.js";
import { colouredCells, matrixTable } from "../matrix-view.js";
import { forEngine } from "../noise.js";
import { noiseChoice } from "../link.js";
import { problemOf, sidesOf, titleOf, withElement, withValues } from "../train.js";
import { figureText, intervalText } from "../words.js";

/**
 * @typedef {import("../train.js").TrainWork} TrainWork
 * @typedef {import("../types.js").Request} Request
 * @typedef {import("../../halfshade.js").TrainFit} TrainFit
 * @typedef {import("../../halfshade.js").RemovedOptics} RemovedOptics
 *
 * @typedef {object} ResultActions
 * @property {(name: string, work: TrainWork) => void} change
 * @property {(mueller: number[], name: string, part: Partial<import("../types.js").Measurement>, work: TrainWork) => void} use take
 *   a matrix over as the measured one, with another state of the task, as one step
 * @property {(message: string) => void} tell
 * @property {(error: unknown) => void} failed
 * @property {import("../types.js").FormatValue} format
 */

const FIT = "train-fit";
const REMOVAL = "train-removal";
/** Work that takes longer shows that it runs. */
const PATIENCE_MS = 300;

/**
 * The measured matrix as a member of a request.
 * @param {Request} request
 * @returns {import("../../halfshade.js").Measurement}
 */
export function measuredOf(request) {
  const { mueller, normalised, absolute, convention, noise } = forEngine(request);
  return { mueller, normalised, absolute, convention, noise };
}

export class FitPanel {
  /** @param {ResultActions} actions */
  constructor(actions) {
    this.actions = actions;
    this.element = make("section", { id: "train-fit", "aria-labelledby": "train-fit-heading" });
    /** @type {{ key: string, result: TrainFit } | null} */
    this.fitted = null;
    this.key = "";
    this.running = "";
    this.shown = "";
    /** @type {TrainWork | null} */
    this.work = null;
    /** @type {Request | null} */
    this.request = null;
  }

  stop() {
    if (this.running !== "") cancel(FIT);
  }

  /**
   * @param {TrainWork} work
   * @param {Request | null} request
   * @param {boolean} sound whether the engine takes the train as it is
   */
  show(work, request, sound) {
    this.work = work;
    this.request = request;
    const free = work.train.flatMap((element) => Object.values(element.parameters ?? {})).filter((parameter) => parameter.free).length;
    this.key = request ? JSON.stringify([measuredOf(request), problemOf(work.train)]) : "";
    if (this.running !== "" && this.running !== this.key) this.stop();
    if (this.running !== "") return;
    const fitted = this.fitted?.key === this.key ? this.fitted.result : null;
    const shown = JSON.stringify([this.key, free, sound, fitted !== null]);
    if (shown === this.shown) return;
    this.shown = shown;
    const missing = !request ? "A measured matrix is needed, beside this: what does the whole train do?" : free === 0 ? "Nothing is free: choose “free” beside each parameter that is not known." : !sound ? "The train has to be whole first; the reason stands beside the element." : null;
    repaint(
      this.element,
      heading("train-fit-heading", "What is unknown, fitted"),
      missing
        ? make("p", { class: "mute" }, missing)
        : make(
            "p",
            null,
            make("button", { type: "button", id: "train-fit-start", class: fitted ? null : "primary", onclick: () => void this.fit() }, fitted ? "Fit again" : `Fit ${free} free ${free === 1 ? "parameter" : "parameters"} to the measured matrix`),
            this.fitted && !fitted ? make("span", { class: "fine" }, " The train or the matrix is another than in the last fit.") : null,
          ),
      fitted && !missing ? this.report(fitted) : null,
    );
  }

  async fit() {
    const { work, request, key } = this;
    if (!work || !request) return;
    this.running = key;
    const start = performance.now();
    const seconds = make("span", null, "0 s");
    const words = make(
      "p",
      { hidden: true },
      make("progress", { "aria-label": "Fitting" }),
      " Searching from several starts… ",
      seconds,
      " ",
      make("button", { type: "button", id: "train-fit-stop", class: "inline", onclick: () => this.stop() }, "Stop"),
    );
    this.element.append(words);
    const timer = setInterval(() => {
      words.hidden = false;
      seconds.textContent = `${Math.round((performance.now() - start) / 1000)} s`;
    }, PATIENCE_MS);
    let said = "";
    try {
      const result = await ask("fitTrain", [{ target: measuredOf(request), train: work.train, seed: 1 }], { channel: FIT });
      this.fitted = { key, result };
      said = `Fitted. ${qualityOf(result)}`;
    } catch (error) {
      if (isDropped(error)) said = "The fit was stopped. Nothing was changed.";
      else this.actions.failed(error);
    } finally {
      clearInterval(timer);
      words.remove();
      this.running = "";
      this.shown = "";
      if (this.work && this.element.isConnected) this.show(this.work, this.request, true);
    }
    if (said) this.actions.tell(said);
    // Whoever went on to something else meanwhile keeps the keyboard there.
    if (document.activeElement === document.body || this.element.contains(document.activeElement)) document.getElementById("train-fit-start")?.focus({ preventScroll: true });
  }

  /** @param {TrainFit} fit */
  report(fit) {
    const { format } = this.actions;
    const { parameters, nullDirections, equivalents, residuals } = fit;
    const use = (/** @type {number[]} */ values, /** @type {string} */ name) => this.work && this.actions.change(name, withValues(this.work, parameters.map((parameter, k) => ({ ...parameter, value: values[k] ?? parameter.value }))));
    const largest = Math.max(...(residuals ?? []).map(Math.abs), 0);
    return [
      make("p", { id: "train-fit-quality" }, qualityOf(fit)),
      make(
        "div",
        { class: "scroll", tabindex: "0", role: "region", "aria-label": "The fitted parameters" },
        make(
          "table",
          { id: "train-fitted", class: "data" },
          make("thead", null, make("tr", null, ["parameter", "value", "interval", ""].map((title) => (title ? make("th", { scope: "col" }, title) : make("td", null))))),
          make(
            "tbody",
            null,
            parameters.map(({ title, value, se, low, high, unit, atBound, reason }) => {
              const figure = /** @type {import("../types.js").Figure} */ (/** @type {unknown} */ ({ value, se, low, high }));
              return make(
                "tr",
                null,
                make("th", { scope: "row" }, title),
                make("td", { class: "number" }, figureText(figure, format) ?? "", unit === "deg" ? make("span", { class: "unit" }, "°") : null),
                make("td", { class: "number" }, intervalText(figure)),
                make("td", { class: "mute" }, [atBound ? "at its bound" : null, reason].filter(Boolean).join("; ")),
              );
            }),
          ),
        ),
      ),
      nullDirections.length > 0 ? [make("h3", null, "What cannot be told apart"), make("ul", { id: "train-null", class: "plain" }, nullDirections.map(({ sentence }) => make("li", null, sentence)))] : null,
      equivalents.length > 0
        ? [
            make("h3", null, "Other solutions, as good"),
            make(
              "ul",
              { id: "train-equivalents", class: "plain" },
              equivalents.map(({ values, sentence }, k) =>
                make(
                  "li",
                  null,
                  sentence,
                  " ",
                  make("span", { class: "mute" }, parameters.map(({ title, unit }, index) => `${title} ${significant(values[index] ?? 0, 4)}${unit === "deg" ? "°" : ""}`).join(", ")),
                  ". ",
                  make("button", { type: "button", id: `train-equivalent-${k}`, class: "small", onclick: () => use(values, "the use of another solution") }, "Use these"),
                ),
              ),
            ),
          ]
        : null,
      make("p", { class: "row" }, make("button", { type: "button", id: "train-use-fit", class: "primary", onclick: () => use(parameters.map(({ value }) => value), "the use of the fitted values") }, "Use the fitted values")),
      residuals
        ? [
            make("h3", null, "What is left ", make("span", { class: "unit" }, "in σ")),
            make("div", { class: "narrow" }, colouredCells("Measured minus fitted, in σ", residuals, { full: Math.max(3, largest), write: (value) => fixed(value, 1) })),
            make("p", { class: "said mute" }, "Blue: measured is larger; orange: smaller."),
          ]
        : null,
      fold("train-fitted-matrix", "The matrix of the fitted train", make("div", { class: "matrices" }, matrixTable("train-fitted-total", "Matrix of the fitted train", fit.mueller, this.actions.tell))),
    ];
  }
}

/** @param {TrainFit} fit */
function qualityOf({ chiSquare, degreesOfFreedom, pValue, stop }) {
  const unfinished = stop === "steps" ? " The search ended at its largest number of steps: another start may do better." : "";
  if (chiSquare === null) return `No noise is stated, so there is no χ² and no uncertainty.${unfinished}`;
  const numbers = `χ² = ${significant(chiSquare, 3)} for ${degreesOfFreedom} degrees of freedom`;
  if (pValue === null) return `${numbers}.${unfinished}`;
  return `${pValue >= 0.05 ? "The train explains the matrix within its noise" : "The train does not explain the matrix: more is left than the noise"} (${numbers}, p = ${significant(pValue)}).${unfinished}`;
}

export class RemovalPanel {
  /** @param {ResultActions} actions */
  constructor(actions) {
    this.actions = actions;
    this.controls = make("div", null);
    this.result = make("div", { id: "train-removed" });
    this.element = make("section", { id: "train-removal", "aria-labelledby": "train-removal-heading" }, heading("train-removal-heading", "Known optics taken away"), this.controls, this.result);
    this.key = "";
    /** @type {TrainWork | null} */
    this.work = null;
    /** @type {Request | null} */
    this.request = null;
  }

  stop() {
    cancel(REMOVAL);
    this.key = "";
  }

  /**
   * @param {TrainWork} work
   * @param {Request | null} request
   * @param {string} label of the measured matrix
   */
  show(work, request, label) {
    this.work = work;
    this.request = request;
    this.label = label;
    const { train, before, behind } = work;
    const set = (/** @type {Partial<TrainWork>} */ part, /** @type {string} */ name) => this.actions.change(name, { ...work, ...part });
    /** @param {"before" | "behind"} side @param {string} words */
    const ends = (side, words) => {
      const { count, given } = work[side];
      const other = work[side === "before" ? "behind" : "before"].count;
      const options = /** @type {[string, string][]} */ ([["0", "nothing"]]);
      for (let k = 1; k <= train.length - other; k += 1) {
        const part = side === "before" ? train.slice(0, k) : train.slice(train.length - k);
        options.push([String(k), part.map(titleOf).join(", ")]);
      }
      if (given) options.unshift(["given", "optics that are not in the list, as opened"]);
      return make("label", { class: "side" }, make("span", null, words), choice({ id: `train-${side}`, label: words, value: given ? "given" : String(count), options, change: (value) => value !== "given" && set({ [side]: { count: Number(value), given: null } }, "the choice of known optics") }));
    };
    /** @param {"reflection" | "direct"} name @param {string} words */
    const box = (name, words) => {
      const input = make("input", { type: "checkbox", id: `train-${name}` });
      input.checked = work[name];
      input.addEventListener("change", () => set({ [name]: input.checked }, name === "reflection" ? "the change of the reflection" : "the question for undisturbed light"));
      return make("label", { class: "side" }, input, words);
    };
    repaint(
      this.controls,
      make("p", { class: "fine" }, "What light meets before and behind the sample is divided out of the measured matrix, with the values above and with the noise of measured elements."),
      make("div", { class: "options" }, ends("before", "before the sample"), ends("behind", "behind the sample"), box("reflection", "the sample reflects, and its matrix is wanted as in transmission"), box("direct", "ask how much undisturbed light, as through air, the sample can hold")),
    );
    const { pre, post } = sidesOf({ train, before, behind });
    if (!request || (!pre && !post && !work.reflection)) {
      cancel(REMOVAL);
      this.key = "";
      repaint(this.result, make("p", { class: "mute" }, request ? "Choose what is known." : "A measured matrix is needed, beside this."));
      return;
    }
    const measured = measuredOf(request);
    const asked = { measured, pre, post, reflection: work.reflection, ...(work.direct ? { direct: /** @type {any} */ ([1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1]) } : {}) };
    const key = JSON.stringify(asked);
    if (key === this.key) return;
    this.key = key;
    const slow = setTimeout(() => repaint(this.result, make("p", null, make("progress", { "aria-label": "Calculating" }), " Calculating… ", make("button", { type: "button", id: "train-removal-stop", class: "inline", onclick: () => cancel(REMOVAL) }, "Stop"))), PATIENCE_MS);
    ask("removeOptics", [asked], { channel: REMOVAL })
      .then(
        (removed) => this.key === key && this.report(removed, request),
        (error) => {
          if (this.key !== key) return;
          if (isDropped(error)) repaint(this.result, make("p", { class: "mute" }, "The calculation was stopped."));
          else repaint(this.result, make("p", { class: "wrong", role: "status" }, `They cannot be taken away: ${error.message}`));
        },
      )
      .finally(() => clearTimeout(slow));
  }

  /**
   * @param {RemovedOptics} removed
   * @param {Request} request
   */
  report(removed, request) {
    const { tell, format } = this.actions;
    const { mueller, conditionNumber, sigmaGrowth, samples, direct, reason } = removed;
    const full = Math.max(...mueller.map(Math.abs), ...request.mueller.map(Math.abs));
    const rowMajor = [...mueller].map((_, k) => request.mueller[place(request.convention.order, Math.floor(k / 4), k % 4)] ?? 0);
    const scale = { full, write: (/** @type {number} */ value) => fixed(value, 3) };
    const growths = sigmaGrowth ?? [];
    repaint(
      this.result,
      make("p", { id: "train-condition" }, "Condition number ", make("b", { class: "number" }, significant(conditionNumber, 3)), `: relative errors grow by this factor at the most${sigmaGrowth ? `; here by ${significant(Math.min(...growths), 2)} to ${significant(Math.max(...growths), 2)}` : ""}.`, reason ? ` No interval: ${reason}.` : ""),
      make(
        "div",
        { class: "pair" },
        make("div", null, make("h3", null, "Before: as measured"), colouredCells("As measured", rowMajor, scale)),
        make("div", null, make("h3", null, "After: the sample alone"), colouredCells("The sample alone", mueller, scale)),
      ),
      make("p", { class: "row" }, make("button", { type: "button", id: "train-use-removed", class: "primary", onclick: () => this.use(removed, request) }, "Use as the measured matrix"), make("span", { class: "fine" }, " With its covariance; the elements taken away leave the beam of the train.")),
      make(
        "div",
        { class: "folds" },
        fold("train-removed-matrix", "The matrix of the sample in numbers", make("div", { class: "matrices" }, matrixTable("train-removed-matrix-numbers", "The sample alone", mueller, tell))),
        sigmaGrowth ? fold("train-growth", "Growth of σ, element by element", make("div", { class: "narrow" }, colouredCells("Growth of σ", sigmaGrowth, { full: Math.max(...sigmaGrowth), write: (value) => fixed(value, 2) })), make("p", { class: "fine" }, `σ over ${elementName(0, 0)} of the sample, over that of the measurement.`)) : null,
        samples.length > 0
          ? fold(
              "train-samples",
              "Instead: physical samples fitted with the optics as they are",
              samples.map((sample) => [
                make(
                  "p",
                  null,
                  sample.model === "realizable" ? "The realizable sample that explains the measurement best" : "A pure element with isotropic depolarization",
                  sample.chiSquare !== null && sample.pValue !== null ? `: χ² = ${significant(sample.chiSquare, 3)}${sample.degreesOfFreedom !== null ? ` for ${sample.degreesOfFreedom} degrees of freedom` : ""} (p = ${significant(sample.pValue)})` : sample.chiSquare !== null ? `: χ² = ${significant(sample.chiSquare, 3)}` : "",
                  sample.alpha !== null ? `, α = ${format({ value: sample.alpha, se: sample.alphaSe }).text}` : "",
                  `. Its distance from the matrix above is ${significant(sample.distance)} of ${elementName(0, 0)}.`,
                ),
                make("div", { class: "matrices" }, matrixTable(`train-sample-${sample.model}`, sample.model === "realizable" ? "Realizable sample" : "Pure sample with depolarization", sample.mueller, tell)),
              ]),
            )
          : null,
      ),
      direct ? make("p", { id: "train-direct-weight" }, "Undisturbed light can be at most ", make("b", { class: "number" }, format({ value: direct.weight, se: direct.se }).text), ` of ${elementName(0, 0)}${direct.reason ? ` (${direct.reason})` : ""}.`) : this.work?.direct ? make("p", { id: "train-direct-weight", class: "mute" }, "How much undisturbed light there can be is not determined.") : null,
    );
  }

  /**
   * @param {RemovedOptics} removed
   * @param {Request} request
   */
  use({ mueller, covariance, normalised }, { convention }) {
    const { work } = this;
    if (!work) return;
    const { order } = convention;
    const laid = (/** @type {number} */ k) => place(order, Math.floor(k / 4), k % 4);
    /** @type {number[]} */
    const ordered = Array(256).fill(0);
    covariance?.forEach((value, k) => (ordered[16 * laid(Math.floor(k / 16)) + laid(k % 16)] = value));
    const length = work.train.length;
    /** @type {TrainWork} */
    let next = { ...work, before: { count: 0, given: null }, behind: { count: 0, given: null }, reflection: false };
    for (let k = 0; k < length; k += 1) {
      if (k < work.before.count || k >= length - work.behind.count) next = withElement(next, k, { disabled: true });
    }
    this.actions.use(
      mueller,
      "taking known optics away",
      { noise: noiseChoice(covariance ? { kind: "covariance", covariance: ordered } : { kind: "none" }), instrument: {}, normalised, example: false, story: "", label: `${this.label || "Sample"}, without known optics`.slice(0, 80) },
      next,
    );
  }
}

/** @param {string} id @param {string} words */
function heading(id, words) {
  return make("h2", { id }, words);
}
