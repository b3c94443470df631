/** What a result stands on: the block that a report ends with, on the screen and on paper. */
import { conventionInWords } from "./convention.js";
import { fold, make, repaint } from "./dom.js";
import { systematicInWords } from "./instrument.js";
import { fullText, rows, significant, withMinus } from "./format.js";
import { writeClipboard } from "./paste.js";

/**
 * @typedef {import("./types.js").Request} Request
 * @typedef {import("./types.js").Shown} Shown
 * @typedef {{ name: string, text: string }} Fact
 *
 * @typedef {object} ProvenanceActions
 * @property {() => import("../halfshade.js").EngineInfo} info
 * @property {() => string | null} link to the present work
 * @property {(message: string) => void} tell
 */

export const CAUTION =
  "Where the bench uses a laser, follow the site’s laser-safety rules and the responsible officer. The results here do not replace calibration against traceable artefacts, and are not for medical diagnosis.";

/** A longer link is no use on paper. */
const LONGEST_LINK = 2000;
const SHOWN_DIGITS = 8;

/** What the hashed bytes begin with: version, shape, order, type of the numbers. */
const HASH_HEAD = "v1;4,4;C;<f8;";

/**
 * The bytes whose SHA-256 identifies sixteen numbers: the head in ASCII, then each as
 * a little-endian double, −0 as 0.
 * @param {number[]} mueller in the order of the input
 */
export function hashedBytes(mueller) {
  const bytes = new Uint8Array(HASH_HEAD.length + 8 * mueller.length);
  bytes.set(new TextEncoder().encode(HASH_HEAD));
  const view = new DataView(bytes.buffer, HASH_HEAD.length);
  mueller.forEach((value, k) => view.setFloat64(8 * k, value + 0, true));
  return bytes;
}

/**
 * @param {number[]} mueller in the order of the input
 * @returns {Promise<string | null>} 64 hexadecimal digits; null where the browser has no hash
 */
export async function inputHash(mueller) {
  // Browsers keep it from pages that came over an unprotected connection.
  if (!globalThis.crypto?.subtle) return null;
  const digest = new Uint8Array(await crypto.subtle.digest("SHA-256", hashedBytes(mueller)));
  return [...digest].map((byte) => byte.toString(16).padStart(2, "0")).join("");
}

/**
 * A moment as RFC 3339 writes it.
 * @param {Date} moment
 * @param {number} offset minutes east of UTC
 */
export function rfc3339(moment, offset = -moment.getTimezoneOffset()) {
  const local = new Date(moment.getTime() + 60_000 * offset).toISOString().slice(0, 19);
  const two = (/** @type {number} */ value) => String(value).padStart(2, "0");
  const size = Math.abs(offset);
  return `${local}${offset < 0 ? "-" : "+"}${two(Math.floor(size / 60))}:${two(size % 60)}`;
}

/** @param {Request["noise"]} noise */
function noiseInWords(noise) {
  if (noise.kind === "none") return "none stated";
  if (noise.kind === "uniform") return `standard deviation ${fullText(noise.sigma)} of each element, in the unit of the matrix as given, independent`;
  if (noise.kind === "rounding") return `rounding to ${noise.decimals} decimals, standard deviation ${significant(10 ** -noise.decimals / Math.sqrt(12), 3)} of each element`;
  if (noise.kind === "relative") return `standard deviation ${fullText(noise.fraction)} of m00 for each element, independent`;
  if (noise.kind === "perElement") return `standard deviations, laid out as given: ${noise.sigma.map((sigma) => fullText(sigma)).join(", ")}; independent`;
  if (noise.kind === "replicates") return `the scatter of ${noise.matrices.length} repeats about their mean, ${noise.matrices.length > 40 ? "with their whole covariance" : "pooled over the elements"}`;
  return `a covariance of the elements; standard deviations, laid out as given: ${Array.from({ length: 16 }, (_, k) => significant(Math.sqrt(noise.covariance[17 * k] ?? 0), 3)).join(", ")}`;
}

/**
 * The facts of one result.
 * @param {Request} request what was computed
 * @param {import("../halfshade.js").EngineInfo} info
 * @param {Date} computed
 * @returns {Fact[]}
 */
export function provenanceOf(request, info, computed) {
  const { convention, noise, draws, seed } = request;
  return [
    { name: "Program", text: `Halfshade ${info.version}; configurations of version ${info.schema}` },
    { name: "Computed", text: `${rfc3339(computed)}, in UTC ${computed.toISOString().slice(0, 19)}Z` },
    {
      name: "Convention",
      text: `facing the source: ${conventionInWords(convention)}; time dependence exp(${convention.time === "plus" ? "+" : "−"}iωt); numbers given ${convention.order === "rows" ? "row by row" : "column by column"}`,
    },
    { name: "Normalisation", text: request.normalised ? "normalised to m00, which is exact" : "not normalised" },
    { name: "Unit", text: request.absolute ? "absolute transmittance or reflectance" : "relative" },
    { name: "Noise", text: noiseInWords(noise) },
    ...(noise.systematic ? [{ name: "Instrument", text: `standard uncertainties, ${systematicInWords(noise.systematic)}` }] : []),
    { name: "Draws and seed", text: `${draws} draws, seed ${seed}` },
    { name: "Tolerance", text: "an eigenvalue above −10⁻¹² of m00 counts as zero" },
  ];
}

