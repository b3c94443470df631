/**
 * Verdicts as sentences. Pure: an engine's result goes in, text comes out, so that
 * every case can be tested without a page.
 */
import { elementName, fixed, significant, withMinus } from "./format.js";

/**
 * @typedef {import("./types.js").Examination} Examination
 * @typedef {import("./types.js").Request} Request
 * @typedef {import("./types.js").Figure} Figure
 * @typedef {import("./types.js").FormatValue} FormatValue
 * @typedef {import("./types.js").Part} Part
 *
 * @typedef {object} Verdict
 * @property {"good" | "unsure" | "bad"} tone for a mark beside the words, never instead of them
 * @property {string} title
 * @property {Part[]} reason
 * @property {Part[]} next what to do or to know next
 *
 * @typedef {{ name: string, answer: string, value: string, note: string }} Check
 */

/** The gloss of the term, said once. */
export const GLOSS = "Realizable means: it can be physical. Some arrangement of passive or active optics, mixing light as it may, has this matrix.";

/** What no such check can see. */
export const BLIND = [
  "transposition of the whole matrix",
  "the handedness counted the other way on both sides, or two signs on one side",
  "rows or columns in a cyclic permutation, and azimuth zeros that are off",
  "a positive factor on the whole matrix",
  "constant added light",
  "contrast lost on both sides",
];

const COUNTS = ["No", "One", "Two", "Three", "Four"];

/**
 * The verdict on a matrix.
 * @param {Examination} result
 * @param {Request} request what the result answers
 * @param {boolean} pending whether the test against the noise is still running
 * @param {FormatValue} format
 * @returns {Verdict}
 */
export function verdictOf(result, request, pending, format) {
  const { realizability } = result;
  if (!realizability.eigenvalues) return withoutEigenvalues(request);
  const m00 = request.mueller[0] ?? 0;
  if (m00 < 0 && realizability.verdict !== "withinNoise") return negative(m00);
  switch (realizability.verdict) {
    case "realizable":
      return realizable(realizability, request, format);
    case "withinNoise":
      return request.noise.kind === "rounding" ? asPrinted(realizability, request, format) : withinNoise(realizability, request, format);
    case "beyondNoise":
      return beyondNoise(realizability, request, format);
    default:
      return request.noise.kind === "none" ? withoutNoise(realizability, pending, format) : untested(realizability, pending, format);
  }
}

/**
 * @param {Request} request
 * @returns {Verdict}
 */
function withoutEigenvalues(request) {
  if (request.mueller.every((value) => value === 0)) {
    return {
      tone: "good",
      title: "The zero matrix: no light comes out",
      reason: [`It can be physical, like a perfect absorber, but it has no other properties: every figure is relative to ${elementName(0, 0)}, and ${elementName(0, 0)} is 0.`],
      next: [],
    };
  }
  return {
    tone: "bad",
    title: `Not realizable: ${elementName(0, 0)} is 0, other elements are not`,
    reason: [
      `${elementName(0, 0)} is what passes of unpolarized light. Where it is 0, nothing passes, and every other element must be 0 too.`,
    ],
    next: [`Look for a lost ${elementName(0, 0)}: some programs leave it out of a normalised matrix, where it is 1.`],
  };
}

/**
 * @param {number} m00
 * @returns {Verdict}
 */
