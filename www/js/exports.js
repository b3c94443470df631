/** Numbers that leave: in the form that was chosen, at full precision, with names and units. */
import { DEFINITIONS } from "./definitions.js";
import { quick } from "./engine.js";
import { place } from "./format.js";

/**
 * @typedef {import("./types.js").Form} Form
 * @typedef {import("./types.js").Examination} Examination
 * @typedef {import("./types.js").Request} Request
 * @typedef {Omit<import("../halfshade.js").ExportRequest, "form">} Content
 */

/** What the forms are called. @type {[Form, string][]} */
export const FORMS = [
  ["tsv", "TSV, for spreadsheets"],
  ["csv", "CSV, decimal point"],
  ["csvEuropean", "CSV, decimal comma"],
  ["json", "JSON"],
  ["latex", "LaTeX"],
  ["python", "Python (NumPy)"],
  ["matlab", "MATLAB"],
];

/** How their files end. @type {{ [form in Form]: string }} */
export const ENDINGS = { tsv: "tsv", csv: "csv", csvEuropean: "csv", json: "json", latex: "tex", python: "py", matlab: "m" };

/** The form of every copy. @type {Form} */
let chosen = "tsv";

/** @param {Form} form */
export function chooseForm(form) {
  chosen = form;
}

/**
 * @param {Content} content
 * @param {Form} [form]
 */
export function exported(content, form = chosen) {
  return quick.exportText({ form, ...content });
}

/**
 * @param {string} name
 * @param {number[]} mueller
 */
export function matrixText(name, mueller) {
  return exported({ matrices: [{ name, mueller }] });
}

/** @param {Examination} result */
export function figuresTable({ figures }) {
  const entries = Object.entries(figures);
  /** @param {string} name @param {(entry: [string, import("./types.js").Figure]) => string | number | null} value */
  const column = (name, value) => ({ name, values: entries.map(value) });
  return {
    name: "figures",
    columns: [
      column("figure", ([name]) => name),
      column("value", ([, figure]) => figure.value),
      column("standard uncertainty", ([, figure]) => figure.se),
      column("95 % low", ([, figure]) => figure.low),
      column("95 % high", ([, figure]) => figure.high),
      column("unit", ([name]) => (DEFINITIONS[name]?.unit === "°" ? "deg" : "1")),
      column("note", ([, figure]) => figure.reason ?? ""),
    ],
  };
}

/** @param {Examination} result */
export function eigenvaluesTable({ realizability }) {
  const values = realizability.eigenvalues ?? [];
  const errors = realizability.eigenvalueSe;
  return {
    name: "coherency eigenvalues",
    columns: [
      { name: "index", values: values.map((_, k) => k + 1) },
      { name: "eigenvalue over m00", values: [...values] },
      { name: "standard uncertainty", values: values.map((_, k) => errors?.[k] ?? null) },
    ],
  };
}

/**
 * Everything that is known of one matrix.
 * @param {Examination} result
 * @param {Request} request
 * @param {string} label
 * @param {string[]} notes
 * @returns {Content}
 */
export function resultsOf(result, request, label, notes) {
  const { decompositions, nearest } = result;
  const measured = Array.from({ length: 16 }, (_, k) => request.mueller[place(request.convention.order, Math.floor(k / 4), k % 4)] ?? 0);
  /** @type {{ name: string, mueller: number[] }[]} */
  const matrices = [{ name: "measured", mueller: measured }];
  /** @param {string} name @param {number[] | null | undefined} mueller */
  const add = (name, mueller) => {
    if (mueller) matrices.push({ name, mueller });
  };
  add("nearest", nearest.mueller);
  add("change", nearest.change);
  for (const [name, polar] of /** @type {const} */ ([
    ["polar_forward", decompositions.polarForward],
    ["polar_reverse", decompositions.polarReverse],
  ])) {
    add(`${name}_depolarizer`, polar?.depolarizer);
    add(`${name}_retarder`, polar?.retarder);
    add(`${name}_diattenuator`, polar?.diattenuator);
  }
  add("differential_mean", decompositions.differential?.mean);
  add("differential_depolarizing", decompositions.differential?.depolarizing);
  add("isotropic_fit", decompositions.isotropic?.mueller);
  decompositions.spectral.forEach((part, k) => add(`spectral_${k + 1}`, part.mueller));
  decompositions.characteristic.forEach((part, k) => add(`characteristic_${k + 1}`, part.mueller));
  const weights = {
    name: "weights",
    columns: [
      { name: "part", values: [1, 2, 3, 4] },
      { name: "spectral", values: [0, 1, 2, 3].map((k) => decompositions.spectral[k]?.weight ?? null) },
      { name: "characteristic", values: [0, 1, 2, 3].map((k) => decompositions.characteristic[k]?.weight ?? null) },
    ],
  };
  return { title: label || "Measured matrix", notes, matrices, tables: [eigenvaluesTable(result), figuresTable(result), weights] };
}