export class ProvenancePanel {
  /**
   * @param {HTMLElement} root
   * @param {ProvenanceActions} actions
   */
  constructor(root, actions) {
    this.root = root;
    this.actions = actions;
    /** @type {Request | null} */
    this.request = null;
    this.pending = false;
    this.label = "";
    /** @type {Fact[]} */
    this.facts = [];
    this.hash = "";
    this.digits = make("td", { class: "hash" });
    this.link = make("td", { class: "link-text" });
    // The link follows every turn of a picture: it is made when somebody sees it.
    addEventListener("beforeprint", () => this.showLink());
  }

  /** @param {Shown} shown */
  show({ request, pending, work, stale }) {
    this.root.hidden = request === null;
    if (!request) {
      this.request = null;
      repaint(this.root);
      return;
    }
    const { label, many } = work.measurement;
    if (request === this.request && this.pending === pending && this.label === label) {
      this.showLinkIfOpen();
      return;
    }
    if (request !== this.request) this.showHash(request);
    this.request = request;
    this.pending = pending;
    this.label = label;
    this.facts = provenanceOf(request, this.actions.info(), new Date());
    if (label && !stale) this.facts.unshift({ name: "Label", text: label });
    if (many?.source && !stale) this.facts.push({ name: "Data file", text: `${many.source}, SHA-256 ${many.sha256}` });
    const given = request.mueller.map((value) => fullText(value, stale ? null : work.measurement.decimals));
    repaint(
      this.root,
      fold(
        "report-block",
        "Report block: what these results stand on",
        make(
          "div",
          { class: "scroll", tabindex: "0", role: "region", "aria-label": "Report block" },
          make(
            "table",
            { class: "data report" },
            make(
              "tbody",
              null,
              this.facts.map(({ name, text }) => factRow(name, make("td", null, text))),
              factRow("The sixteen numbers as given", make("td", null, make("table", { class: "numbers given", "aria-label": "The sixteen numbers as given" }, make("tbody", null, rows(given).map((row) => make("tr", null, row.map((text) => make("td", null, withMinus(text))))))))),
              factRow("SHA-256 of them", this.digits),
              factRow("Link", this.link),
            ),
          ),
        ),
        make("p", null, make("button", { type: "button", id: "copy-report", class: "small", onclick: () => this.copy(this.text(), "report block") }, "Copy as text")),
        make("p", { class: "fine" }, "No data left this computer. ", CAUTION),
      ),
    );
    this.root.querySelector("details")?.addEventListener("toggle", () => this.showLinkIfOpen());
    this.showLinkIfOpen();
  }

  /** @param {Request} request */
  async showHash(request) {
    this.hash = "";
    repaint(this.digits, "…");
    const hash = await inputHash(request.mueller);
    if (this.request !== request) return;
    this.hash = hash ?? "";
    repaint(
      this.digits,
      hash === null
        ? "not available: the browser computes it for protected and local pages only"
        : [hash.slice(0, SHOWN_DIGITS), "… ", make("button", { type: "button", id: "copy-hash", class: "small", onclick: () => this.copy(hash, "SHA-256 of the input") }, "Copy all 64 digits")],
    );
  }

  showLinkIfOpen() {
    if (this.root.querySelector("details")?.open) this.showLink();
  }

  showLink() {
    if (!this.request) return;
    this.link.textContent = this.linkText();
  }

  linkText() {
    try {
      const link = this.actions.link();
      if (link === null) return "none: the present input is not a whole matrix";
      return link.length > LONGEST_LINK ? `left out: its ${link.length} characters are too many for paper` : link;
    } catch {
      return "left out: the work does not fit into a link";
    }
  }

  /** The block as lines of text. */
  text() {
    const { request } = this;
    if (!request) return "";
    const numbers = rows(request.mueller.map((value) => fullText(value))).map((row) => row.join("\t"));
    return [
      ...this.facts.map(({ name, text }) => `${name}: ${text}`),
      "The sixteen numbers as given:",
      ...numbers,
      `SHA-256 of them: ${this.hash || "not available"}`,
      `Link: ${this.linkText()}`,
      "No data left this computer.",
      CAUTION,
      "",
    ].join("\n");
  }

  /**
   * @param {string} text
   * @param {string} what
   */
  async copy(text, what) {
    const done = await writeClipboard(text);
    this.actions.tell(done ? `Copied: ${what}.` : "The browser did not allow the copy. Select the text and press Ctrl+C.");
  }
}

/**
 * @param {string} name
 * @param {HTMLTableCellElement} cell
 */
function factRow(name, cell) {
  return make("tr", null, make("th", { scope: "row" }, name), cell);
}
