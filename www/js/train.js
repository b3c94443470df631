/** Trains of elements as the page holds them: what can be in one, and how it is changed. Pure. */
import { fullText } from "./format.js";

/**
 * @typedef {import("../halfshade.js").TrainElement} TrainElement
 * @typedef {import("../halfshade.js").TrainParameter} TrainParameter
 * @typedef {import("../halfshade.js").ElementKind} ElementKind
 * @typedef {import("../halfshade.js").Measurement} Measurement
 * @typedef {[number, number, number, number]} Four
 *
 * @typedef {object} TrainWork the state of the task; never changed in place
 * @property {TrainElement[]} train
 * @property {Four} source
 * @property {Side} before what stands before the sample
 * @property {Side} behind
 * @property {boolean} reflection
 * @property {boolean} direct whether the share of undisturbed light is asked for
 * @property {{ [field: string]: string }} typed texts that are no numbers, by their field
 *
 * @typedef {object} Side of the sample
 * @property {number} count so many elements at this end of the train
 * @property {Measurement | TrainElement[] | null} given optics of their own, which are not in the train
 */

/** Air: leaves everything as it is. */
export const AIR = [1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1];

/** The blocks of a configuration that hold the task; `trainTyped` is the page's own. */
export const TRAIN_BLOCKS = ["train", "source", "pre", "post", "removal", "trainTyped"];

/** Names of parameters and the words for them. @type {{ [name: string]: [label: string, unit: string] }} */
const PARAMETERS = {
  transmittanceMax: ["largest transmittance", ""],
  transmittanceMin: ["smallest transmittance", ""],
  transmittance: ["transmittance", ""],
  diattenuation: ["diattenuation", ""],
  retardanceDeg: ["retardance", "°"],
  axisDeg: ["axis", "°"],
  azimuthDeg: ["azimuth", "°"],
  ellipticityDeg: ["ellipticity", "°"],
  angleDeg: ["angle", "°"],
  psiDeg: ["angle Ψ", "°"],
  deltaDeg: ["phase Δ", "°"],
  reflectance: ["reflectance", ""],
  planeDeg: ["plane of incidence", "°"],
  indexBefore: ["index before it", ""],
  indexAfter: ["index behind it", ""],
  absorption: ["absorption", ""],
  incidenceDeg: ["angle of incidence", "°"],
  alpha: ["depolarization α", ""],
  d1: ["share d1", ""],
  d2: ["share d2", ""],
  d3: ["share d3", ""],
};

/** What each kind is called, and its parameters in their order. @type {{ [kind in ElementKind]: { label: string, parameters: string[] } }} */
export const KINDS = {
  linearDiattenuator: { label: "linear diattenuator", parameters: ["transmittanceMax", "transmittanceMin", "axisDeg"] },
  linearRetarder: { label: "linear retarder", parameters: ["retardanceDeg", "axisDeg"] },
  circularRetarder: { label: "circular retarder", parameters: ["retardanceDeg"] },
  ellipticalRetarder: { label: "elliptical retarder", parameters: ["retardanceDeg", "azimuthDeg", "ellipticityDeg"] },
  ellipticalDiattenuator: { label: "elliptical diattenuator", parameters: ["transmittance", "diattenuation", "azimuthDeg", "ellipticityDeg"] },
  alignedDiattenuatingRetarder: { label: "diattenuating retarder", parameters: ["transmittance", "diattenuation", "retardanceDeg", "axisDeg"] },
  rotator: { label: "rotator", parameters: ["angleDeg"] },
  isotropicReflector: { label: "reflector", parameters: ["psiDeg", "deltaDeg", "reflectance", "planeDeg"] },
  fresnelReflection: { label: "reflecting surface", parameters: ["indexBefore", "indexAfter", "absorption", "incidenceDeg", "planeDeg"] },
  fresnelTransmission: { label: "transmitting surface", parameters: ["indexBefore", "indexAfter", "absorption", "incidenceDeg", "planeDeg"] },
  isotropicDepolarizer: { label: "isotropic depolarizer", parameters: ["alpha"] },
  diagonalDepolarizer: { label: "diagonal depolarizer", parameters: ["d1", "d2", "d3"] },
  measured: { label: "measured element", parameters: [] },
};

/**
 * What can be added, as it is asked for at a bench, with the values it comes with.
 * @type {{ title: string, entries: { name: string, label: string, kind: ElementKind, values: number[] }[] }[]}
 */