function negative(m00) {
  return {
    tone: "bad",
    title: `Not realizable: ${elementName(0, 0)} is negative`,
    reason: [`${elementName(0, 0)} is what passes of unpolarized light, here `, { number: significant(m00, 4) }, ". Light cannot be less than none."],
    next: ["Either the sign of the whole matrix is reversed, or more background was subtracted than there was light."],
  };
}

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {Request} request
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function realizable(realizability, request, format) {
  const { value, se } = smallest(realizability);
  /** @type {Part[]} */
  const reason = ["All four coherency eigenvalues are at or above zero"];
  if (Math.abs(value) < 1e-11) reason.push("; the smallest is 0 within the accuracy of the arithmetic. ");
  else reason.push("; the smallest is ", { number: eigenvalueText(value, se, format) }, ` of ${elementName(0, 0)}. `);
  if (se !== null && value < 2 * se) reason.push({ mute: "The margin is within two standard errors of zero." });
  if (request.noise.kind === "none") reason.push({ mute: "No noise is stated, so the margin has no uncertainty." });
  return {
    tone: "good",
    title: "Realizable",
    reason,
    next: ["A realizable matrix need not be the right one: see below what no such check can see."],
  };
}

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {Request} request
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function withinNoise(realizability, request, format) {
  return {
    tone: "unsure",
    title: "Not realizable, but within noise",
    reason: [
      ...negatives(realizability, format),
      ` ${noiseSentence(request)} puts a realizable sample this far out, or further, in `,
      ...oddsOf(realizability.pValue),
      { mute: "Of good measurements of a pure sample about 99 in 100 look like this." },
    ],
    next: ["The noise alone explains it. For further work the nearest realizable matrix serves as well."],
  };
}

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {Request} request
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function asPrinted(realizability, request, format) {
  const decimals = request.noise.kind === "rounding" ? request.noise.decimals : realizability.roundingDecimals;
  return {
    tone: "unsure",
    title: `Not realizable as printed, but consistent with rounding to ${decimalsText(decimals)}`,
    reason: [
      ...negatives(realizability, format),
      ` Rounding to ${decimalsText(decimals)} puts a realizable sample this far out, or further, in `,
      ...oddsOf(realizability.pValue),
    ],
    next: ["Nothing is wrong with such a matrix. If the measurement has more noise than its digits show, state σ."],
  };
}

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {Request} request
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function beyondNoise(realizability, request, format) {
  const { value, se } = smallest(realizability);
  /** @type {Part[]} */
  const reason = [...negatives(realizability, format)];
  if (se !== null && se > 0) reason.push(` That is ${significant(-value / se)} standard errors below zero.`);
  reason.push(` ${noiseSentence(request)} puts a realizable sample this far out, or further, in `, ...oddsOf(realizability.pValue, realizability.simulations));
  const rounding = request.noise.kind === "rounding";
  return {
    tone: "bad",
    title: rounding ? "Not realizable: rounding does not explain it" : "Not realizable, beyond noise",
    reason,
    next: rounding
      ? ["Rounding is the least noise there can be. If you know σ of the measurement, state it; else look for an error, as below."]
      : [causes()],
  };
}

const causes = () =>
  `Usual causes: one side counted the other way round (a sign, or two rows or columns exchanged), ${elementName(0, 0)} too small or background over-subtracted, one wrong element, a wrong contrast or retardance of one side; or the noise is larger than stated.`;

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {boolean} pending
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function untested(realizability, pending, format) {
  return {
    tone: "unsure",
    title: pending ? "Not realizable as measured: testing against the noise…" : "Not realizable as measured",
    reason: [...negatives(realizability, format), pending ? " Testing against the noise…" : ` ${realizability.reason ?? "It was not tested against the noise."}`],
    next: [],
  };
}

/**
 * @param {import("./types.js").Realizability} realizability
 * @param {boolean} pending
 * @param {FormatValue} format
 * @returns {Verdict}
 */
function withoutNoise(realizability, pending, format) {
  const { explainingSigma, roundingDecimals } = realizability;
  if (realizability.consistentWithRounding) {
    return {
      tone: "unsure",
      title: `Not realizable as printed, but consistent with rounding to ${decimalsText(roundingDecimals)}`,
      reason: [
        ...negatives(realizability, format),
        ` Rounding to ${decimalsText(roundingDecimals)} alone, σ = ${significant(realizability.roundingSigma ?? 0)} an element, moves it that far.`,
      ],
      next: ["Nothing is wrong with such a matrix. State the noise of the measurement to have it tested, and to have uncertainties."],
    };
  }
  /** @type {Part[]} */
  const reason = [...negatives(realizability, format)];
  if (explainingSigma !== null && explainingSigma !== undefined) {
    reason.push(" Noise of σ = ", { number: significant(explainingSigma) }, " or more on each element would explain it.");
    if (roundingDecimals !== null && roundingDecimals !== undefined) reason.push({ mute: ` Rounding to ${decimalsText(roundingDecimals)} does not.` });
  } else if (pending) {
    reason.push(" Finding the smallest noise that would explain it…");
  } else if (realizability.reason) {
    reason.push(` ${realizability.reason}`);
  }
  return {
    tone: "unsure",
    title: "Not realizable as it stands; no noise is stated",
    reason,
    next: [
      explainingSigma !== null && explainingSigma !== undefined
        ? "Is your σ as large as that? Then noise is enough of an explanation. State it to have it tested. If it is much smaller, something else is wrong. "
        : "State the noise to have it tested. ",
    ],
  };
}

/**
 * "Two coherency eigenvalues are negative, the smallest −0.0038(21) of m00."
 * @param {import("./types.js").Realizability} realizability
 * @param {FormatValue} format
 * @returns {Part[]}
 */
