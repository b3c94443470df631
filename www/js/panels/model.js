/** The task Model selection: which model with the fewest parameters explains the matrix. */
import { choice, fold, make, repaint } from "../dom.js";
import { ask, cancel, isDropped, quick } from "../engine.js";
import { exported } from "../exports.js";
import { saveFile } from "../files.js";
import { fixed, significant } from "../format.js";
import { colouredCells, copyButton, matrixTable } from "../matrix-view.js";
import { MODELS, SIDES, UNITS, parameterTitle, standing } from "../models.js";
import { forEngine } from "../noise.js";
import { DoubtPanel } from "./doubt.js";

/**
 * @typedef {import("../types.js").Shown} Shown
 * @typedef {import("../types.js").Request} Request
 * @typedef {import("../../halfshade.js").Fits} Fits
 * @typedef {import("../../halfshade.js").ModelFit} ModelFit
 * @typedef {import("../../halfshade.js").FitParameter} FitParameter
 * @typedef {{ model?: string, side?: import("../../halfshade.js").DepolarizationSide }} Choice
 */

const CHANNEL = "fit";
/** A short calculation needs no sign of being one. */
const PATIENCE_MS = 300;

export class ModelPanel {
  /**
   * @param {HTMLElement} root
   * @param {import("../tasks.js").TaskActions} actions
   */
  constructor(root, actions) {
    this.actions = actions;
    this.head = make("div", { class: "verdict" });
    this.progress = make("p", { id: "fit-progress" });
    this.progress.hidden = true;
    this.table = make("div", null);
    this.below = make("div", null);
    this.doubt = new DoubtPanel(actions);
    root.append(this.head, this.progress, this.table, this.below, this.doubt.element);
    /** What `found` answers. */
    this.key = "";
    /** @type {Fits | null} */
    this.found = null;
    /** @type {Shown | null} */
    this.shown = null;
  }

  clear() {
    this.shown = null;
    for (const part of [this.head, this.table, this.below]) repaint(part);
    this.progress.hidden = true;
    this.doubt.show(null);
  }

  /** @param {Shown} shown */
  show(shown) {
    this.shown = shown;
    const { request } = shown;
    if (!request) {
      this.clear();
      return;
    }
    const asked = this.asked(request);
    const key = JSON.stringify(asked);
    if (key !== this.key) {
      this.key = key;
      this.found = null;
      void this.fit(asked, key);
    }
    this.paint();
  }

  /** @returns {Choice} */
  get choice() {
    return /** @type {Choice} */ (this.shown?.work.blocks["fit"] ?? {});
  }

  /**
   * @param {Request} request
   * @returns {import("../../halfshade.js").FitRequest}
   */
  asked(request) {
    const { draws, seed, ...target } = forEngine(request);
    return { target, side: this.choice.side ?? "parallel", seed: request.seed };
  }

  /**
   * @param {import("../../halfshade.js").FitRequest} asked
   * @param {string} key
   */
  async fit(asked, key) {
    const start = performance.now();
    const seconds = make("span", null, "0 s");
    const timer = setInterval(() => {
      const passed = performance.now() - start;
      if (passed < PATIENCE_MS) return;
      seconds.textContent = `${Math.floor(passed / 1000)} s`;
      if (this.progress.hidden) {
        this.progress.hidden = false;
        repaint(this.progress, make("progress", { "aria-label": "Fitting the models" }), " Fitting the models… ", seconds, " ", make("button", { type: "button", id: "stop-fit", class: "inline", onclick: () => cancel(CHANNEL) }, "Stop"));
      }
    }, 100);
    try {
      const found = await ask("fit", [asked], { channel: CHANNEL });
      if (this.key !== key) return;
      this.found = found;
      this.paint();
      this.actions.tell(found.recommended ? `${MODELS[found.recommended.model]?.title ?? ""} recommended.` : "No model can be recommended.");
    } catch (error) {
      if (this.key === key) this.key = "";
      if (isDropped(error)) this.actions.tell("The fit was stopped.");
      else if (this.shown) repaint(this.head, make("h1", { id: "task-heading", tabindex: "-1" }, "No model can be fitted"), make("p", { class: "wrong" }, error instanceof Error ? error.message : String(error)));
    } finally {
      clearInterval(timer);
      this.progress.hidden = true;
    }
  }