export const MENU = [
  {
    title: "Polarizers",
    entries: [
      { name: "polarizer", label: "Polarizer", kind: "linearDiattenuator", values: [1, 0, 0] },
      { name: "diattenuator", label: "Diattenuator, linear", kind: "linearDiattenuator", values: [0.9, 0.7, 0] },
      { name: "elliptical-diattenuator", label: "Diattenuator, elliptical", kind: "ellipticalDiattenuator", values: [1, 0.5, 0, 0] },
    ],
  },
  {
    title: "Retarders",
    entries: [
      { name: "quarter-wave", label: "Quarter-wave plate", kind: "linearRetarder", values: [90, 0] },
      { name: "half-wave", label: "Half-wave plate", kind: "linearRetarder", values: [180, 0] },
      { name: "retarder", label: "Retarder, linear", kind: "linearRetarder", values: [60, 0] },
      { name: "circular-retarder", label: "Retarder, circular", kind: "circularRetarder", values: [90] },
      { name: "elliptical-retarder", label: "Retarder, elliptical", kind: "ellipticalRetarder", values: [90, 0, 0] },
      { name: "rotator", label: "Rotator", kind: "rotator", values: [45] },
      { name: "film", label: "Diattenuating retarder (film, wave plate with loss)", kind: "alignedDiattenuatingRetarder", values: [1, 0, 60, 0] },
    ],
  },
  {
    title: "Surfaces",
    entries: [
      { name: "reflector", label: "Reflector by Ψ and Δ", kind: "isotropicReflector", values: [45, 180, 1, 0] },
      { name: "reflecting", label: "Reflection at a surface, by indices", kind: "fresnelReflection", values: [1, 1.5, 0, 45, 0] },
      { name: "transmitting", label: "Transmission through a surface, by indices", kind: "fresnelTransmission", values: [1, 1.5, 0, 45, 0] },
    ],
  },
  {
    title: "Depolarizers",
    entries: [
      { name: "depolarizer", label: "Depolarizer, isotropic", kind: "isotropicDepolarizer", values: [0.1] },
      { name: "diagonal-depolarizer", label: "Depolarizer, diagonal", kind: "diagonalDepolarizer", values: [0.9, 0.9, 0.8] },
    ],
  },
  { title: "Measured", entries: [{ name: "measured", label: "Measured matrix", kind: "measured", values: [] }] },
];

/** Sources that are asked for by name. @type {[name: string, label: string, stokes: Four][]} */
export const SOURCES = [
  ["unpolarized", "unpolarized", [1, 0, 0, 0]],
  ["s1", "linear, S1 > 0", [1, 1, 0, 0]],
  ["-s1", "linear, S1 < 0", [1, -1, 0, 0]],
  ["s2", "linear, S2 > 0", [1, 0, 1, 0]],
  ["-s2", "linear, S2 < 0", [1, 0, -1, 0]],
  ["s3", "circular, S3 > 0", [1, 0, 0, 1]],
  ["-s3", "circular, S3 < 0", [1, 0, 0, -1]],
];

/** @param {string} name */
export function parameterLabel(name) {
  const [label, unit] = PARAMETERS[name] ?? [name, ""];
  return { label, unit };
}

/**
 * What an element is called: its own label, else its kind.
 * @param {TrainElement | undefined} element
 */
export function titleOf(element) {
  return element ? element.label?.trim() || KINDS[element.kind].label : "element";
}

/**
 * A new element as the menu has it.
 * @param {string} name
 * @param {Measurement | null} measured what a measured one begins with
 * @returns {TrainElement | null}
 */
export function newElement(name, measured) {
  const entry = MENU.flatMap(({ entries }) => entries).find((one) => one.name === name);
  if (!entry) return null;
  if (entry.kind === "measured") return { kind: "measured", measurement: measured ?? { mueller: /** @type {any} */ (AIR), normalised: false, absolute: false, noise: { kind: "none" } } };
  const names = KINDS[entry.kind].parameters;
  return { kind: entry.kind, parameters: Object.fromEntries(names.map((parameter, k) => [parameter, { value: entry.values[k] ?? 0 }])) };
}

/**
 * The task's part of the blocks.
 * @param {{ [block: string]: unknown }} blocks
 * @returns {TrainWork}
 */
export function trainWorkOf(blocks) {
  const given = /** @type {import("../halfshade.js").Configuration} */ (blocks);
  const train = (given.train ?? []).map(completed);
  const { pre, post, removal, source } = given;
  return {
    train,
    source: source ?? [1, 1, 0, 0],
    before: sideOf(pre, train, (count) => train.slice(0, count)),
    behind: sideOf(post, train, (count) => train.slice(train.length - count)),
    reflection: removal?.reflection ?? false,
    direct: removal?.direct !== undefined && removal.direct !== null,
    typed: typeof blocks["trainTyped"] === "object" && blocks["trainTyped"] !== null ? /** @type {{ [field: string]: string }} */ (blocks["trainTyped"]) : {},
  };
}

