/** Work and view as the configuration that a link holds, and back. Pure. */
import { fullText, tableOf } from "./format.js";
import { meanOf } from "./mean.js";
import { typedOf } from "./instrument.js";
import { repeatsNoise } from "./noise.js";
import { noMeasurement, usualConvention, usualView } from "./state.js";

/**
 * @typedef {import("./types.js").Work} Work
 * @typedef {import("./types.js").View} View
 * @typedef {import("./types.js").Request} Request
 * @typedef {import("./types.js").Parsed} Parsed
 * @typedef {import("./types.js").ReadOptions} ReadOptions
 * @typedef {{ v: number, [block: string]: any }} Configuration
 */

/** The blocks that say what was measured and how it is shown. */
const OWN = new Set(["v", "app", "task", "label", "measurement", "compareWith", "series", "dataFile", "examine", "view"]);

/** In a view all values are numbers. */
const RETARDANCE_UNITS = /** @type {const} */ (["deg", "waves", "nm"]);

/**
 * @param {Work} work
 * @param {View} view
 * @param {Request | null} request the measured matrix as the engine gets it; null where there is none
 * @param {boolean} textHolds whether the text says the same as the cells
 * @param {string} app version of the engine
 * @returns {Configuration}
 */
export function configurationOf(work, view, request, textHolds, app) {
  const { measurement } = work;
  const head = { ...work.blocks, v: 1, app, task: view.task, ...(measurement.label ? { label: measurement.label } : {}) };
  const tail = {
    examine: work.examine,
    view: {
      azimuthDeg: view.azimuthDeg,
      elevationDeg: view.elevationDeg,
      firstIndex: view.firstIndex,
      retardanceUnit: RETARDANCE_UNITS.indexOf(view.retardanceUnit),
      wavelengthNm: view.wavelengthNm,
    },
  };
  if (!request) return { ...head, ...tail };
  const measured = { normalised: request.normalised, absolute: request.absolute, convention: request.convention, noise: request.noise };
  const { many } = measurement;
  const second = many?.use === "pair" ? many.matrices[1] : undefined;
  return {
    ...head,
    measurement: {
      mueller: request.noise.kind === "replicates" ? null : request.mueller,
      ...measured,
      ...(textHolds && measurement.text ? { text: measurement.text } : {}),
      ...(measurement.example ? { example: true } : {}),
    },
    ...(second ? { compareWith: { mueller: second, ...measured } } : {}),
    ...(many && request.noise.kind !== "replicates" ? { series: seriesOf(many, textHolds) } : {}),
    ...(many?.source ? { dataFile: { name: many.source, sha256: many.sha256 } } : {}),
    ...tail,
  };
}

/**
 * The same with the shown matrix alone, where all of them are too much for a link.
 * @param {Configuration} configuration
 * @returns {Configuration}
 */
export function withoutSeries({ series, measurement, ...rest }) {
  if (!measurement) return rest;
  const { text, ...measured } = measurement;
  return { ...rest, measurement: measured };
}

/**
 * Several matrices: in full where the text does not hold them already.
 * @param {import("./types.js").Many} many
 * @param {boolean} textHolds
 */
function seriesOf({ use, matrices, labels, coordinates, source }, textHolds) {
  if (textHolds && source === "" && use !== "repeats") return { use };
  return {
    use,
    matrices,
    ...(labels.some((label) => label !== null) ? { labels: labels.map((label) => label ?? "") } : {}),
    ...(coordinates.every((coordinate) => coordinate !== null) ? { coordinates } : {}),
  };
}

/**
 * @param {Configuration} configuration as the engine decoded and checked it
 * @param {View} before
 * @param {(text: string, options: ReadOptions) => Parsed} parse
 * @returns {{ work: Work, view: View }}
 */
export function fromConfiguration(configuration, before, parse) {
  /** @type {{ [block: string]: unknown }} */
  const blocks = {};
  for (const [block, value] of Object.entries(configuration)) {
    if (!OWN.has(block)) blocks[block] = value;
  }
  const examine = configuration.examine ?? {};
  const view = configuration.view ?? {};
  return {
    work: {
      measurement: measurementOf(configuration, parse),
      examine: { draws: examine.draws ?? 2000, seed: examine.seed ?? 1 },
      blocks,
    },
    view: {
      ...before,
      task: typeof configuration.task === "string" ? configuration.task : usualView().task,
      azimuthDeg: view.azimuthDeg ?? before.azimuthDeg,
      elevationDeg: view.elevationDeg ?? before.elevationDeg,
      firstIndex: (view.firstIndex ?? before.firstIndex) === 1 ? 1 : 0,
      retardanceUnit: RETARDANCE_UNITS[view.retardanceUnit] ?? before.retardanceUnit,
      wavelengthNm: view.wavelengthNm > 0 ? view.wavelengthNm : before.wavelengthNm,
    },
  };
}

