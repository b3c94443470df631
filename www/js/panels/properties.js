/** The Properties task: what the element does to light, each figure with its uncertainty. */
import { DEFINITIONS, GROUPS, METHODS } from "../definitions.js";
import { fold, make, repaint, sentence } from "../dom.js";
import { RETARDANCE_UNIT, retardanceIn } from "../display.js";
import { exported, figuresTable } from "../exports.js";
import { elementName, fixed, readNumber, significant } from "../format.js";
import { quick } from "../engine.js";
import { copyButton, matrixTable } from "../matrix-view.js";
import { DRAWINGS, Plot } from "../plots.js";
import { figureText, summaryOf, verdictOf, intervalText } from "../words.js";
import { definitionNodes } from "./definition.js";

/**
 * @typedef {import("../types.js").Shown} Shown
 * @typedef {import("../types.js").Examination} Examination
 * @typedef {import("../types.js").Figure} Figure
 * @typedef {import("../types.js").Polar} Polar
 *
 * @typedef {object} PropertiesActions
 * @property {(view: Partial<import("../types.js").View>) => void} view
 * @property {(message: string) => void} tell
 * @property {(error: unknown) => void} failed
 * @property {import("../types.js").FormatValue} format
 */

/** Named views of the sphere: azimuth and elevation of what faces the reader. @type {[string, number, number][]} */
const VIEWS = [
  ["Oblique", 30, 20],
  ["S1 in front", 0, 0],
  ["S2 in front", 90, 0],
  ["S3 on top", 0, 90],
];

/** Reasons that hold for the whole table are said once, above it. */
const GENERAL = [/^no noise was stated/, /^no draws were asked/, /^a first-order standard error/];

export class PropertiesPanel {
  /**
   * @param {HTMLElement} root
   * @param {PropertiesActions} actions
   */
  constructor(root, actions) {
    this.actions = actions;
    /** @type {Set<string>} */
    this.open = new Set();
    /** @type {Shown | null} */
    this.shown = null;
    this.sphere = new Plot({ name: "sphere", drawing: /** @type {import("../plots.js").Drawing} */ (DRAWINGS["sphere"]), maxWidth: 380, title: "Poincaré sphere", failed: actions.failed, tell: actions.tell });
    this.ellipses = new Plot({ name: "ellipses", drawing: /** @type {import("../plots.js").Drawing} */ (DRAWINGS["ellipses"]), maxWidth: 900, title: "Polarization ellipses", failed: actions.failed, tell: actions.tell });
    this.head = make("div", { class: "verdict" });
    this.figures = make("div", { id: "figures" });
    this.below = make("div", null);
    this.azimuth = this.slider("azimuth", -180, 180, "azimuthDeg");
    this.elevation = this.slider("elevation", -90, 90, "elevationDeg");
    /** @type {import("../types.js").MappedState[]} */
    this.mapped = [];
    /** The input whose fate is told in words. */
    this.state = 0;
    /** The one under the pointer, which goes before it. @type {number | null} */
    this.pointed = null;
    this.stateChoice = make("select", { id: "state", class: "inline", "aria-label": "Input state" });
    this.stateChoice.addEventListener("change", () => {
      this.state = this.stateChoice.selectedIndex;
      this.readOut();
    });
    this.stateText = make("span", { id: "state-text" });
    this.turnable(this.sphere.canvas);
    this.sphere.canvas.after(
      make(
        "div",
        { class: "turn", role: "group", "aria-label": "Turn the sphere" },
        make("p", { id: "state-words", class: "fine" }, this.stateChoice, " ", this.stateText),
        this.azimuth.row,
        this.elevation.row,
        make(
          "span",
          { class: "tools" },
          VIEWS.map(([name, azimuthDeg, elevationDeg]) => make("button", { type: "button", class: "small", onclick: () => actions.view({ azimuthDeg, elevationDeg }) }, name)),
        ),
      ),
    );
    this.body = make(
      "div",
      { class: "properties-body" },
      make("div", { class: "columns wide-left" }, this.figures, make("div", null, make("h2", null, "Poincaré sphere"), this.sphere.element)),
      make("h2", null, "Six inputs and what each becomes"),
      this.ellipses.element,
      this.below,
    );
    root.append(this.head, this.body);
  }

