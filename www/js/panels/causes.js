/** What may have gone wrong, asked on demand, and each tried with one press. */
import { make, repaint } from "../dom.js";
import { ask, cancel, isDropped } from "../engine.js";
import { elementName, significant } from "../format.js";
import { forEngine } from "../noise.js";

/**
 * @typedef {import("../types.js").Request} Request
 * @typedef {import("../types.js").Diagnosis} Diagnosis
 * @typedef {Diagnosis["causes"][number]} Cause
 */

const CHANNEL = "diagnose";

/** The slips that no check can tell apart. @type {{ [code: string]: string }} */
const SLIPS = {
  sign: "the sign of one row or column (1, 2 or 3)",
  three: "the signs of all three of them",
  exchange: "two of them exchanged",
};

export class CausesPanel {
  /**
   * @param {{ use: (mueller: number[], name: string) => void, tell: (message: string) => void, failed: (error: unknown) => void }} actions
   */
  constructor(actions) {
    this.actions = actions;
    this.element = make("div", { id: "causes" });
    /** @type {string} */
    this.key = "";
    /** @type {Request | null} */
    this.request = null;
  }

  /**
   * @param {Request} request
   * @param {boolean} beyond whether the violation is beyond the stated noise
   */
  show(request, beyond) {
    const key = JSON.stringify(request);
    this.element.hidden = !beyond;
    if (key === this.key) return;
    this.key = key;
    this.request = request;
    cancel(CHANNEL);
    this.offer();
  }

  offer() {
    repaint(
      this.element,
      make("h2", null, "What may have gone wrong"),
      make("p", null, make("button", { type: "button", id: "look-for-causes", onclick: () => void this.look() }, "Look for causes"), make("span", { class: "fine" }, " Each usual slip is taken back in turn and tested again.")),
    );
  }

  async look() {
    const { request, key } = this;
    if (!request) return;
    const start = performance.now();
    const seconds = make("span", null, "0 s");
    const timer = setInterval(() => (seconds.textContent = `${Math.round((performance.now() - start) / 1000)} s`), 1000);
    repaint(
      this.element,
      make("h2", null, "What may have gone wrong"),
      make(
        "p",
        null,
        make("progress", { "aria-label": "Looking for causes" }),
        " Looking… ",
        seconds,
        " ",
        make("button", { type: "button", id: "stop-causes", class: "inline", onclick: () => { cancel(CHANNEL); this.offer(); } }, "Stop"),
      ),
    );
    document.getElementById("stop-causes")?.focus({ preventScroll: true });
    try {
      const found = await ask("diagnose", [forEngine(request)], { channel: CHANNEL });
      if (this.key === key) this.list(found);
    } catch (error) {
      if (!isDropped(error)) this.actions.failed(error);
    } finally {
      clearInterval(timer);
    }
  }

  /** @param {Diagnosis} found */
  list({ causes, explainingSigma, mirrorVisible }) {
    const { use, tell } = this.actions;
    tell(causes.length > 0 ? `${causes.length} possible ${causes.length === 1 ? "cause" : "causes"} found.` : "No usual slip explains it.");
    repaint(
      this.element,
      make("h2", { id: "causes-heading", tabindex: "-1" }, "What may have gone wrong"),
      causes.length > 0
        ? [
            make("p", null, "After each of these, noise is enough of an explanation. They are possibilities: no check can choose among them."),
            make(
              "ul",
              { class: "causes" },
              causes.map((cause, index) => {
                const [title, more] = inWords(cause);
                return make(
                  "li",
                  null,
                  make("b", null, title),
                  ` (p = ${significant(cause.pValue)}). `,
                  more,
                  " ",
                  make("button", { type: "button", id: `try-${index}`, class: "small", onclick: () => use(cause.mueller, `the try “${title}”`) }, "Try this"),
                );
              }),
            ),
          ]
        : make("p", null, "None of the usual slips explains it: a mirrored side, a small first element, one wrong element, a wrong factor of a row or column."),
      explainingSigma !== null ? make("p", null, "Noise alone would explain it with σ = ", make("b", { class: "number" }, significant(explainingSigma)), " for every element.") : null,
      mirrorVisible ? null : make("p", { class: "fine" }, "A side counted the other way round would not be seen here: this matrix is that of a polarizer, or nearly."),
    );
    document.getElementById("causes-heading")?.focus({ preventScroll: true });
  }
}

/**
 * @param {Cause} cause
 * @returns {[string, string]} a title and what it means
 */
function inWords({ cause, delta, element, line, factor }) {
  switch (cause) {
    case "mirror-one-side":
      return ["One side counted the other way round", `On the analyser’s or the generator’s side: ${Object.values(SLIPS).join("; or ")}. All of these look the same here; air, and then a sample of known circular sign, tells. The try changes the sign of the last row.`];
    case "m00-too-small":
      return [`${elementName(0, 0)} too small by ${significant(delta ?? 0)}`, "Its gain is low, background was subtracted twice, or it was left without the factor of the others."];
    case "one-element":
      return [`One wrong element, ${elementName(element?.[0] ?? 0, element?.[1] ?? 0)}`, "A typing error, a sign, or a wrong cell. The try puts in what follows from the others."];
    case "row-gain":
      return [`Row ${line} to be multiplied by ${significant(factor ?? 1, 3)}`, "A wrong contrast or retardance of the analyser."];
    case "column-gain":
      return [`Column ${line} to be multiplied by ${significant(factor ?? 1, 3)}`, "A wrong contrast or retardance of the generator."];
    default:
      return ["The sign of everything", "All elements are counted below zero."];
  }
}