/**
 * An element that is written in part, with what is missing.
 * @param {TrainElement} element
 * @returns {TrainElement}
 */
function completed(element) {
  if (element.kind === "measured") return element.measurement ? element : { ...element, measurement: /** @type {Measurement} */ (newElement("measured", null)?.measurement) };
  const given = element.parameters ?? {};
  const names = KINDS[element.kind].parameters;
  if (names.every((name) => given[name]?.value !== undefined || given[name]?.tie)) return element;
  const usual = MENU.flatMap(({ entries }) => entries).find((entry) => entry.kind === element.kind)?.values ?? [];
  return { ...element, parameters: Object.fromEntries(names.map((name, k) => [name, { value: usual[k] ?? 0, ...given[name] }])) };
}

/**
 * @param {Measurement | TrainElement[] | null | undefined} given
 * @param {TrainElement[]} train
 * @param {(count: number) => TrainElement[]} part
 * @returns {Side}
 */
function sideOf(given, train, part) {
  if (!given || (Array.isArray(given) && given.length === 0)) return { count: 0, given: null };
  const elements = Array.isArray(given) ? given : [/** @type {TrainElement} */ ({ kind: "measured", measurement: given })];
  const count = elements.length;
  const isPart = count <= train.length && part(count).every((element, k) => isSame(bare(known(element, train)), bare(elements[k])));
  return isPart ? { count, given: null } : { count: 0, given };
}

/** What an element is in the beam, without its name. @param {TrainElement | undefined} element */
function bare(element) {
  const { label: _, ...rest } = element ?? {};
  return rest;
}

/**
 * The blocks for a state of the task.
 * @param {TrainWork} work
 * @returns {{ [block: string]: unknown }}
 */
export function blocksOf({ train, source, before, behind, reflection, direct, typed }) {
  const removal = { ...(reflection ? { reflection } : {}), ...(direct ? { direct: AIR } : {}) };
  const ends = sidesOf({ train, before, behind });
  return {
    train: train.length > 0 ? train : undefined,
    source: train.length > 0 || !isSame(source, [1, 1, 0, 0]) ? source : undefined,
    pre: ends.pre ?? undefined,
    post: ends.post ?? undefined,
    removal: Object.keys(removal).length > 0 ? removal : undefined,
    trainTyped: Object.keys(typed).length > 0 ? typed : undefined,
  };
}

/**
 * The optics before and behind the sample, with all their values fixed.
 * @param {Pick<TrainWork, "train" | "before" | "behind">} work
 * @returns {{ pre: Measurement | TrainElement[] | null, post: Measurement | TrainElement[] | null }}
 */
export function sidesOf({ train, before, behind }) {
  const first = train.slice(0, before.count).map((element) => known(element, train));
  const last = behind.count > 0 ? train.slice(-behind.count).map((element) => known(element, train)) : [];
  return { pre: before.given ?? (first.length > 0 ? first : null), post: behind.given ?? (last.length > 0 ? last : null) };
}

/**
 * An element whose parameters all have their present values for good.
 * @param {TrainElement} element
 * @param {TrainElement[]} train
 * @returns {TrainElement}
 */
function known(element, train) {
  if (!element.parameters) return element;
  return { ...element, parameters: Object.fromEntries(Object.entries(element.parameters).map(([name, parameter]) => [name, { value: valueOf(parameter, train) }])) };
}

/**
 * The present value of a parameter, through what it is tied to.
 * @param {TrainParameter | undefined} parameter
 * @param {TrainElement[]} train
 * @param {number} [depth]
 * @returns {number}
 */
export function valueOf(parameter, train, depth = 0) {
  const tie = parameter?.tie;
  // A circle of ties is refused by the engine; here it only has to end.
  if (!tie || depth > train.length * 5) return parameter?.value ?? 0;
  return (tie.factor ?? 1) * valueOf(train[tie.element]?.parameters?.[tie.name], train, depth + 1) + (tie.offset ?? 0);
}

/**
 * The elements in another order: `order` has their former places; ties, texts and the
 * ends of the sample follow.
 * @param {TrainWork} work
 * @param {number[]} order a place twice is a duplicate; one that is missing is gone
 * @returns {TrainWork}
 */