  /** The fit that is shown: the chosen one, or the recommended. */
  get fitShown() {
    const { found } = this;
    const name = this.choice.model ?? found?.recommended?.model;
    return found?.fits.find((fit) => fit.model === name) ?? found?.fits.at(-1) ?? null;
  }

  paint() {
    const { found, shown } = this;
    if (!shown?.request) return;
    if (!found) {
      repaint(this.head, make("p", { class: "kicker" }, "Which model explains it?"), make("h1", { id: "task-heading", tabindex: "-1" }, "Fitting the models…"));
      for (const part of [this.table, this.below]) repaint(part);
      this.doubt.show(null);
      return;
    }
    const fit = this.fitShown;
    const { recommended } = found;
    repaint(
      this.head,
      make("p", { class: "kicker" }, "Which model explains it?"),
      make("h1", { id: "task-heading", tabindex: "-1" }, recommended ? (MODELS[recommended.model]?.title ?? "") : "None can be told from the others"),
      make("p", { id: "model-reason" }, recommended?.sentence ?? "There are not enough elements or no noise to decide by."),
      make(
        "p",
        { class: "fine" },
        recommended?.rule === "p-value" ? "Recommended is the model with the fewest parameters that noise explains (p ≥ 0.05); of several, the one with the lower χ². " : "Recommended is the model with the lowest criterion (AIC). ",
        "Depolarization stands ",
        choice({ id: "fit-side", label: "Where the depolarization stands", value: this.choice.side ?? "parallel", options: SIDES, change: (side) => this.choose({ side: /** @type {any} */ (side) }, "the change of the depolarization’s place") }),
        ".",
      ),
    );
    repaint(this.table, this.candidates(found, fit));
    repaint(this.below, fit ? this.details(fit, shown) : null);
    this.doubt.show(fit && shown.request ? { request: this.asked(shown.request), fit } : null);
  }

  /**
   * @param {Choice} part
   * @param {string} name
   */
  choose(part, name) {
    const next = { ...this.choice, ...part };
    this.actions.change(name, { fit: next });
  }

  /**
   * @param {Fits} found
   * @param {ModelFit | null} chosen
   */
  candidates({ fits, recommended }, chosen) {
    const lowest = Math.min(...fits.map((fit) => fit.aic ?? Infinity));
    const head = ["", "model", "parameters", "χ²", "degrees of freedom", "p", "AIC above the lowest", ""];
    return make(
      "div",
      { class: "scroll", tabindex: "0", role: "region", "aria-label": "Candidate models" },
      make(
        "table",
        { class: "data candidates" },
        make("thead", null, make("tr", null, head.map((text, k) => (k === 0 ? make("td", null) : make("th", { scope: "col" }, text || "standing"))))),
        make(
          "tbody",
          null,
          fits.map((fit) => {
            const words = MODELS[fit.model] ?? { title: fit.model, note: "" };
            const radio = make("input", { type: "radio", name: "model", id: `model-${fit.model}`, value: fit.model });
            radio.checked = fit === chosen;
            radio.addEventListener("change", () => this.choose({ model: fit.model }, "the choice of a model"));
            const isRecommended = fit.model === recommended?.model;
            return make(
              "tr",
              { class: [isRecommended ? "recommended" : "", fit.pValue !== null && fit.pValue < 0.05 ? "fails" : ""].join(" ").trim() || null },
              make("td", null, radio),
              make("th", { scope: "row" }, make("label", { for: `model-${fit.model}` }, words.title, make("span", { class: "note" }, words.note))),
              make("td", { class: "number" }, String(fit.parameterCount)),
              make("td", { class: "number" }, fit.chiSquare === null ? "" : short(fit.chiSquare)),
              make("td", { class: "number" }, String(fit.degreesOfFreedom)),
              make("td", { class: "number" }, pText(fit)),
              make("td", { class: "number" }, fit.aic === null ? "" : short(fit.aic - lowest)),
              make("td", null, standing(fit, recommended?.model)),
            );
          }),
        ),
      ),
      make("p", { class: "fine" }, "χ² counts the squared residuals in their standard errors. The p of mixtures is simulated, because χ² would reject them too often; that of any realizable matrix is the test of realizability."),
    );
  }

