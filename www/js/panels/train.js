/** The Optical train task: follow the light, fit what is unknown, take known optics away. */
import { choice, make, repaint } from "../dom.js";
import { quick } from "../engine.js";
import { fixed, fullText, readNumber } from "../format.js";
import { copyButton } from "../matrix-view.js";
import { DRAWINGS, Plot } from "../plots.js";
import { AIR, SOURCES, TRAIN_BLOCKS, blocksOf, exportedTrain, isSame, trainIn, trainWorkOf } from "../train.js";
import { paintLight } from "./train-light.js";
import { TrainList } from "./train-list.js";
import { FitPanel, RemovalPanel, measuredOf } from "./train-results.js";

/**
 * @typedef {import("../types.js").Shown} Shown
 * @typedef {import("../train.js").TrainWork} TrainWork
 * @typedef {import("../tasks.js").TaskActions} TaskActions
 */

export class TrainPanel {
  /**
   * @param {HTMLElement} root
   * @param {TaskActions} actions
   */
  constructor(root, actions) {
    this.actions = actions;
    /** @type {Shown | null} */
    this.shown = null;
    /** @type {TrainWork | null} */
    this.work = null;
    /** @type {unknown} */
    this.blocks = null;
    const change = (/** @type {string} */ name, /** @type {TrainWork} */ work, /** @type {string | undefined} */ merge = undefined) => this.change(name, work, merge);
    const results = {
      change,
      use: (/** @type {number[]} */ mueller, /** @type {string} */ name, /** @type {Partial<import("../types.js").Measurement>} */ part, /** @type {TrainWork} */ work) => actions.use(mueller, name, part, plainBlocks(work)),
      tell: actions.tell,
      failed: actions.failed,
      format: actions.format,
    };
    this.head = make("div", { class: "verdict" });
    this.list = new TrainList({ change, tell: actions.tell, measured: () => (this.shown?.request && !this.shown.stale ? measuredOf(this.shown.request) : null) });
    this.transfer = make("p", { class: "row tools" });
    this.source = this.sourceChoice();
    this.light = make("div", { id: "train-light" });
    this.path = new Plot({ name: "train-path", drawing: /** @type {import("../plots.js").Drawing} */ (DRAWINGS["sphere"]), maxWidth: 380, title: "Path on the Poincaré sphere", failed: actions.failed, tell: actions.tell });
    this.azimuth = this.slider("azimuth", -180, 180, "azimuthDeg");
    this.elevation = this.slider("elevation", -90, 90, "elevationDeg");
    this.path.canvas.after(make("div", { class: "turn", role: "group", "aria-label": "Turn the sphere of the path" }, this.azimuth.row, this.elevation.row));
    this.lightSection = make("section", { "aria-labelledby": "train-light-heading" }, make("h2", { id: "train-light-heading" }, "Follow the light"), this.source.element, this.light, make("h3", null, "The path on the Poincaré sphere"), this.path.element);
    this.fit = new FitPanel(results);
    this.removal = new RemovalPanel(results);
    this.body = make("div", null, this.list.element, this.transfer, this.lightSection, this.fit.element, this.removal.element);
    root.append(this.head, this.body);
  }

  clear() {
    if (!this.shown) return;
    this.shown = null;
    repaint(this.head);
    this.path.show(null);
    this.fit.stop();
    this.removal.stop();
  }

