/** How sure a fitted parameter is: the profile of χ² over it, and simulated measurements. */
import { make, repaint } from "../dom.js";
import { ask, cancel, isDropped } from "../engine.js";
import { exported } from "../exports.js";
import { significant } from "../format.js";
import { MODELS, UNITS, parameterTitle } from "../models.js";
import { DRAWINGS, Plot } from "../plots.js";

/**
 * @typedef {{ request: import("../../halfshade.js").FitRequest, fit: import("../../halfshade.js").ModelFit }} Given
 */

/** Of whose certainty people ask. */
const PROFILED = ["alpha", "retardanceDeg", "diattenuation"];
/** Samples in one request to the worker, and all of them. */
const SLICE = 50;
const SAMPLES = 500;
const CHANNEL = "doubt";

export class DoubtPanel {
  /** @param {import("../tasks.js").TaskActions} actions */
  constructor(actions) {
    this.actions = actions;
    this.buttons = make("p", { class: "row" });
    this.said = make("p", { id: "profile-said" });
    this.plot = new Plot({
      name: "profile",
      drawing: /** @type {import("../plots.js").Drawing} */ (DRAWINGS["curves"]),
      maxWidth: 640,
      title: "Profile of χ²",
      failed: actions.failed,
      tell: actions.tell,
    });
    this.samples = make("div", { id: "samples" });
    this.element = make("div", { class: "doubt" }, make("h2", null, "How sure are the parameters?"), this.buttons, this.said, this.plot.element, this.samples);
    /** @type {Given | null} */
    this.given = null;
    this.key = "";
  }

  /** @param {Given | null} given */
  show(given) {
    const names = given ? [...given.fit.parameters, ...given.fit.derived].filter(({ name, se }) => PROFILED.includes(name) && se !== null).map(({ name }) => name) : [];
    this.element.hidden = names.length === 0;
    this.given = given;
    const key = JSON.stringify([given?.request, given?.fit.model, given?.fit.side]);
    if (key === this.key) return;
    this.key = key;
    cancel(CHANNEL);
    this.plot.show(null);
    repaint(this.said);
    repaint(this.samples);
    repaint(
      this.buttons,
      [...new Set(names)].map((name) => [make("button", { type: "button", id: `profile-${name}`, onclick: () => void this.profile(name) }, `Profile of ${parameterTitle(name)}`), " "]),
      make("button", { type: "button", id: "bootstrap", onclick: () => void this.bootstrap() }, `Simulate ${SAMPLES} measurements of the fit`),
    );
  }

  /** @returns {{ asked: import("../../halfshade.js").RecipeRequest, key: string } | null} */
  get question() {
    if (!this.given) return null;
    const { models, ...request } = this.given.request;
    return { asked: { ...request, model: this.given.fit.model }, key: this.key };
  }

  /** @param {string} parameter */
  async profile(parameter) {
    const { question } = this;
    if (!question) return;
    try {
      const found = await ask("profile", [{ ...question.asked, parameter }], { channel: CHANNEL });
      if (this.key !== question.key) return;
      const unit = UNITS[found.unit] ?? "";
      const title = parameterTitle(parameter);
      const ends = [found.low, found.high].map((end) => (end === null ? null : `${significant(end, 5)}${unit}`));
      const words = ends[0] && ends[1] ? `from ${ends[0]} to ${ends[1]}` : ends[0] ? `above ${ends[0]}, without an upper end` : ends[1] ? `below ${ends[1]}, without a lower end` : "without an end on either side";
      repaint(this.said, `χ² rises by 3.84, the end of 95 %, ${words}: all other parameters fitted again at each value. Where the curve is no parabola, this interval is to be preferred to the standard error.`);
      this.actions.tell(`Profile of ${title}: ${words}.`);
      const near = found.rises.map((rise, k) => /** @type {const} */ ([found.values[k] ?? 0, rise])).filter(([, rise]) => rise < 16);
      this.plot.show(
        {
          title: `Profile of χ² over ${title}`,
          along: `${title}${unit ? `, ${unit}` : ""}`,
          upwards: "χ² less its minimum",
          curves: [{ x: near.map(([x]) => x), y: near.map(([, y]) => y) }],
          levels: [{ name: "95 %", value: 3.841458820694124 }],
          places: [found.low, found.high].flatMap((end) => (end === null ? [] : [{ name: "", value: end }])),
        },
        make(
          "table",
          { class: "data" },
          make("thead", null, make("tr", null, make("th", { scope: "col" }, title), make("th", { scope: "col" }, "χ² less its minimum"))),
          make("tbody", null, found.values.map((value, k) => make("tr", null, make("td", { class: "number" }, significant(value, 6)), make("td", { class: "number" }, significant(found.rises[k] ?? 0, 4))))),
        ),
        () => exported({ tables: [{ name: "profile", columns: [{ name: parameter, values: found.values }, { name: "rise of chi squared", values: found.rises }] }] }),
      );
    } catch (error) {
      if (!isDropped(error)) this.actions.failed(error);
    }
  }