  clear() {
    this.shown = null;
    this.body.hidden = true;
    repaint(this.head);
    this.sphere.show(null);
    this.ellipses.show(null);
  }

  /** @param {Shown} shown */
  show(shown) {
    const before = this.shown;
    this.shown = shown;
    const { result, request, pending, view } = shown;
    // A drag asks for this many times a second.
    if (before && isOnlyTurned(before, shown)) {
      this.turn(view);
      return;
    }
    this.body.hidden = !result;
    if (!result || !request) {
      this.clear();
      return;
    }
    const { format } = this.actions;
    const verdict = verdictOf(result, request, pending, format);
    const summary = summaryOf(result, format);
    repaint(
      this.head,
      make("p", { class: "kicker" }, "What does it do to light?"),
      make("h1", { id: "task-heading", tabindex: "-1" }, "Properties"),
      summary.length > 0 ? make("p", null, sentence(summary)) : null,
      make("p", { class: "fine" }, `Realizability: ${verdict.title}. Figures marked “nearest” are of the nearest realizable matrix, all others of the measured one.`),
    );
    this.paintFigures(result, request.noise.kind !== "none", pending);
    const { mueller, convention } = request;
    this.mapped = quick.mapStates({ mueller, convention });
    this.stateChoice.replaceChildren(...this.mapped.map(({ label }) => make("option", null, label)));
    this.turn(view);
    this.sphere.show(this.sphere.data, this.states(), () => statesAsText(request));
    this.ellipses.show({ mueller, convention }, this.states(), () => statesAsText(request));
    this.readOut();
    repaint(this.below, this.decompositions(result));
  }

  /**
   * Show the sphere from this side.
   * @param {import("../types.js").View} view
   */
  turn({ azimuthDeg, elevationDeg }) {
    this.azimuth.set(azimuthDeg);
    this.elevation.set(elevationDeg);
    const request = this.shown?.request;
    if (request) this.sphere.change({ mueller: request.mueller, convention: request.convention, azimuthDeg, elevationDeg });
  }

  /** The chosen input in words, and what becomes of it; both ringed on the sphere. */
  readOut() {
    const told = this.pointed ?? this.state;
    const state = this.mapped[told];
    if (!state) return;
    this.stateChoice.selectedIndex = told;
    this.stateText.replaceChildren(stateText(state.input), make("br", null), state.output.degree === null ? "is blocked." : `becomes ${stateText(state.output)}.`);
    this.sphere.onScreen = { chosen: state.label };
    this.sphere.request();
  }

  /**
   * The input whose mark, or whose output's, is at this place of the sphere.
   * @param {PointerEvent} event
   * @returns {number | null}
   */
  stateAt({ offsetX, offsetY, pointerType }) {
    const { data, width } = this.sphere;
    if (!data || width === 0) return null;
    const reach = pointerType === "touch" ? 24 : 12;
    const marks = quick.sphereMarks(/** @type {any} */ ({ ...data, frame: { width } }));
    const near = marks
      .flatMap(({ label, input, output }) => [input, output ?? input].map(([x, y]) => ({ label, away: Math.hypot(x - offsetX, y - offsetY) })))
      .reduce((best, mark) => (mark.away < best.away ? mark : best));
    const index = this.mapped.findIndex(({ label }) => label === near.label);
    return near.away <= reach && index >= 0 ? index : null;
  }

  /** The six inputs and what becomes of them, in numbers. */
  states() {
    const head = ["input", "S0", "S1", "S2", "S3", "degree", "azimuth", "ellipticity"];
    return make(
      "table",
      { class: "data states" },
      make("thead", null, make("tr", null, head.map((title) => make("th", { scope: "col" }, title)))),
      make(
        "tbody",
        null,
        this.mapped.map(({ label, output }) =>
          make(
            "tr",
            null,
            make("th", { scope: "row" }, label),
            output.stokes.map((value) => make("td", { class: "number" }, fixed(value, 4))),
            make("td", { class: "number" }, output.degree === null ? "none" : fixed(output.degree, 4)),
            make("td", { class: "number" }, output.azimuthDeg === null ? "none" : azimuthText(output.azimuthDeg)),
            make("td", { class: "number" }, output.ellipticityDeg === null ? "none" : `${fixed(output.ellipticityDeg, 2)}°`),
          ),
        ),
      ),
    );
  }

