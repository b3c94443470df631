/** The plots: canvases that the engine draws on, kept sharp, and saved as files. */
import { make, repaint } from "./dom.js";
import { quick } from "./engine.js";
import { saveFile } from "./files.js";
import { copyButton } from "./matrix-view.js";
import { withTexts } from "./png.js";

/**
 * @typedef {import("./types.js").Theme} Theme
 * @typedef {{ width: number, height?: number, ratio: number, theme: Theme }} Frame
 * @typedef {{ description: string, width: number, height: number }} Drawn
 * @typedef {{ draw: (canvas: HTMLCanvasElement, request: any) => Drawn, svg: (request: any) => string }} Drawing
 */

/** All of the engine's drawings, in one place. @type {{ [name: string]: Drawing }} */
export const DRAWINGS = {
  eigenvalues: { draw: (canvas, request) => quick.drawEigenvalues(canvas, request), svg: (request) => quick.eigenvaluesSvg(request) },
  sphere: { draw: (canvas, request) => quick.drawSphere(canvas, request), svg: (request) => quick.sphereSvg(request) },
  curves: { draw: (canvas, request) => quick.drawCurves(canvas, request), svg: (request) => quick.curvesSvg(request) },
  ellipses: { draw: (canvas, request) => quick.drawEllipses(canvas, request), svg: (request) => quick.ellipsesSvg(request) },
};

const PRINT_RATIO = 3;
const PRINT_WIDTH = 640;
/** What a PNG's pixels are to those of the page. */
const SCALES = [1, 2, 3, 4, 6];
const dark = matchMedia("(prefers-color-scheme: dark)");
const forced = matchMedia("(forced-colors: active)");

/**
 * Where the system forces its colours, those; else none. Graticule and hatching lie
 * between ground and text, because a system has no colour for what stands back.
 * @returns {{ [name: string]: number[] } | undefined}
 */
function systemColours() {
  if (!forced.matches || printing) return undefined;
  const probe = make("span", { class: "offstage", "aria-hidden": "true" });
  document.body.append(probe);
  /** @param {string} keyword */
  const colour = (keyword) => {
    probe.style.color = keyword;
    return (getComputedStyle(probe).color.match(/[\d.]+/g) ?? []).slice(0, 3).map(Number);
  };
  const [ground, ink, accent] = ["Canvas", "CanvasText", "LinkText"].map(colour);
  probe.remove();
  if (!ground || !ink || !accent) return undefined;
  const between = ground.map((part, k) => part + 0.35 * ((ink[k] ?? part) - part));
  return { background: ground, panel: ground, ink, mute: ink, line: between, accent, hatch: between };
}

/** @type {Set<Plot>} */
const plots = new Set();
let printing = false;

/** Draw every plot anew when the theme or the pixel ratio changes, and light on paper. */
export function followTheme() {
  const all = () => plots.forEach((plot) => plot.request());
  dark.addEventListener("change", all);
  forced.addEventListener("change", all);
  const watchRatio = () => {
    matchMedia(`(resolution: ${devicePixelRatio}dppx)`).addEventListener(
      "change",
      () => {
        all();
        watchRatio();
      },
      { once: true },
    );
  };
  watchRatio();
  /** @param {boolean} on */
  const print = (on) => {
    printing = on;
    plots.forEach((plot) => plot.draw());
  };
  addEventListener("beforeprint", () => print(true));
  addEventListener("afterprint", () => print(false));
}