  /** @param {Shown} shown */
  show(shown) {
    const isNew = this.shown === null;
    this.shown = shown;
    const { work: all, request, stale } = shown;
    if (isNew || this.blocks !== all.blocks || !this.work) {
      this.blocks = all.blocks;
      this.work = trainWorkOf(all.blocks);
    }
    const { work } = this;
    const isEmpty = work.train.length === 0;
    const { loadTrainExample, tell } = this.actions;
    repaint(
      this.head,
      make("p", { class: "kicker" }, "Which optics does the light meet?"),
      make("h1", { id: "task-heading", tabindex: "-1" }, "Optical train"),
      make("p", null, "Light meets the elements in the order of the list. What is known is fixed, what is not is free, and follows from a measured matrix."),
      isEmpty ? make("p", null, "Add the first element, paste a train as JSON, or ", make("button", { type: "button", id: "train-example", class: "inline", onclick: loadTrainExample }, "load the invented example"), ": a kelp film behind a fogged window and in front of a mirror.") : null,
    );
    const { followed, source, refused } = this.follow(work, all.measurement.convention);
    this.list.show(work, refused);
    repaint(
      this.transfer,
      isEmpty ? null : [make("span", { class: "fine" }, "The train as JSON"), copyButton("train-export", "the train as JSON", () => exportedTrain(work), tell), make("span", { class: "fine" }, "Such a text pasted here replaces it."), make("button", { type: "button", id: "train-example", class: "small", onclick: loadTrainExample }, "Load the invented example")],
    );
    this.lightSection.hidden = isEmpty;
    this.fit.element.hidden = isEmpty;
    this.removal.element.hidden = isEmpty;
    if (isEmpty) return;
    this.source.show(work, refused?.at === "source" ? refused.message : "");
    this.azimuth.set(shown.view.azimuthDeg);
    this.elevation.set(shown.view.elevationDeg);
    if (followed && source) {
      paintLight(this.light, { source, followed, train: work.train, convention: all.measurement.convention }, tell);
      const { azimuthDeg, elevationDeg } = shown.view;
      const path = pathOf(work.train, [source, ...followed.states]);
      this.path.show({ mueller: AIR, convention: all.measurement.convention, azimuthDeg, elevationDeg, path });
    } else {
      this.path.show(null);
      repaint(this.light, make("p", { class: "wrong" }, `The light cannot be followed. ${refused?.message ?? ""}`));
    }
    const measured = stale ? null : request;
    this.fit.show(work, measured, followed !== null);
    this.removal.show(work, followed ? measured : null, all.measurement.label);
  }

  /**
   * @param {TrainWork} work
   * @param {import("../types.js").Convention} convention
   */
  follow({ train, source }, convention) {
    try {
      // The source itself, through a rotator that does not rotate.
      const [first] = quick.follow({ source, train: [{ kind: "rotator", parameters: { angleDeg: { value: 0 } } }], convention }).states;
      return { followed: quick.follow({ source, train, convention }), source: first ?? null, refused: null };
    } catch (error) {
      const { message, at } = /** @type {{ message: string, at?: { field?: string } }} */ (error);
      const field = at?.field ?? "";
      const [, element, parameter] = /^train\[(\d+)\](?:\.parameters\.(\w+)|\.measurement)?/.exec(field) ?? [];
      const inner = parameter ? `.${parameter}` : /^train\[\d+\]\.measurement/.test(field) ? ".measurement" : "";
      return { followed: null, source: null, refused: { at: element === undefined ? field : `${element}${inner}`, message } };
    }
  }

  /**
   * @param {string} word
   * @param {number} low
   * @param {number} high
   * @param {"azimuthDeg" | "elevationDeg"} field
   */
  slider(word, low, high, field) {
    const id = `train-turn-${word}`;
    const input = make("input", { type: "range", id, min: low, max: high, step: 1 });
    const output = make("span", { class: "number degrees" });
    input.addEventListener("input", () => this.actions.view({ [field]: Number(input.value) }));
    return {
      row: make("div", { class: "slider" }, make("label", { for: id }, word), input, output),
      /** @param {number} value */
      set(value) {
        input.value = String(Math.round(value));
        output.textContent = `${fixed(value, 0)}°`;
      },
    };
  }