  /**
   * @param {Examination} result
   * @param {boolean} noisy
   * @param {boolean} pending
   */
  paintFigures(result, noisy, pending) {
    const { format, tell } = this.actions;
    const about = !noisy
      ? "No noise is stated, so no figure has an uncertainty."
      : pending
        ? "Uncertainties are being calculated…"
        : "In brackets the standard uncertainty (k = 1) of the last digits, first order; beside it the interval of 95 %. ";
    const figures = /** @type {Record<string, Figure>} */ (result.figures);
    repaint(
      this.figures,
      make("p", { class: "fine about" }, about, " ", copyButton("copy-figures", "all figures", () => exported({ tables: [figuresTable(result)] }), tell)),
      GROUPS.map((group) => [
        make("h2", null, group.title),
        make("table", { class: "figures" }, make("tbody", null, group.names.flatMap((name, index) => this.figureRows(name, figures[name], figures[group.names[index - 1] ?? ""], format)))),
      ]),
    );
  }

  /**
   * @param {string} name
   * @param {Figure | undefined} figure
   * @param {Figure | undefined} above the figure in the row above
   * @param {import("../types.js").FormatValue} format
   */
  figureRows(name, figure, above, format) {
    const definition = DEFINITIONS[name];
    if (!definition || !figure) return [];
    const id = `define-${name}`;
    const more = make("tr", { id, class: "definition" }, make("td", { colspan: "3" }, definitionNodes(name, DEFINITIONS)));
    more.hidden = !this.open.has(name);
    const toggle = make(
      "button",
      {
        type: "button",
        id: `about-${name}`,
        class: "inline name",
        "aria-expanded": String(!more.hidden),
        "aria-controls": id,
        onclick: () => {
          more.hidden = !more.hidden;
          if (more.hidden) this.open.delete(name);
          else this.open.add(name);
          toggle.setAttribute("aria-expanded", String(!more.hidden));
        },
      },
      definition.title,
    );
    const view = this.shown?.view;
    const isRetardance = name === "retardanceDeg" || name === "linearRetardanceDeg";
    const shown = isRetardance && view ? inUnit(figure, view) : figure;
    const text = figureText(shown, format);
    const unit = isRetardance && view ? RETARDANCE_UNIT[view.retardanceUnit] : definition.unit;
    const value = text === null ? make("td", { class: "number mute" }, "not determined") : make("td", { class: "number" }, text, make("span", { class: "unit" }, unit));
    return [make("tr", { class: text === null ? "undetermined" : null }, make("th", { scope: "row" }, toggle), value, make("td", { class: "mute note" }, text === null ? "" : intervalText(shown), intervalText(shown) !== "" && noteOf(name, figure, above) !== "" ? "; " : "", noteOf(name, figure, above))), more];
  }