  async bootstrap() {
    const { question } = this;
    if (!question) return;
    const bar = make("progress", { max: String(SAMPLES), value: "0", "aria-label": "Simulating" });
    const count = make("span", null, "0");
    repaint(this.samples, make("p", null, bar, " ", count, ` of ${SAMPLES} `, make("button", { type: "button", id: "stop-bootstrap", class: "inline", onclick: () => cancel(CHANNEL) }, "Stop")));
    document.getElementById("stop-bootstrap")?.focus({ preventScroll: true });
    /** @type {Map<string, { unit: string, values: number[] }>} */
    const all = new Map();
    let done = 0;
    try {
      while (done < SAMPLES && this.key === question.key) {
        const found = await ask("bootstrap", [{ ...question.asked, first: done, count: SLICE }], { channel: CHANNEL });
        if (this.key !== question.key) return;
        for (const { name, unit, values } of found.samples) {
          const before = all.get(name) ?? { unit, values: [] };
          before.values.push(...values.filter((value) => value !== null));
          all.set(name, before);
        }
        done += SLICE;
        bar.value = done;
        count.textContent = String(done);
      }
    } catch (error) {
      if (!isDropped(error)) this.actions.failed(error);
    }
    if (this.key !== question.key) return;
    this.list(all, done);
  }

  /**
   * @param {Map<string, { unit: string, values: number[] }>} all
   * @param {number} done
   */
  list(all, done) {
    if (done === 0) {
      repaint(this.samples, make("p", { class: "fine" }, "Stopped before the first sample."));
      return;
    }
    const rows = [...all].map(([name, { unit, values }]) => {
      const sorted = [...values].sort((a, b) => a - b);
      const at = (/** @type {number} */ share) => sorted[Math.min(sorted.length - 1, Math.round(share * (sorted.length - 1)))] ?? 0;
      return { name, unit, median: at(0.5), low: at(0.025), high: at(0.975) };
    });
    this.actions.tell(`${done} measurements simulated.`);
    repaint(
      this.samples,
      make("p", { id: "samples-heading", tabindex: "-1" }, `${done} simulated measurements of the fitted ${(MODELS[this.given?.fit.model ?? ""]?.title ?? "model").toLowerCase()}, each fitted again (parametric bootstrap, Efron 1979):`),
      make(
        "table",
        { class: "data" },
        make("thead", null, make("tr", null, ["parameter", "median", "central 95 %"].map((text) => make("th", { scope: "col" }, text)))),
        make(
          "tbody",
          null,
          rows.map(({ name, unit, median, low, high }) => make("tr", null, make("th", { scope: "row" }, parameterTitle(name)), make("td", { class: "number" }, significant(median, 5), make("span", { class: "unit" }, UNITS[unit] ?? "")), make("td", { class: "number" }, `${significant(low, 5)} … ${significant(high, 5)}`))),
        ),
      ),
    );
    document.getElementById("samples-heading")?.focus({ preventScroll: true });
  }
}