  /**
   * @param {ModelFit} fit
   * @param {Shown} shown
   */
  details(fit, { work }) {
    const { actions } = this;
    const title = MODELS[fit.model]?.title ?? fit.model;
    const largest = Math.max(3, ...fit.residuals.map(Math.abs));
    const noisy = fit.chiSquare !== null;
    const stem = (work.measurement.label || "fit").replace(/[^\p{L}\p{N}]+/gu, "-").slice(0, 40);
    return [
      make("h2", null, title),
      fit.stop === "minimum" ? null : make("p", { class: "wrong" }, "The search ended without a clear minimum: take these numbers with care."),
      fit.remarks.map((remark) => make("p", { class: "fine" }, remark)),
      make(
        "div",
        { class: "columns" },
        make(
          "div",
          null,
          this.parameterTable("parameters", "Parameters", fit.parameters),
          fit.derived.length > 0 ? this.parameterTable("derived", "What follows from its Jones matrix", fit.derived) : null,
          fit.nullDirections.map((names) => make("p", { class: "wrong" }, names.length === 1 ? `Nothing here determines ${parameterTitle(names[0] ?? "")}.` : `Only a combination of these is determined: ${names.map(parameterTitle).join(", ")}.`)),
          fit.equivalents.length > 0
            ? fold(
                "equivalents",
                "Other numbers for the same element",
                make("ul", { class: "plain" }, fit.equivalents.map((each) => make("li", null, each.map(({ name, value }) => `${parameterTitle(name)} ${fixed(value, 2)}${name.includes("Deg") ? "°" : ""}`).join(", ")))),
              )
            : null,
        ),
        make(
          "div",
          null,
          make("h3", null, "Measured less fitted ", make("span", { class: "unit" }, noisy ? "in σ" : "in units of their root mean square")),
          colouredCells("Residuals", fit.residuals, { full: largest, write: (value) => fixed(value, 1) }),
          make("p", { class: "fine" }, "Blue: measured above fitted; orange: below."),
        ),
      ),
      make(
        "p",
        { class: "row" },
        make("button", { type: "button", id: "use-fit", class: "primary", onclick: () => actions.use(fit.mueller, "the step to the fitted matrix") }, "Use the fitted matrix as the measured one"),
        " ",
        make("button", { type: "button", id: "save-fit-json", onclick: () => this.save(`${stem}.json`, () => exported(contentOf(fit, title), "json")) }, "Save as JSON"),
        " ",
        make("button", { type: "button", id: "save-fit-csv", onclick: () => this.save(`${stem}.csv`, () => exported(contentOf(fit, title), "csv")) }, "Save as CSV"),
        " ",
        make("button", { type: "button", id: "save-fit-python", onclick: () => this.save(`${stem}.py`, () => this.recipe(fit)) }, "Save as Python"),
      ),
      make(
        "div",
        { class: "folds" },
        fold("fitted-matrix", "The fitted matrix", matrixTable("fitted", "Fitted matrix", fit.mueller, actions.tell)),
        fit.correlation.length > 0 ? fold("correlation", "Correlation of the parameters", correlationTable(fit)) : null,
        fold(
          "about-fit",
          "How it was fitted",
          make("p", null, "Weighted least squares (Levenberg 1944; Marquardt 1963) with analytic derivatives, from several starts; the gradient at the end is judged by its cosine with the residuals."),
          make("p", { class: "fine" }, `Here: ${fit.evaluations} evaluations, cosine ${significant(fit.gradientCosine, 2)}. ${fit.simulations > 0 ? `p from ${fit.simulations} simulations.` : ""} AIC = χ² + 2k and BIC = χ² + k ln n with known noise (here BIC ${fit.bic === null ? "not given" : significant(fit.bic, 4)}); with unknown noise from the sum of squares, corrected for few elements (Hurvich & Tsai 1989).`),
          make("p", null, "α stands for light that passes beside the element and loses its polarization, M = (1 − α) M_J + α M_J00 diag(1, 0, 0, 0), or, in series, for diag(1, 1 − α, 1 − α, 1 − α)."),
        ),
      ),
    ];
  }

  /**
   * @param {string} id
   * @param {string} title
   * @param {FitParameter[]} parameters
   */
  parameterTable(id, title, parameters) {
    const { format, tell } = this.actions;
    return make(
      "figure",
      { class: "matrix" },
      make("figcaption", null, make("span", null, title), copyButton(`copy-fit-${id}`, title, () => exported({ tables: [parametersOf(id, parameters)] }), tell)),
      make(
        "table",
        { class: "figures", "aria-label": title },
        make(
          "tbody",
          null,
          parameters.map(({ name, value, se, low, high, unit, atBound }) => {
            const suffix = UNITS[unit] ?? "";
            const interval = low !== null && high !== null ? `95 %: ${significant(low, digitsFor(low, se))}${suffix} … ${significant(high, digitsFor(high, se))}${suffix}` : atBound ? "at the end of its range" : "not determined";
            return make("tr", null, make("th", { scope: "row" }, parameterTitle(name)), make("td", { class: "number" }, se === null && !atBound ? significant(value, 4) : format({ value, se }).text, make("span", { class: "unit" }, suffix)), make("td", { class: "mute note" }, interval));
          }),
        ),
      ),
    );
  }

