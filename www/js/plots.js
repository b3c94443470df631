/** The plots: canvases that the engine draws on, kept sharp, and saved as files. */
import { make, repaint } from "./dom.js";
import { quick } from "./engine.js";

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
  ellipses: { draw: (canvas, request) => quick.drawEllipses(canvas, request), svg: (request) => quick.ellipsesSvg(request) },
};

const PNG_RATIO = 3;
const PRINT_WIDTH = 640;
const dark = matchMedia("(prefers-color-scheme: dark)");

/** @type {Set<Plot>} */
const plots = new Set();
let printing = false;

/** Draw every plot anew when the theme or the pixel ratio changes, and light on paper. */
export function followTheme() {
  const all = () => plots.forEach((plot) => plot.request());
  dark.addEventListener("change", all);
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
   */
  constructor({ name, drawing, maxWidth, title, failed }) {
    this.name = name;
    this.drawing = drawing;
    this.maxWidth = maxWidth;
    this.failed = failed;
    /** @type {{ [field: string]: unknown } | null} */
    this.data = null;
    this.asked = 0;
    this.width = 0;
    this.canvas = make("canvas", { id: `plot-${name}`, role: "img", "aria-label": title });
    this.words = make("p", { class: "fine" });
    this.table = make("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": `${title}: numbers` });
    const fold = make("details", { id: `data-${name}` }, make("summary", null, "In words and numbers"), this.words, this.table);
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
   * @param {...import("./dom.js").Child} table the same data as a table
   */
  show(data, ...table) {
    this.data = data;
    this.element.hidden = data === null;
    repaint(this.table, ...table);
    this.table.hidden = table.length === 0;
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
      const ratio = printing ? PNG_RATIO : Math.max(1, devicePixelRatio);
      const drawn = this.drawing.draw(this.canvas, { ...this.data, frame: { width, ratio, theme: theme() } });
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
      this.drawing.draw(canvas, { ...this.data, frame: { width: this.fileWidth(), ratio: PNG_RATIO, theme: "print" } });
      canvas.toBlob((blob) => {
        if (blob) this.save("png", () => blob);
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
      const address = URL.createObjectURL(write());
      const link = make("a", { href: address, download: `halfshade-${this.name}.${ending}` });
      link.click();
      setTimeout(() => URL.revokeObjectURL(address), 10000);
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