function negatives(realizability, format) {
  const count = (realizability.eigenvalues ?? []).filter((value) => value < -1e-12).length;
  const { value, se } = smallest(realizability);
  const number = { number: eigenvalueText(value, se, format) };
  if (count <= 1) return ["One coherency eigenvalue is negative, ", number, ` of ${elementName(0, 0)}.`];
  return [`${COUNTS[count] ?? count} coherency eigenvalues are negative, the smallest `, number, ` of ${elementName(0, 0)}.`];
}

/**
 * "47 of 100 measurements (p = 0.47). "
 * @param {number | null} pValue
 * @param {number | null} [simulations]
 * @returns {Part[]}
 */
function oddsOf(pValue, simulations = null) {
  if (pValue === null) return ["an unknown share of measurements. "];
  const atFloor = simulations !== null && simulations > 0 && pValue <= 1.01 / (1 + simulations);
  if (atFloor) return [`fewer than 1 of ${simulations + 1} measurements (p ≤ ${significant(pValue, 1)}, the least that ${simulations} simulations can give). `];
  if (pValue < 0.095) return [{ number: significant(1000 * pValue, 2) }, ` of 1000 measurements (p = ${significant(pValue)}). `];
  return [{ number: String(Math.round(100 * pValue)) }, ` of 100 measurements (p = ${pValue.toFixed(2)}). `];
}

/** @param {Request} request */
function noiseSentence({ noise }) {
  const words = randomPart(noise);
  return noise.systematic ? `${words}, with the stated uncertainty of the instrument,` : words;
}

/** @param {Request["noise"]} noise */
function randomPart(noise) {
  if (noise.kind === "uniform") return `Noise of σ = ${significant(noise.sigma, 3)}`;
  if (noise.kind === "rounding") return `Rounding to ${decimalsText(noise.decimals)}`;
  if (noise.kind === "relative") return `Noise of ${significant(100 * noise.fraction, 3)} % of ${elementName(0, 0)}`;
  if (noise.kind === "replicates") return `The scatter of the ${noise.matrices.length} repeats`;
  return "The stated noise";
}

/** @param {number | null} decimals */
function decimalsText(decimals) {
  if (decimals === null || decimals === undefined) return "the printed digits";
  if (decimals === 0) return "whole numbers";
  return decimals === 1 ? "1 decimal" : `${decimals} decimals`;
}

/** @param {import("./types.js").Realizability} realizability */
function smallest({ eigenvalues, eigenvalueSe }) {
  const last = (eigenvalues?.length ?? 1) - 1;
  return { value: eigenvalues?.[last] ?? 0, se: eigenvalueSe?.[last] ?? null };
}

/**
 * @param {number} value
 * @param {number | null} se
 * @param {FormatValue} format
 */
export function eigenvalueText(value, se, format) {
  if (se !== null && se > 0) return format({ value, se }).text;
  if (Math.abs(value) < 1e-12) return "0";
  return significant(value, Math.abs(value) >= 0.1 ? 4 : 3);
}

/**
 * A figure as text: with its uncertainty where it has one.
 * @param {Figure | undefined | null} figure
 * @param {FormatValue} format
 * @returns {string | null} null where it is not determined
 */
export function figureText(figure, format) {
  if (!figure || figure.value === null || figure.value === undefined) return null;
  if (figure.se !== null && figure.se !== undefined && figure.se > 0) return format({ value: figure.value, se: figure.se }).text;
  const size = Math.abs(figure.value);
  return fixed(figure.value, size >= 10 ? 3 : size >= 1000 ? 1 : 4);
}

/**
 * The interval of 95 % of a figure, to the digits that it bears.
 * @param {Figure} figure
 * @returns {string} empty where there is none
 */
export function intervalText({ se, low, high }) {
  if (low === null && high === null) return "";
  const size = se ?? Math.abs((high ?? 0) - (low ?? 0)) / 4;
  const digits = size > 0 ? Math.min(15, Math.max(0, 1 - Math.floor(Math.log10(size)))) : 4;
  const written = (/** @type {number} */ value) => withMinus(value.toFixed(digits).replace(/^-(0\.?0*)$/, "$1"));
  if (low === null) return `95 % below ${written(high ?? 0)}`;
  if (high === null) return `95 % above ${written(low)}`;
  return `95 %: ${written(low)} … ${written(high)}`;
}

/**
 * What a noise can show.
 * @param {import("../halfshade.js").Detectable} found
 */
