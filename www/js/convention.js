/** The convention of the measurement, asked by physical fact. */
import { choice, fold, make, repaint } from "./dom.js";

/** @typedef {import("./types.js").Convention} Convention */

/**
 * The convention in one line.
 * @param {Convention} convention
 * @returns {string}
 */
export function conventionInWords(convention) {
  const sense = { clockwise: "clockwise", counterclockwise: "counter-clockwise" };
  return `angles ${sense[convention.angles]} from ${convention.zeroAngle}; S3 > 0 turns ${sense[convention.positiveS3]}`;
}

/** What no answer changes. */
export const INDEPENDENT =
  "the verdict, the coherency eigenvalues, the test against the noise, diattenuation, polarizance, retardance, the transmittance range, every measure of depolarization (α among them), and the weights of the decompositions";

/** What depends on each physical fact. */
export const DEPENDENCES = [
  {
    fact: "sense of the angles",
    depends: "changes which of its two axes the fast axis of a retarder is (its azimuth moves by 90°), the signs of ellipticity and birefringence, Jones matrices; and the way round in which azimuths and rotations are meant, though their numbers stay",
  },
  {
    fact: "rotation of light with S3 > 0",
    depends: "changes the same axis, signs and Jones matrices; and which circular light the numbers about it mean. The other answer to both of these facts changes no number",
  },
  { fact: "axis of angle zero", depends: "changes no number, only from where azimuths, S1 and S2 are meant" },
  { fact: "time dependence", depends: "changes Jones matrices alone: they become their complex conjugates" },
];

/** How to find out. */
export const TELLING = "Known samples tell: a polarizer turned a little by hand shows the sense and the zero of the angles; light of known handedness, the sign of S3.";

export class ConventionPanel {
  /**
   * @param {HTMLElement} root
   * @param {(convention: Convention) => void} change
   */
  constructor(root, change) {
    this.root = root;
    this.change = change;
  }

  /** @param {Convention} convention */
  show(convention) {
    /**
     * @template {"angles" | "positiveS3" | "zeroAngle" | "time"} Key
     * @param {Key} key
     * @param {string} label
     * @param {[Convention[Key], string][]} options
     */
    const pick = (key, label, options) =>
      choice({
        id: `convention-${key}`,
        label,
        value: convention[key],
        options,
        change: (value) => this.change({ ...convention, [key]: value }),
      });
    /** @type {["counterclockwise", string]} */
    const counter = ["counterclockwise", "counter-clockwise"];
    /** @type {["clockwise", string]} */
    const clock = ["clockwise", "clockwise"];
    repaint(
      this.root,
      make("h3", null, "Convention"),
      make("p", { class: "said" }, `Facing the source: ${conventionInWords(convention)}.`),
      fold(
        "convention-fold",
        "Change it",
        make(
          "ul",
          { class: "facts" },
          make("li", null, "Someone who faces the source sees angles counted ", pick("angles", "Sense in which angles are counted", [counter, clock]), "."),
          make("li", null, "For the same observer, light whose field turns ", pick("positiveS3", "Rotation of light with positive S3", [clock, counter]), " has S3 > 0."),
          make("li", null, "The angle zero, and S1 > 0, lie along ", pick("zeroAngle", "Axis of angle zero", [["x", "x (horizontal)"], ["y", "y (vertical)"]]), "."),
          make("li", null, "Waves are written with ", pick("time", "Time dependence", [["plus", "exp(+iωt)"], ["minus", "exp(−iωt)"]]), "; this matters for Jones matrices alone."),
        ),
        make("p", { class: "fine" }, "Whoever looks along the beam sees the first two the other way round."),
      ),
      fold(
        "convention-unknown",
        "I don’t know it",
        make("p", null, `Then leave it as it is. Under every answer these stay the same: ${INDEPENDENT}.`),
        make("p", null, "The other answer about:"),
        make("ul", { class: "facts" }, DEPENDENCES.map(({ fact, depends }) => make("li", null, make("b", null, fact), ` ${depends}.`))),
        make("p", { class: "fine" }, TELLING),
      ),
    );
  }
}