  /** @param {Examination} result */
  decompositions({ decompositions }) {
    const { format, tell } = this.actions;
    const { polarForward, polarReverse, isotropic, spectral, characteristic, differential, reason } = decompositions;
    if (!polarForward && !polarReverse && !isotropic && spectral.length === 0) {
      return [make("h2", null, "Decompositions"), make("p", { class: "mute" }, reason ?? "Not determined.")];
    }
    return [
      make("h2", null, "Pure element with isotropic depolarization"),
      isotropic
        ? [
            make(
              "p",
              null,
              "α = ",
              make("b", { class: "number" }, figureText(isotropic.alpha, format) ?? "not determined"),
              ". Constant stray light looks exactly the same: no single matrix can tell it from depolarization. ",
              isotropic.pValue !== null && isotropic.chiSquare !== null
                ? `The fit leaves χ² = ${significant(isotropic.chiSquare, 3)} for ${isotropic.degreesOfFreedom} degrees of freedom (p = ${significant(isotropic.pValue)}): ${isotropic.pValue >= 0.05 ? "one α is enough." : "one α is not enough."}`
                : null,
              isotropic.reason && !GENERAL.some((general) => general.test(isotropic.reason ?? "")) ? ` ${capital(isotropic.reason)}.` : null,
            ),
            isotropic.mueller ? fold("isotropic-matrix", "The fitted matrix and its Jones matrix", make("div", { class: "matrices" }, matrixTable("isotropic", "Fitted matrix", isotropic.mueller, tell), isotropic.jones ? jonesTable("isotropic-jones", "Jones matrix of the pure part", isotropic.jones, tell) : null)) : null,
          ]
        : make("p", { class: "mute" }, reason ?? "Not determined."),
      make("h2", null, "Polar decompositions"),
      this.polar("forward", "Depolarizer after: light meets diattenuator, retarder, depolarizer", ["depolarizer", "retarder", "diattenuator"], polarForward, reason),
      this.polar("reverse", "Depolarizer before: light meets depolarizer, retarder, diattenuator", ["diattenuator", "retarder", "depolarizer"], polarReverse, reason),
      fold("about-polar", "What they are", definitionNodes("polar", METHODS)),
      make("h2", null, "Spectral decomposition"),
      spectral.length > 0
        ? [
            make("p", null, `A sum of ${spectral.length} pure element${spectral.length === 1 ? "" : "s"}, with the weights `, make("span", { class: "number" }, spectral.map((part) => fixed(part.weight, 4)).join(", ")), "."),
            spectral.map((part, index) =>
              fold(
                `spectral-${index}`,
                `Part ${index + 1}, weight ${fixed(part.weight, 4)}`,
                make("div", { class: "matrices" }, matrixTable(`spectral-${index}`, "Mueller matrix", part.mueller, tell), jonesTable(`spectral-${index}-jones`, "Jones matrix", part.jones, tell)),
              ),
            ),
          ]
        : make("p", { class: "mute" }, reason ?? "Not determined."),
      fold("about-spectral", "What it is", definitionNodes("spectral", METHODS)),
      make("h2", null, "Characteristic decomposition"),
      characteristic.length > 0
        ? [
            make("p", null, "A pure element, equal mixtures of two and of three, and an ideal depolarizer, with the weights ", make("span", { class: "number" }, characteristic.map((part) => fixed(part.weight, 4)).join(", ")), "."),
            fold(
              "characteristic-parts",
              "The four parts",
              make("div", { class: "matrices" }, characteristic.map((part, index) => matrixTable(`characteristic-${index}`, `${CHARACTERISTIC[index]}, weight ${fixed(part.weight, 4)}`, part.mueller, tell))),
            ),
          ]
        : make("p", { class: "mute" }, reason ?? "Not determined."),
      fold("about-characteristic", "What it is", definitionNodes("characteristic", METHODS)),
      make("h2", null, "Differential decomposition"),
      this.differential(differential, reason),
      fold("about-differential", "What it is", definitionNodes("differential", METHODS)),
    ];
  }