export class Plot {
  /**
   * @param {object} given
   * @param {string} given.name for files and ids
   * @param {Drawing} given.drawing
   * @param {number} given.maxWidth CSS pixels
   * @param {string} given.title
   * @param {(error: unknown) => void} given.failed
   * @param {(message: string) => void} given.tell
   */
  constructor({ name, drawing, maxWidth, title, failed, tell }) {
    this.name = name;
    this.drawing = drawing;
    this.maxWidth = maxWidth;
    this.failed = failed;
    /** @type {{ [field: string]: unknown } | null} */
    this.data = null;
    /** What the request has besides on the screen, but not in files. @type {{ [field: string]: unknown }} */
    this.onScreen = {};
    this.asked = 0;
    this.width = 0;
    this.canvas = make("canvas", { id: `plot-${name}`, role: "img", "aria-label": title });
    this.title = title;
    this.words = make("p", { class: "fine" });
    this.scale = make(
      "select",
      { class: "small", "aria-label": `Scale of ${title} as PNG` },
      SCALES.map((scale) => make("option", { value: scale, selected: scale === 3 }, `${scale}×`)),
    );
    this.table = make("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": `${title}: numbers` });
    /** @type {(() => string) | null} */
    this.tableText = null;
    this.copy = copyButton(`copy-${name}-numbers`, `the numbers of ${title}`, () => this.tableText?.() ?? "", tell);
    const fold = make("details", { id: `data-${name}` }, make("summary", null, "In words and numbers"), this.words, this.table, this.copy);
    this.element = make(
      "figure",
      { class: `plot plot-${name}` },
      this.canvas,
      make(
        "figcaption",
        null,
        fold,
        make(
          "span",
          { class: "tools" },
          this.scale,
          make("button", { type: "button", class: "small", onclick: () => this.savePng(), "aria-label": `Save ${title} as PNG` }, "PNG"),
          make("button", { type: "button", class: "small", onclick: () => this.saveSvg(), "aria-label": `Save ${title} as SVG` }, "SVG"),
        ),
      ),
    );
    plots.add(this);
    new ResizeObserver(() => {
      if (this.room() !== this.width) this.request();
    }).observe(this.element);
  }

  /**
   * @param {{ [field: string]: unknown } | null} data the engine's request but for the frame
   * @param {import("./dom.js").Child} [table] the same data as a table
   * @param {() => string} [tableText] the same in the form of copies, at full precision
   */
  show(data, table, tableText) {
    this.data = data;
    this.tableText = tableText ?? null;
    this.copy.hidden = !tableText;
    this.element.hidden = data === null;
    repaint(this.table, table);
    this.table.hidden = !table;
    this.request();
  }

  /**
   * Other data, the same table.
   * @param {{ [field: string]: unknown }} data
   */
  change(data) {
    this.data = data;
    this.request();
  }

  /** Draw in the next frame, once. */
  request() {
    if (this.asked) return;
    this.asked = requestAnimationFrame(() => {
      this.asked = 0;
      this.draw();
    });
  }

  room() {
    return Math.min(this.maxWidth, Math.floor(this.element.clientWidth));
  }

  draw() {
    const width = this.room();
    if (!this.data || width < 40) return;
    this.width = width;
    try {
      const ratio = printing ? PRINT_RATIO : Math.max(1, devicePixelRatio);
      const colours = systemColours();
      const drawn = this.drawing.draw(this.canvas, { ...this.data, ...(printing ? {} : this.onScreen), frame: { width, ratio, theme: theme(), ...(colours ? { colours } : {}) } });
      this.canvas.style.setProperty("width", `${drawn.width}px`);
      this.canvas.style.setProperty("height", `${drawn.height}px`);
      this.canvas.setAttribute("aria-label", drawn.description);
      this.words.textContent = drawn.description;
    } catch (error) {
      this.failed(error);
    }
  }

  saveSvg() {
    this.save("svg", () => new Blob([this.drawing.svg({ ...this.data, frame: { width: this.fileWidth(), theme: "print" } })], { type: "image/svg+xml" }));
  }

  savePng() {
    const canvas = make("canvas", { class: "offstage", "aria-hidden": "true" });
    document.body.append(canvas);
    try {
      const drawn = this.drawing.draw(canvas, { ...this.data, frame: { width: this.fileWidth(), ratio: Number(this.scale.value), theme: "print" } });
      canvas.toBlob(async (blob) => {
        if (!blob) return;
        const bytes = withTexts(new Uint8Array(await blob.arrayBuffer()), [
          ["Title", this.title],
          ["Description", drawn.description],
          ["Software", `Halfshade ${quick.engineInfo().version}`],
        ]);
        this.save("png", () => new Blob([bytes], { type: "image/png" }));
      });
    } catch (error) {
      this.failed(error);
    } finally {
      canvas.remove();
    }
  }

  fileWidth() {
    return Math.min(this.maxWidth, PRINT_WIDTH);
  }

  /**
   * @param {string} ending
   * @param {() => Blob} write
   */
  save(ending, write) {
    try {
      saveFile(`halfshade-${this.name}.${ending}`, write());
    } catch (error) {
      this.failed(error);
    }
  }
}

/** @returns {Theme} */
function theme() {
  if (printing) return "print";
  return dark.matches ? "dark" : "light";
}