/**
 * @param {Configuration} configuration
 * @param {(text: string, options: ReadOptions) => Parsed} parse
 * @returns {import("./types.js").Measurement}
 */
function measurementOf(configuration, parse) {
  const given = configuration.measurement;
  if (!given) return noMeasurement();
  const { systematic, ...noise } = given.noise ?? { kind: "none" };
  const repeats = noise.kind === "replicates" ? meanOf(noise.matrices, given.normalised ?? false) : null;
  if (!repeats && !Array.isArray(given.mueller)) return noMeasurement();
  /** @type {number[]} */
  const mueller = repeats?.mean ?? given.mueller;
  const read = readAgain(given.text ?? "", mueller, parse);
  const decimals = noise.kind === "rounding" ? noise.decimals : (read?.decimals ?? null);
  const cells = mueller.map((value) => fullText(value, decimals));
  return {
    ...noMeasurement(),
    cells,
    text: read ? given.text : textOf(cells),
    options: read?.options ?? {},
    pick: read?.pick ?? 0,
    decimals,
    normalised: given.normalised ?? false,
    absolute: given.absolute ?? false,
    convention: { ...usualConvention(), ...given.convention },
    noise: repeats ? repeatsNoise(noise.matrices, repeats.sigma) : noiseChoice(noise),
    instrument: typedOf(systematic),
    example: given.example ?? false,
    label: configuration.label ?? "",
    many: manyOf(configuration, read?.matrices ?? []),
  };
}

/**
 * The several matrices that a configuration holds or its text gives.
 * @param {Configuration} configuration
 * @param {Parsed["matrices"]} read from its text
 * @returns {import("./types.js").Many | null}
 */
function manyOf({ series, compareWith, measurement, dataFile }, read) {
  if (measurement.noise?.kind === "replicates") {
    const { matrices } = measurement.noise;
    const nothing = matrices.map(() => null);
    return { use: "repeats", matrices, labels: nothing, coordinates: nothing, source: dataFile?.name ?? "", sha256: dataFile?.sha256 ?? "" };
  }
  const matrices = series?.matrices ?? (compareWith && read.length !== 2 ? [measurement.mueller, compareWith.mueller] : read.map((matrix) => matrix.mueller));
  if (matrices.length < 2) return null;
  const inText = !series?.matrices;
  return {
    use: series?.use ?? (compareWith ? "pair" : "pick"),
    matrices,
    labels: series?.labels ?? matrices.map((/** @type {unknown} */ _, /** @type {number} */ k) => (inText ? (read[k]?.label ?? null) : null)),
    coordinates: series?.coordinates ?? matrices.map((/** @type {unknown} */ _, /** @type {number} */ k) => (inText ? (read[k]?.coordinate ?? null) : null)),
    source: dataFile?.name ?? "",
    sha256: dataFile?.sha256 ?? "",
  };
}

/**
 * Sixteen cells as a table.
 * @param {string[]} cells
 */
export function textOf(cells) {
  if (cells.every((cell) => cell === "")) return "";
  return [0, 4, 8, 12].map((first) => cells.slice(first, first + 4).join("\t")).join("\n");
}

/**
 * @param {any} noise
 * @returns {import("./types.js").NoiseChoice}
 */
export function noiseChoice(noise) {
  if (noise.kind === "none" || noise.kind === "rounding") return { kind: noise.kind, sigma: "", given: null };
  if (noise.kind === "uniform") return { kind: "uniform", sigma: fullText(noise.sigma), given: null };
  if (noise.kind === "relative") return { kind: "relative", sigma: fullText(Number((100 * noise.fraction).toPrecision(12))), given: noise };
  if (noise.kind === "perElement") return { kind: "perElement", sigma: tableOf(noise.sigma, 4), given: noise };
  if (noise.kind === "covariance") return { kind: "covariance", sigma: tableOf(noise.covariance, 16), given: noise };
  return { kind: "other", sigma: "", given: noise };
}

/**
 * How the text has to be read to give exactly this matrix.
 * @param {string} text
 * @param {number[]} mueller
 * @param {(text: string, options: ReadOptions) => Parsed} parse
 */
function readAgain(text, mueller, parse) {
  if (text === "") return null;
  /** @type {ReadOptions[]} */
  const ways = [{}, { decimal: "point" }, { decimal: "comma" }];
  for (const options of ways) {
    try {
      const { matrices } = parse(text, options);
      const pick = matrices.findIndex((matrix) => matrix.mueller.every((value, index) => Object.is(value, mueller[index])));
      if (pick >= 0) return { options, pick, decimals: matrices[pick]?.decimals ?? null, matrices };
    } catch {
      // This way of reading does not fit; the next may.
    }
  }
  return null;
}
