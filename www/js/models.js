/** The words of the candidate models and of their parameters. Pure. */
import { elementName } from "./format.js";

/** @typedef {import("../halfshade.js").ModelFit} ModelFit */

/** @type {{ [model: string]: { title: string, note: string } }} */
export const MODELS = {
  linearRetarder: { title: "Linear retarder", note: "transmittance, retardance, fast axis, α" },
  linearDiattenuator: { title: "Linear diattenuator", note: "transmittance, diattenuation, axis, α" },
  alignedDiattenuatingRetarder: { title: "Aligned diattenuating retarder", note: "retardance and diattenuation along one axis, α" },
  ellipticalRetarder: { title: "Elliptical retarder", note: "retardance about any axis, α" },
  ellipticalDiattenuator: { title: "Elliptical diattenuator", note: "diattenuation along any axis, α" },
  pure: { title: "Pure element", note: "any Jones matrix, no depolarization" },
  pureIsotropic: { title: "Pure element with isotropic depolarization", note: "any Jones matrix, α" },
  pureLinearCircular: { title: "Pure element, linear and circular light depolarized apart", note: "any Jones matrix, two factors" },
  pureDiagonal: { title: "Pure element with a diagonal depolarizer", note: "any Jones matrix, three factors" },
  rankTwo: { title: "Mixture of two pure elements", note: "rank 2" },
  rankThree: { title: "Mixture of three pure elements", note: "rank 3" },
  rankFour: { title: "Any realizable matrix", note: "rank 4" },
};

/** @type {[string, string][]} */
export const SIDES = [
  ["parallel", "beside the element"],
  ["after", "behind it, in series"],
  ["before", "in front of it, in series"],
];

/** @type {{ [name: string]: string }} */
const NAMES = {
  transmittance: "transmittance",
  diattenuation: "diattenuation D",
  axisDeg: "azimuth of the axis",
  retardanceDeg: "retardance δ",
  ellipticityDeg: "ellipticity of the fast state",
  alpha: "isotropic depolarization α",
  depolarizationLinear: "linear polarization retained",
  depolarizationCircular: "circular polarization retained",
  jones: "the Jones matrix",
};

/**
 * What a parameter is called.
 * @param {string} name
 */
export function parameterTitle(name) {
  const known = NAMES[name];
  if (known) return name === "transmittance" ? `transmittance ${elementName(0, 0)}` : known;
  const [, kind, index = ""] = /^(retarderVectorDeg|diattenuationVector|depolarization|weight)(\d)$/.exec(name) ?? [];
  if (kind === "retarderVectorDeg") return `retardance · axis, S${Number(index) + 1}`;
  if (kind === "diattenuationVector") return `diattenuation vector, S${Number(index) + 1}`;
  if (kind === "depolarization") return `S${Number(index) + 1} retained`;
  if (kind === "weight") return `share of element ${Number(index) + 1}`;
  const [, row, column, part] = /^jones\.(\d)(\d)\.(re|im)$/.exec(name) ?? [];
  if (row) return `J${"xy"[Number(row)] ?? ""}${"xy"[Number(column)] ?? ""}, ${part === "re" ? "real" : "imaginary"} part`;
  return name;
}

/** @type {{ [unit: string]: string }} */
export const UNITS = { 1: "", deg: "°", matrix: "", root: "" };

/**
 * Whether a model passes, and why not.
 * @param {ModelFit} fit
 * @param {string | undefined} recommended
 */
export function standing(fit, recommended) {
  const isRecommended = fit.model === recommended;
  if (fit.pValue === null) return isRecommended ? "recommended" : "";
  if (fit.pValue >= 0.05) return isRecommended ? "recommended" : "explains it";
  return isRecommended ? "lowest criterion, misfit beyond noise" : "misfit beyond noise";
}
