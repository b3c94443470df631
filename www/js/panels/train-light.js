/** What a train does to one state of light, element by element. */
import { make, repaint } from "../dom.js";
import { exported } from "../exports.js";
import { fixed, significant } from "../format.js";
import { copyButton, matrixTable } from "../matrix-view.js";
import { titleOf } from "../train.js";

/**
 * @typedef {import("../../halfshade.js").Followed} Followed
 * @typedef {Followed["states"][number]} State
 * @typedef {import("../types.js").Convention} Convention
 * @typedef {import("../train.js").TrainElement} TrainElement
 */

const SVG = "http://www.w3.org/2000/svg";
/** Half of a picture's side, and the radius of its ring. */
const HALF = 32;
const RING = 26;

/**
 * @param {HTMLElement} root
 * @param {{ source: State, followed: Followed, train: TrainElement[], convention: Convention }} light
 * @param {(message: string) => void} tell
 */
export function paintLight(root, { source, followed, train, convention }, tell) {
  const names = ["the source", ...train.map((element, k) => `${k + 1} ${titleOf(element)}`)];
  const states = [source, ...followed.states];
  const isOff = (/** @type {number} */ k) => k > 0 && train[k - 1]?.disabled === true;
  /** @param {number | null} value @param {number} digits @param {string} unit */
  const cell = (value, digits, unit) => make("td", { class: "number" }, value === null ? "none" : `${fixed(value, digits)}${unit}`);
  repaint(
    root,
    make(
      "ul",
      { id: "train-ellipses", class: "ellipses" },
      states.map((state, k) => (isOff(k) ? null : make("li", null, ellipse(state, convention), make("span", { class: "fine" }, k === 0 ? "source" : (names[k] ?? ""))))),
    ),
    make("p", { class: "fine" }, "Seen facing the source. The ring is fully polarized light; the shorter the ellipse in it, the smaller the degree of polarization. The arrow shows the sense of rotation."),
    make(
      "div",
      { class: "scroll", tabindex: "0", role: "region", "aria-label": "The state after every element" },
      make(
        "table",
        { id: "train-states", class: "data states" },
        make("thead", null, make("tr", null, ["after", "power", "degree", "azimuth", "ellipticity", "S1/S0", "S2/S0", "S3/S0"].map((title) => make("th", { scope: "col" }, title)))),
        make(
          "tbody",
          null,
          states.map((state, k) => {
            const [s0] = state.stokes;
            return make(
              "tr",
              null,
              make("th", { scope: "row" }, names[k] ?? "", isOff(k) ? make("span", { class: "mute" }, " (out of the beam)") : null),
              make("td", { class: "number" }, significant(state.power, 4)),
              cell(state.degree, 4, ""),
              cell(state.azimuthDeg, 2, "°"),
              cell(state.ellipticityDeg, 2, "°"),
              state.stokes.slice(1).map((value) => cell(s0 > 0 ? value / s0 : null, 4, "")),
            );
          }),
        ),
      ),
    ),
    copyButton("copy-train-states", "the states", () => exported({ tables: [statesTable(names, states)] }), tell),
    followed.notes.length > 0 ? [make("h3", null, "What happens where"), make("ul", { id: "train-notes", class: "plain" }, followed.notes.map((note) => make("li", null, note.message)))] : null,
    make("h3", null, "The whole train"),
    make("div", { class: "matrices" }, matrixTable("train-total", "Matrix of the whole train", followed.mueller, tell)),
  );
}

/**
 * @param {string[]} names
 * @param {State[]} states
 * @returns {import("../../halfshade.js").ExportTable}
 */
function statesTable(names, states) {
  const stokes = [0, 1, 2, 3].map((part) => ({ name: `S${part}`, values: states.map((state) => state.stokes[part] ?? null) }));
  return {
    name: "states",
    columns: [
      { name: "after", values: names },
      { name: "power", values: states.map((state) => state.power) },
      { name: "degree", values: states.map((state) => state.degree) },
      { name: "azimuth", unit: "deg", values: states.map((state) => state.azimuthDeg) },
      { name: "ellipticity", unit: "deg", values: states.map((state) => state.ellipticityDeg) },
      ...stokes,
    ],
  };
}

/**
 * The ellipse of a state, as seen facing the source.
 * @param {State} state
 * @param {Convention} convention
 */
function ellipse({ degree, azimuthDeg, ellipticityDeg }, convention) {
  const picture = svg("svg", { viewBox: `${-HALF} ${-HALF} ${2 * HALF} ${2 * HALF}`, width: 2 * HALF, height: 2 * HALF, "aria-hidden": "true" });
  picture.append(svg("circle", { r: RING, class: "ring" }));
  if (degree === null || degree <= 0.005 || ellipticityDeg === null) {
    picture.append(svg("circle", { r: 2, class: "dot" }));
    return picture;
  }
  // On the screen y points down, and angles count clockwise.
  const counted = convention.angles === "counterclockwise" ? -(azimuthDeg ?? 0) : (azimuthDeg ?? 0);
  const turn = convention.zeroAngle === "y" ? counted - 90 : counted;
  const angle = (ellipticityDeg * Math.PI) / 180;
  const [long, short] = [RING * degree * Math.cos(angle), RING * degree * Math.abs(Math.sin(angle))];
  const group = svg("g", { transform: `rotate(${turn.toFixed(3)})` });
  // A circle has no azimuth, and needs none.
  group.append(svg("ellipse", { rx: long.toFixed(3), ry: Math.max(short, 0.01).toFixed(3), class: "state" }));
  if (short > 1.5) {
    const isClockwise = ellipticityDeg > 0 === (convention.positiveS3 === "clockwise");
    // At the upper side of the ellipse, clockwise is to the right.
    const way = isClockwise ? 1 : -1;
    const size = Math.min(5, short);
    group.append(svg("path", { d: `M ${-way * size} ${-short - size * 0.8} L ${way * size} ${-short} L ${-way * size} ${-short + size * 0.8} Z`, class: "arrow" }));
  }
  picture.append(group);
  return picture;
}

/**
 * @param {string} tag
 * @param {{ [name: string]: string | number }} attributes
 */
function svg(tag, attributes) {
  const element = document.createElementNS(SVG, tag);
  for (const [name, value] of Object.entries(attributes)) element.setAttribute(name, String(value));
  return element;
}