  /**
   * @param {import("../types.js").Differential | null} differential
   * @param {string | null} reason
   */
  differential(differential, reason) {
    const view = this.shown?.view;
    const { mean, depolarizing } = differential ?? {};
    if (!differential || !view || !mean || !depolarizing) return make("p", { class: "mute" }, `Not determined: ${differential?.reason ?? reason ?? "there is no matrix"}.`);
    const { tell } = this.actions;
    /** @param {string} name @param {number | null} birefringence @param {number | null} dichroism */
    const line = (name, birefringence, dichroism) =>
      make(
        "tr",
        null,
        make("th", { scope: "row" }, name),
        make("td", { class: "number" }, birefringence === null ? "" : fixed(retardanceIn((birefringence * 180) / Math.PI, view), view.retardanceUnit === "waves" ? 5 : 3), make("span", { class: "unit" }, RETARDANCE_UNIT[view.retardanceUnit])),
        make("td", { class: "number" }, dichroism === null ? "" : fixed(dichroism, 5)),
      );
    return [
      make(
        "table",
        { class: "data", id: "differential" },
        make("thead", null, make("tr", null, make("th", { scope: "col" }, "summed up along the path"), make("th", { scope: "col" }, "birefringence"), make("th", { scope: "col" }, "dichroism"))),
        make(
          "tbody",
          null,
          line("linear, 0° / 90°", differential.linearBirefringence, differential.linearDichroism),
          line("linear, ±45°", differential.linearBirefringence45, differential.linearDichroism45),
          line("circular", differential.circularBirefringence, differential.circularDichroism),
        ),
      ),
      copyButton("copy-differential", "birefringence and dichroism", () => exported({ tables: [differentialTable(differential)] }), tell),
      fold("differential-parts", "The two parts of the logarithm", make("div", { class: "matrices" }, matrixTable("differential-mean", "Mean part", mean, tell), matrixTable("differential-depolarizing", "Depolarizing part", depolarizing, tell))),
    ];
  }

  /**
   * @param {string} id
   * @param {string} title
   * @param {("depolarizer" | "retarder" | "diattenuator")[]} order of the factors, as they are multiplied
   * @param {Polar | null} polar
   * @param {string | null} reason
   */
  polar(id, title, order, polar, reason) {
    return fold(
      `polar-${id}`,
      title,
      polar
        ? [
            polar.reason ? make("p", { class: "fine" }, `${capital(polar.reason)}.`) : null,
            make(
              "div",
              { class: "matrices" },
              order.map((factor) => {
                const matrix = polar[factor];
                return matrix
                  ? matrixTable(`${id}-${factor}`, capital(factor), matrix, this.actions.tell)
                  : make("figure", { class: "matrix" }, make("figcaption", null, capital(factor)), make("p", { class: "mute" }, "not determined"));
              }),
            ),
            make("p", { class: "fine" }, `Their product is the nearest realizable matrix over ${elementName(0, 0)}${polar.residual === null ? "" : `, to ${significant(polar.residual, 1)}`}.`),
          ]
        : make("p", { class: "mute" }, reason ?? "Not determined."),
    );
  }

  /**
   * @param {string} name
   * @param {number} low
   * @param {number} high
   * @param {"azimuthDeg" | "elevationDeg"} key
   */
  slider(name, low, high, key) {
    const input = make("input", { type: "range", id: `view-${name}`, min: low, max: high, step: 1 });
    const field = make("input", { type: "text", inputmode: "numeric", id: `view-${name}-number`, class: "degrees", autocomplete: "off", "aria-label": `${name} in degrees` });
    input.addEventListener("input", () => this.actions.view({ [key]: Number(input.value) }));
    field.addEventListener("change", () => {
      const read = readNumber(field.value.replace("°", ""));
      if (read.error === null && read.value >= low && read.value <= high) this.actions.view({ [key]: read.value });
      else field.value = `${input.value}°`;
    });
    const row = make("span", { class: "slider" }, make("label", { for: `view-${name}` }, name), input, field);
    return {
      row,
      /** @param {number} value */
      set(value) {
        if (Number(input.value) !== Math.round(value)) input.value = String(Math.round(value));
        if (field !== document.activeElement) field.value = `${fixed(Math.round(value), 0)}°`;
      },
    };
  }