export function rearranged(work, order) {
  const train = order.map((from, to) => {
    const element = /** @type {TrainElement} */ (work.train[from]);
    if (!element.parameters) return element;
    const isCopy = order.indexOf(from) !== to;
    const parameters = Object.entries(element.parameters).map(([name, parameter]) => {
      const { tie, ...rest } = parameter;
      if (!tie) return [name, parameter];
      // A tie within an element stays within its copy.
      const place = isCopy && tie.element === from ? to : order.indexOf(tie.element);
      return [name, place < 0 ? { ...rest, value: valueOf(parameter, work.train) } : { ...rest, tie: { ...tie, element: place } }];
    });
    return { ...element, parameters: Object.fromEntries(parameters) };
  });
  /** @type {{ [field: string]: string }} */
  const typed = {};
  for (const [field, text] of Object.entries(work.typed)) {
    const [place = "", ...rest] = field.split(".");
    if (place === "source") typed[field] = text;
    else if (order.includes(Number(place))) typed[[order.indexOf(Number(place)), ...rest].join(".")] = text;
  }
  return { ...work, train, typed, before: shortened(work.before, train.length), behind: shortened(work.behind, train.length) };
}

/**
 * @param {Side} side
 * @param {number} length
 * @returns {Side}
 */
function shortened(side, length) {
  return { ...side, count: Math.min(side.count, length) };
}

/**
 * With one element changed.
 * @param {TrainWork} work
 * @param {number} place
 * @param {Partial<TrainElement>} part
 * @returns {TrainWork}
 */
export function withElement(work, place, part) {
  return { ...work, train: work.train.map((element, k) => (k === place ? { ...element, ...part } : element)) };
}

/**
 * With one parameter changed.
 * @param {TrainWork} work
 * @param {number} place
 * @param {string} name
 * @param {TrainParameter} parameter
 */
export function withParameter(work, place, name, parameter) {
  return withElement(work, place, { parameters: { ...work.train[place]?.parameters, [name]: parameter } });
}

/**
 * With the values of a fit in its free parameters.
 * @param {TrainWork} work
 * @param {{ element: number, name: string, value: number }[]} fitted
 */
export function withValues(work, fitted) {
  const typed = { ...work.typed };
  let next = work;
  for (const { element, name, value } of fitted) {
    next = withParameter(next, element, name, { ...next.train[element]?.parameters?.[name], value });
    delete typed[`${element}.${name}.value`];
  }
  return { ...next, typed };
}

/**
 * The problem that a fit solves: where its search starts is no part of it.
 * @param {TrainElement[]} train
 */
export function problemOf(train) {
  return JSON.stringify(train, (_, value) => (value !== null && typeof value === "object" && value.free === true ? { ...value, value: null } : value));
}

/**
 * The parameters that another one can be tied to.
 * @param {TrainElement[]} train
 * @param {number} place
 * @param {string} own
 * @returns {[key: string, words: string][]}
 */
export function tieTargets(train, place, own) {
  return train.flatMap((element, k) =>
    Object.entries(element.parameters ?? {})
      .filter(([name, { tie }]) => !tie && !(k === place && name === own))
      .map(([name]) => /** @type {[string, string]} */ ([`${k}.${name}`, `${parameterLabel(name).label} of ${k + 1} ${titleOf(element)}`])),
  );
}

/**
 * The task as JSON, for another program or another page.
 * @param {TrainWork} work
 */
export function exportedTrain(work) {
  const { trainTyped: _, ...blocks } = blocksOf(work);
  return `${JSON.stringify(blocks, null, 2)}\n`;
}

/**
 * What a pasted text holds of a train: a list of elements, or blocks with one.
 * @param {string} text
 * @returns {{ [block: string]: unknown } | null} null where it is something else
 */
export function trainIn(text) {
  if (!/^\uFEFF?\s*[[{]/.test(text) || !/"kind"\s*:/.test(text)) return null;
  /** @type {unknown} */
  let given;
  try {
    given = JSON.parse(text.replace(/^\uFEFF/, ""));
  } catch {
    return null;
  }
  const blocks = Array.isArray(given) ? { train: given } : /** @type {{ [block: string]: unknown }} */ (given);
  if (!Array.isArray(blocks["train"])) return null;
  return Object.fromEntries(TRAIN_BLOCKS.filter((block) => block !== "trainTyped" && blocks[block] !== undefined).map((block) => [block, blocks[block]]));
}

/**
 * The text of a matrix, as a field shows it.
 * @param {Measurement | undefined} measurement
 */
export function matrixLines(measurement) {
  const mueller = measurement?.mueller ?? [];
  return [0, 4, 8, 12].map((first) => mueller.slice(first, first + 4).map((value) => fullText(value)).join("  ")).join("\n");
}

/**
 * Whether two plain values say the same; members that are undefined do not count.
 * @param {any} one
 * @param {any} other
 * @returns {boolean}
 */
export function isSame(one, other) {
  if (one === null || other === null || typeof one !== "object" || typeof other !== "object") return Object.is(one, other);
  const names = new Set([...Object.keys(one), ...Object.keys(other)]);
  return Array.isArray(one) === Array.isArray(other) && [...names].every((name) => isSame(one[name], other[name]));
}