  sourceChoice() {
    const names = ["S0", "S1", "S2", "S3"];
    const wrong = make("p", { id: "train-source-error", class: "wrong fine", hidden: true });
    const choices = make("span", null);
    const inputs = names.map((name, k) => {
      const input = make("input", { type: "text", id: `train-source-${k}`, class: "sigma", inputmode: "decimal", autocomplete: "off", spellcheck: "false", "aria-label": `${name} of the source`, "aria-describedby": wrong.id });
      input.addEventListener("input", () => {
        if (!this.work) return;
        const key = `source.${k}`;
        const { [key]: _, ...typed } = this.work.typed;
        const read = readNumber(input.value);
        const source = /** @type {import("../train.js").Four} */ (this.work.source.map((value, index) => (index === k && read.error === null ? read.value : value)));
        this.change("the change of the source", { ...this.work, source, typed: read.error === null ? typed : { ...typed, [key]: input.value } }, input.id);
      });
      return input;
    });
    return {
      element: make("div", null, make("p", { class: "source" }, make("span", null, "Source"), choices, inputs.map((input, k) => make("label", { class: "fine" }, names[k] ?? "", " ", input))), wrong),
      /** @param {TrainWork} work @param {string} refused */
      show: (work, refused) => {
        const chosen = SOURCES.find(([, , stokes]) => isSame(stokes, work.source))?.[0] ?? "";
        const options = SOURCES.map(([name, label]) => /** @type {[string, string]} */ ([name, label]));
        if (chosen === "") options.unshift(["", "as typed"]);
        repaint(
          choices,
          choice({
            id: "train-source",
            label: "Source",
            value: chosen,
            options,
            change: (name) => {
              const stokes = SOURCES.find(([one]) => one === name)?.[2];
              const typed = Object.fromEntries(Object.entries(work.typed).filter(([key]) => !key.startsWith("source.")));
              if (stokes) this.change("the choice of the source", { ...work, source: stokes, typed });
            },
          }),
        );
        inputs.forEach((input, k) => {
          const kept = work.typed[`source.${k}`];
          const now = kept ?? fullText(work.source[k] ?? 0);
          if (input !== document.activeElement && input.value !== now && (kept !== undefined || readNumber(input.value).value !== work.source[k])) input.value = now;
          input.setAttribute("aria-invalid", String(kept !== undefined || refused !== ""));
        });
        const [, unread] = Object.entries(work.typed).find(([key]) => key.startsWith("source.")) ?? [];
        const said = unread !== undefined ? `${readNumber(unread).error ?? ""} The last number is still used.` : refused;
        wrong.textContent = said;
        wrong.hidden = said === "";
      },
    };
  }

  /**
   * A train as JSON, pasted or dropped anywhere.
   * @param {string} text
   */
  paste(text) {
    const blocks = trainIn(text);
    if (!blocks) return false;
    try {
      const read = quick.decodeFile(JSON.stringify({ v: 1, ...blocks }));
      const nothing = Object.fromEntries(TRAIN_BLOCKS.map((block) => [block, undefined]));
      this.actions.change("the paste of a train", { ...nothing, ...Object.fromEntries(TRAIN_BLOCKS.map((block) => [block, read[block]])) });
      const count = read.train?.length ?? 0;
      this.actions.tell(`Read a train of ${count} ${count === 1 ? "element" : "elements"}.`);
    } catch (error) {
      this.actions.failed(error);
    }
    return true;
  }

  /**
   * @param {string} name
   * @param {TrainWork} work
   * @param {string} [merge]
   */
  change(name, work, merge) {
    this.actions.change(name, plainBlocks(work), merge);
  }
}

/**
 * The states that have light, relative to it, up to where none is left. An element out of
 * the beam repeats its place, so that the numbers stay those of the list.
 * @param {import("../train.js").TrainElement[]} train
 * @param {{ stokes: number[], degree: number | null }[]} states
 */
function pathOf(train, states) {
  const end = states.findIndex(({ degree }) => degree === null);
  const lit = end < 0 ? states.slice(0, train.length + 1) : states.slice(0, end);
  return lit.map(({ stokes: [s0 = 1, s1 = 0, s2 = 0, s3 = 0] }) => [s1 / s0, s2 / s0, s3 / s0]);
}

/**
 * The blocks as a link holds them: without members that say nothing.
 * @param {TrainWork} work
 */
function plainBlocks(work) {
  return Object.fromEntries(Object.entries(blocksOf(work)).map(([block, value]) => [block, value === undefined ? undefined : JSON.parse(JSON.stringify(value))]));
}