  /**
   * Drag and arrow keys, beside the sliders.
   * @param {HTMLCanvasElement} canvas
   */
  turnable(canvas) {
    canvas.tabIndex = 0;
    /** @param {number} azimuth @param {number} elevation */
    const by = (azimuth, elevation) => {
      const view = this.shown?.view;
      if (!view) return;
      const turned = ((((view.azimuthDeg + azimuth + 180) % 360) + 360) % 360) - 180;
      this.actions.view({ azimuthDeg: turned, elevationDeg: Math.max(-90, Math.min(90, view.elevationDeg + elevation)) });
    };
    /** @type {{ x: number, y: number } | null} */
    let last = null;
    let isTap = false;
    /** @param {number | null} pointed */
    const point = (pointed) => {
      if (pointed === this.pointed) return;
      this.pointed = pointed;
      canvas.classList.toggle("on-mark", pointed !== null);
      this.readOut();
    };
    canvas.addEventListener("pointerdown", (event) => {
      if (event.button !== 0) return;
      last = { x: event.clientX, y: event.clientY };
      isTap = true;
      canvas.setPointerCapture(event.pointerId);
    });
    canvas.addEventListener("pointermove", (event) => {
      if (!last) {
        point(this.stateAt(event));
        return;
      }
      // A hand is never quite still.
      if (isTap && Math.hypot(event.clientX - last.x, event.clientY - last.y) < 4) return;
      isTap = false;
      point(null);
      const scale = 180 / canvas.clientWidth;
      // The front follows the pointer. A finger turns sideways only; up and down scrolls.
      by((last.x - event.clientX) * scale, event.pointerType === "touch" ? 0 : (event.clientY - last.y) * scale);
      last = { x: event.clientX, y: event.clientY };
    });
    const end = () => {
      last = null;
      isTap = false;
    };
    canvas.addEventListener("pointerup", (event) => {
      const tapped = isTap ? this.stateAt(event) : null;
      end();
      if (tapped === null) return;
      this.state = tapped;
      this.readOut();
    });
    canvas.addEventListener("pointercancel", end);
    canvas.addEventListener("pointerleave", () => point(null));
    canvas.addEventListener("keydown", (event) => {
      const step = event.shiftKey ? 1 : 5;
      /** @type {{ [key: string]: [number, number] }} */
      const moves = { ArrowLeft: [step, 0], ArrowRight: [-step, 0], ArrowUp: [0, -step], ArrowDown: [0, step] };
      const move = moves[event.key];
      if (!move || event.ctrlKey || event.metaKey || event.altKey) return;
      event.preventDefault();
      by(...move);
    });
  }
}

/**
 * The six outputs in the form of copies.
 * @param {import("../types.js").Request} request
 */
function statesAsText({ mueller, convention }) {
  const states = quick.mapStates({ mueller, convention });
  return exported({
    tables: [
      {
        name: "states",
        columns: [
          { name: "input", values: states.map(({ label }) => label) },
          ...[0, 1, 2, 3].map((k) => ({ name: `S${k}`, values: states.map(({ output }) => output.stokes[k] ?? null) })),
          { name: "degree of polarization", values: states.map(({ output }) => output.degree) },
          { name: "azimuth", unit: "deg", values: states.map(({ output }) => output.azimuthDeg) },
          { name: "ellipticity", unit: "deg", values: states.map(({ output }) => output.ellipticityDeg) },
        ],
      },
    ],
  });
}

/** @param {import("../types.js").Differential} differential */
function differentialTable(differential) {
  return {
    name: "differential",
    columns: [
      { name: "property", values: ["linear, 0 and 90 deg", "linear, +45 and -45 deg", "circular"] },
      { name: "birefringence", unit: "rad", values: [differential.linearBirefringence, differential.linearBirefringence45, differential.circularBirefringence] },
      { name: "dichroism", values: [differential.linearDichroism, differential.linearDichroism45, differential.circularDichroism] },
    ],
  };
}

/**
 * A state in a sentence.
 * @param {import("../types.js").State} state
 */
function stateText({ stokes, degree, azimuthDeg, ellipticityDeg }) {
  const parts = [`S = (${stokes.map((value) => fixed(value, 4)).join(", ")})`];
  if (degree !== null) parts.push(`degree of polarization ${fixed(degree, 4)}`);
  if (azimuthDeg !== null) parts.push(`azimuth ${azimuthText(azimuthDeg)}`);
  if (ellipticityDeg !== null) parts.push(`ellipticity ${fixed(ellipticityDeg, 2)}°`);
  return parts.join(", ");
}

/**
 * Azimuths end where they begin: 179.999° is 0.00°, not 180.00°.
 * @param {number} degrees in [0, 180)
 */
function azimuthText(degrees) {
  return `${fixed(degrees < 179.995 ? degrees : 0, 2)}°`;
}

