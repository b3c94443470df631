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
        make("p", null, "Then leave it as it is. These do not depend on it: whether the matrix is realizable, the coherency eigenvalues, the test against the noise, total diattenuation, polarizance, retardance, every measure of depolarization, and the transmittance range."),
        make("p", null, "These do:"),
        make(
          "ul",
          null,
          make("li", null, "sense of the angles: the sign of S2, of every azimuth, and of the rotation; which axis is the fast one"),
          make("li", null, "sign of S3: which circular light is meant; the sign of circular diattenuation and of ellipticities; which axis is the fast one"),
          make("li", null, "zero of the angles: every azimuth, by 90°"),
          make("li", null, "time dependence: Jones matrices become their complex conjugates"),
        ),
        make("p", null, "A known sample tells: a polarizer turned a little, and light of known handedness."),
      ),
    );
  }
}