export function detectionText({ alpha, alphaSe, diattenuation, mirrorMargin }) {
  const mirror = mirrorMargin >= 3 ? `A retarder with one side counted the other way round stands out by ${significant(mirrorMargin)} standard errors.` : "A side counted the other way round would hide in it.";
  return `Isotropic depolarization from α = ${significant(alpha)} on (its standard error is ${significant(alphaSe)}); diattenuation and polarizance from ${significant(diattenuation)} on. ${mirror} All relative to ${elementName(0, 0)}.`;
}

/**
 * The separate checks of the Realizability task.
 * @param {Examination} result
 * @param {Request} request
 * @param {boolean} pending
 * @param {FormatValue} format
 * @returns {Check[]}
 */
export function checksOf(result, request, pending, format) {
  const { realizability } = result;
  const { value, se } = smallest(realizability);
  /** @type {{ [verdict: string]: string }} */
  const answers = {
    realizable: "yes",
    withinNoise: "within noise",
    beyondNoise: "no, beyond noise",
    notRealizable: pending && request.noise.kind !== "none" ? "testing…" : "no",
  };
  const rounded = realizability.verdict === "notRealizable" && realizability.consistentWithRounding;
  /** @type {Check[]} */
  const checks = [];
  checks.push({
    name: "Coherency eigenvalues ≥ 0",
    answer: !realizability.eigenvalues ? "not defined" : rounded ? "within rounding" : (answers[realizability.verdict] ?? "no"),
    value: realizability.eigenvalues ? eigenvalueText(value, se, format) : "",
    note: `The necessary and sufficient condition; the number is the smallest eigenvalue of H over ${elementName(0, 0)}.`,
  });
  const { stokesCondition, stokesMargin } = realizability;
  checks.push({
    name: "Maps every Stokes vector to one",
    answer: stokesCondition ? "yes" : (stokesMargin ?? -1) > -0.05 ? "not exactly" : "no",
    value: stokesMargin === null || stokesMargin === undefined ? "" : Math.abs(stokesMargin) < 1e-11 ? "0" : significant(stokesMargin, 3),
    note: "Weaker and older: no light may come out more than fully polarized. The number is the margin.",
  });
  const passivity = realizability.passivity;
  /** @type {{ [verdict: string]: string }} */
  const passive = { passive: "yes", notBeyondNoise: "not beyond noise", notPassive: "no" };
  checks.push({
    name: "Passive: gives out no more light than it gets",
    answer: passivity ? (passive[passivity.verdict] ?? passivity.verdict) : "not tested",
    value: passivity ? (figureText(passivity.margin, format) ?? "") : "relative units",
    note: passivity ? `${elementName(0, 0)} (1 + the larger of D and P) − 1; above zero means gain.` : "Only an absolute transmittance or reflectance can be tested.",
  });
  return checks;
}

/**
 * Where the nearest realizable matrix differs most.
 * @param {import("./types.js").Nearest} nearest
 * @returns {string}
 */
export function changeInWords(nearest) {
  const changes = nearest.changeInSigma ?? nearest.change ?? [];
  let index = 0;
  changes.forEach((change, each) => {
    if (Math.abs(change) > Math.abs(changes[index] ?? 0)) index = each;
  });
  const largest = changes[index] ?? 0;
  if (Math.abs(largest) < 1e-12) return "The matrix is realizable: nothing changes.";
  const name = elementName(Math.floor(index / 4), index % 4);
  return `Largest change ${significant(largest)}${nearest.changeInSigma ? " σ" : ""}, in ${name}.`;
}

/**
 * The element in one line, for the head of the Properties task.
 * @param {Examination} result
 * @param {FormatValue} format
 * @returns {Part[]}
 */
export function summaryOf(result, format) {
  const figures = /** @type {Record<string, Figure>} */ (result.figures);
  /** @type {Part[]} */
  const parts = [];
  /**
   * @param {string} lead
   * @param {string} name
   * @param {string} unit
   */
  const tell = (lead, name, unit) => {
    const text = figureText(figures[name], format);
    if (text === null) return;
    parts.push(parts.length === 0 ? capital(lead) : `, ${lead}`, { number: `${text}${unit}` });
  };
  tell("retardance ", "retardanceDeg", "°");
  tell("diattenuation ", "diattenuation", "");
  tell("depolarization index ", "depolarizationIndex", "");
  if (parts.length > 0) parts.push(". ");
  return parts;
}

/** @param {string} text */
function capital(text) {
  return text.charAt(0).toUpperCase() + text.slice(1);
}