/**
 * Whether nothing differs but the side that the sphere is seen from.
 * @param {Shown} before
 * @param {Shown} now
 */
function isOnlyTurned(before, now) {
  /** @param {Shown} shown */
  const rest = ({ view }) => JSON.stringify({ ...view, azimuthDeg: 0, elevationDeg: 0 });
  return now.result !== null && before.result === now.result && before.request === now.request && before.pending === now.pending && rest(before) === rest(now);
}

/** The parts of the characteristic decomposition. */
const CHARACTERISTIC = ["Pure", "Mixture of two", "Mixture of three", "Ideal depolarizer"];

/**
 * A retardance and its uncertainties in the unit of the view.
 * @param {Figure} figure degrees
 * @param {import("../types.js").View} view
 * @returns {Figure}
 */
function inUnit(figure, view) {
  /** @param {number | null} deg */
  const convert = (deg) => (deg === null ? null : retardanceIn(deg, view));
  return { ...figure, value: convert(figure.value), se: convert(figure.se), low: convert(figure.low), high: convert(figure.high) };
}

/**
 * @param {string} name
 * @param {Figure} figure
 * @param {Figure | undefined} above
 */
function noteOf(name, figure, above) {
  const notes = [];
  const reason = figure.reason ?? "";
  if (reason !== "" && !GENERAL.some((general) => general.test(reason))) notes.push(reason === above?.reason ? "as above" : reason);
  if (name === "isotropicAlpha") notes.push("constant stray light would look the same");
  // Worth a word where noise is a good part of a length.
  if (figure.debiased !== null && figure.bias !== null && figure.value !== null && figure.se !== null && figure.bias > 0.2 * figure.se) {
    notes.push(figure.debiased > 0 ? `${significant(figure.debiased, 3)} without what noise adds` : "may be all noise");
  }
  if (["depolarizationIndex", "diattenuation", "polarizance"].includes(name) && figure.value !== null && figure.value > 1) {
    notes.push(figure.se !== null && figure.value - 1 < 2 * figure.se ? "above 1 within noise" : "above 1, which nothing physical reaches");
  }
  if (["rotationDeg", "circularDiattenuation", "circularPolarizance"].includes(name) && figure.value !== null && figure.se !== null && Math.abs(figure.value) < 2 * figure.se) {
    notes.push("not different from 0");
  }
  if (["retardanceDeg", "linearRetardanceDeg", "fastAxisDeg", "rotationDeg", "retarderAzimuthDeg", "retarderEllipticityDeg", "depolarizationPower", "entropy"].includes(name) && figure.value !== null) notes.push("nearest");
  return notes.join("; ");
}

/**
 * @param {string} id
 * @param {string} title
 * @param {[number, number][]} jones
 * @param {(message: string) => void} tell
 */
function jonesTable(id, title, jones, tell) {
  const text = () =>
    exported({
      tables: [
        {
          name: "jones",
          columns: [
            { name: "entry", values: ["xx", "xy", "yx", "yy"] },
            { name: "real part", values: jones.map(([real]) => real) },
            { name: "imaginary part", values: jones.map(([, imaginary]) => imaginary) },
          ],
        },
      ],
    });
  return make(
    "figure",
    { class: "matrix" },
    make("figcaption", null, make("span", null, title), copyButton(`copy-${id}`, title, text, tell)),
    make("table", { class: "numbers", "aria-label": title }, make("tbody", null, [jones.slice(0, 2), jones.slice(2, 4)].map((row) => make("tr", null, row.map(([real, imaginary]) => make("td", null, complex(real, imaginary))))))),
  );
}

/**
 * @param {number} real
 * @param {number} imaginary
 */
function complex(real, imaginary) {
  return `${fixed(real, 4).includes("e") ? "0.0000" : fixed(real, 4)} ${imaginary < 0 ? "−" : "+"} ${Math.abs(imaginary).toFixed(4)}i`;
}

/** @param {string} text */
function capital(text) {
  return text.charAt(0).toUpperCase() + text.slice(1);
}