  /** @param {ModelFit} fit */
  recipe(fit) {
    const { request } = this.shown ?? {};
    return request ? quick.fitRecipe({ ...this.asked(request), model: fit.model }) : "";
  }

  /**
   * @param {string} name
   * @param {() => string} text
   */
  save(name, text) {
    try {
      saveFile(name, new Blob([text()], { type: "text/plain" }));
      this.actions.tell(`Saved as ${name}.`);
    } catch (error) {
      this.actions.failed(error);
    }
  }
}

/** @param {number} value */
function short(value) {
  return value >= 1e5 ? significant(value, 3) : value.toFixed(value < 100 ? 1 : 0);
}

/** @param {ModelFit} fit */
function pText({ pValue, simulations }) {
  if (pValue === null) return "";
  if (simulations > 0 && pValue <= 1.01 / (1 + simulations)) return `≤ ${significant(pValue, 1)}`;
  return pValue < 1e-6 ? "< 10⁻⁶" : significant(pValue, 2);
}

/**
 * Digits that show the second one of the standard error.
 * @param {number} value
 * @param {number | null} se
 */
function digitsFor(value, se) {
  if (!se || value === 0) return 4;
  return Math.min(12, Math.max(2, Math.floor(Math.log10(Math.abs(value))) - Math.floor(Math.log10(se)) + 2));
}

/**
 * @param {string} name
 * @param {FitParameter[]} parameters
 */
function parametersOf(name, parameters) {
  /** @param {string} title @param {(parameter: FitParameter) => string | number | null} value */
  const column = (title, value) => ({ name: title, values: parameters.map(value) });
  return {
    name,
    columns: [
      column("parameter", (each) => each.name),
      column("value", (each) => each.value),
      column("standard uncertainty", (each) => each.se),
      column("95 % low", (each) => each.low),
      column("95 % high", (each) => each.high),
      column("unit", (each) => each.unit),
    ],
  };
}

/**
 * @param {ModelFit} fit
 * @param {string} title
 */
function contentOf(fit, title) {
  const facts = [
    ["parameters", fit.parameterCount],
    ["chi squared", fit.chiSquare],
    ["degrees of freedom", fit.degreesOfFreedom],
    ["p", fit.pValue],
    ["AIC", fit.aic],
    ["BIC", fit.bic],
  ];
  return {
    title,
    notes: [`Halfshade ${quick.engineInfo().version}; model ${fit.model}${fit.side ? `, depolarization ${fit.side}` : ""}`, ...fit.remarks],
    matrices: [
      { name: "fitted", mueller: fit.mueller },
      { name: "residuals", mueller: fit.residuals },
    ],
    tables: [
      parametersOf("parameters", fit.parameters),
      ...(fit.derived.length > 0 ? [parametersOf("derived", fit.derived)] : []),
      { name: "fit", columns: [{ name: "quantity", values: facts.map(([name]) => name ?? "") }, { name: "value", values: facts.map(([, value]) => value ?? null) }] },
    ],
  };
}

/** @param {ModelFit} fit */
function correlationTable({ correlation, parameters }) {
  return make(
    "div",
    { class: "scroll", tabindex: "0", role: "region", "aria-label": "Correlation of the parameters" },
    make(
      "table",
      { class: "data" },
      make("thead", null, make("tr", null, make("td", null), parameters.map((_, k) => make("th", { scope: "col" }, String(k + 1))))),
      make(
        "tbody",
        null,
        correlation.map((row, i) =>
          make("tr", null, make("th", { scope: "row" }, `${i + 1} ${parameterTitle(parameters[i]?.name ?? "")}`), row.map((value) => make("td", { class: value !== null && Math.abs(value) > 0.9 && Math.abs(value) < 1 ? "number strong" : "number" }, value === null ? "" : fixed(value, 2)))),
        ),
      ),
    ),
  );
}
