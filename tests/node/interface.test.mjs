// Every exported function, called as a notebook in Node would: with good and with
// bad requests. Physical expectations carry their source; the numbers in depth are
// the business of the native tests.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { test } from "node:test";

import * as typed from "../../dist/halfshade.js";

/** Without its types: much of this is calling it wrongly. @type {any} */
const engine = typed;

typed.initSync({ module: readFileSync(new URL("../../dist/halfshade_bg.wasm", import.meta.url)) });

/** An invented kelp film. */
const FILM = [
  0.955, 0.0226, 0.0327, 0.0038, 0.019, 0.6733, 0.254, -0.6306, 0.0297, 0.25, 0.7353, 0.5698, 0.0003, 0.6339, -0.5648,
  0.4469,
];
const IDENTITY = [1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1];
/** Fast axis at 30° counter-clockwise from x, facing the source; a quarter wave. */
const QUARTER_WAVE = (() => {
  const [c, s] = [Math.cos(Math.PI / 3), Math.sin(Math.PI / 3)];
  // Reference section 0, the form that Hecht, Optics, problem 8.82 has: seen.
  return [1, 0, 0, 0, 0, c * c, c * s, -s, 0, c * s, s * s, c, 0, s, -c, 0];
})();
const CONVENTIONS = ["counterclockwise", "clockwise"].flatMap((angles) =>
  ["clockwise", "counterclockwise"].flatMap((positiveS3) =>
    ["x", "y"].flatMap((zeroAngle) =>
      ["plus", "minus"].map((time) => ({ angles, positiveS3, zeroAngle, time, order: "rows" })),
    ),
  ),
);

/**
 * @param {() => unknown} call
 * @param {string} code
 * @param {unknown} [at]
 */
function refuses(call, code, at) {
  assert.throws(call, (/** @type {any} */ error) => {
    assert.ok(error instanceof Error);
    assert.equal(/** @type {any} */ (error).code, code, error.message);
    assert.match(error.message, /[.?]$/, "a sentence");
    if (at !== undefined) assert.deepEqual(/** @type {any} */ (error).at, at);
    return true;
  });
}

/** @param {unknown} value @param {string} path */
function finite(value, path = "result") {
  if (typeof value === "number") assert.ok(Number.isFinite(value), `${path} is ${value}`);
  else assert.notEqual(value, undefined, path);
  if (value !== null && typeof value === "object") {
    for (const [key, item] of Object.entries(value)) finite(item, `${path}.${key}`);
  }
}

/** @param {number | null | undefined} actual @param {number} expected @param {number} tolerance */
function close(actual, expected, tolerance = 1e-9) {
  assert.ok(typeof actual === "number" && Math.abs(actual - expected) <= tolerance, `${actual} is not ${expected}`);
}

test("engineInfo", () => {
  const info = engine.engineInfo();
  assert.match(info.version, /^\d+\.\d+\.\d+$/);
  assert.equal(info.schema, 1);
  assert.ok(info.blocks.includes("measurement"));
});

test("examine gives the whole result, with null and a reason where nothing is determined", () => {
  const plain = engine.examine({ mueller: FILM, noise: { kind: "uniform", sigma: 0.004 } });
  finite(plain);
  assert.equal(plain.realizability.verdict, "withinNoise");
  assert.equal(plain.realizability.simulations, 999);
  assert.equal(plain.decompositions.spectral.length, 4);
  const figures = Object.values(plain.figures);
  assert.equal(figures.length, 24);
  for (const figure of figures) assert.ok(figure.low !== null || figure.reason !== null);

  const quick = engine.examine({ mueller: FILM, noise: { kind: "uniform", sigma: 0.004 }, draws: 0 });
  assert.equal(quick.realizability.pValue, null);
  assert.notEqual(quick.realizability.reason, null);
  assert.equal(quick.realizability.verdict, "notRealizable");
  assert.deepEqual(quick.nearest.mueller, plain.nearest.mueller);

  for (const mueller of [Array(16).fill(0), IDENTITY.map((v) => -v), IDENTITY.map((v, k) => (k === 0 ? 0 : v))]) {
    const found = engine.examine({ mueller, normalised: true });
    finite(found);
    assert.equal(found.figures.diattenuation.value, null);
    assert.notEqual(found.figures.diattenuation.reason, null);
  }
});

test("the same request gives the same digits", () => {
  const request = { mueller: FILM, noise: { kind: "rounding", decimals: 4 }, seed: 12 };
  assert.deepEqual(engine.examine(request), engine.examine(request));
});

test("examine refuses, naming the field", () => {
  assert.deepEqual(engine.examine({ mueller: new Float64Array(FILM) }), engine.examine({ mueller: FILM }));
  refuses(() => engine.examine({ mueller: FILM.slice(1) }), "bad-request", { field: "mueller" });
  refuses(() => engine.examine({}), "missing-field");
  refuses(() => engine.examine({ mueller: FILM, sigma: 1 }), "unknown-field", { field: "sigma" });
  refuses(() => engine.examine({ mueller: FILM.with(3, Number.NaN) }), "not-finite", { field: "mueller[3]" });
  refuses(() => engine.examine({ mueller: FILM.with(2, 1e200) }), "too-large", { field: "mueller[2]" });
  refuses(() => engine.examine({ mueller: /** @type {any[]} */ (FILM).with(0, "1") }), "bad-request", { field: "mueller[0]" });
  refuses(() => engine.examine({ mueller: FILM, noise: { kind: "uniform", sigma: 0 } }), "bad-sigma");
  refuses(() => engine.examine({ mueller: FILM, noise: { kind: "uniform" } }), "missing-field");
  refuses(() => engine.examine({ mueller: FILM, noise: { kind: "shot" } }), "unknown-choice");
  refuses(() => engine.examine({ mueller: FILM, noise: { kind: "rounding", decimals: 99 } }), "bad-decimals");
  refuses(() => engine.examine({ mueller: FILM, convention: { angles: "left" } }), "unknown-choice");
  refuses(() => engine.examine({ mueller: FILM, seed: -1 }), "bad-request", { field: "seed" });
  refuses(() => engine.examine(/** @type {any} */ (null)), "missing-field");
  refuses(() => engine.examine(/** @type {any} */ (5)), "bad-request");
});

// Physical facts, as each person writes them. Source: derived from physics of the
// element (fast axis at 30°), not from the conversion formulas.
test("an element comes back as the person would write it, in all sixteen conventions", () => {
  for (const convention of CONVENTIONS) {
    const clockwise = convention.angles === "clockwise";
    const fromY = convention.zeroAngle === "y";
    const fromZero = 30 - (fromY ? 90 : 0);
    const read = (((clockwise ? -fromZero : fromZero) % 180) + 180) % 180;
    // The person's own numbers: S1, S2 by their angles, S3 by their sense.
    const k = [1, fromY ? -1 : 1, (clockwise ? -1 : 1) * (fromY ? -1 : 1), convention.positiveS3 === "clockwise" ? 1 : -1];
    const mueller = QUARTER_WAVE.map((v, n) => v * (k[n >> 2] ?? NaN) * (k[n & 3] ?? NaN));
    const found = engine.examine({ mueller, convention, draws: 0 });
    close(found.figures.retardanceDeg.value, 90);
    close(found.figures.fastAxisDeg.value, read);
    const axis = found.decompositions.polarForward?.retarderAxis;
    close(axis?.[0], Math.cos((read * Math.PI) / 90));
    close(axis?.[1], Math.sin((read * Math.PI) / 90));
    mueller.forEach((v, n) => close(found.nearest.mueller[n], v, 1e-12));
    const logarithm = found.decompositions.differential;
    close(logarithm?.linearBirefringence, (Math.PI / 2) * Math.cos((read * Math.PI) / 90));
    close(logarithm?.linearBirefringence45, (Math.PI / 2) * Math.sin((read * Math.PI) / 90));
    close(logarithm?.circularBirefringence, 0);
    close(found.decompositions.characteristic[0]?.weight, 1);
    mueller.forEach((v, n) => close(found.decompositions.characteristic[0]?.mueller[n], v));

    const byColumns = mueller.map((_, n) => mueller[4 * (n & 3) + (n >> 2)]);
    const same = engine.examine({ mueller: byColumns, convention: { ...convention, order: "columns" }, draws: 0 });
    assert.deepEqual(same, found);
  }
});

test("circular diattenuation keeps its sense", () => {
  // Transmits clockwise light (facing the source) better.
  const mueller = [0.75, 0, 0, 0.25, 0, 0.7, 0, 0, 0, 0, 0.7, 0, 0.25, 0, 0, 0.75];
  const theirs = mueller.map((v, n) => (n % 4 === 3) !== (n >> 2 === 3) ? -v : v);
  close(engine.examine({ mueller }).figures.circularDiattenuation.value, 1 / 3);
  const other = engine.examine({ mueller: theirs, convention: { positiveS3: "counterclockwise" } });
  close(other.figures.circularDiattenuation.value, -1 / 3);
  close(other.decompositions.differential?.circularDichroism, -Math.atanh(1 / 3));
});

test("a half-wave retarder has no principal logarithm, and says why", () => {
  const mueller = IDENTITY.map((v, k) => (k === 10 || k === 15 ? -v : v));
  const found = engine.examine({ mueller }).decompositions.differential;
  assert.equal(found?.mean, null);
  assert.equal(found?.linearBirefringence, null);
  assert.match(found?.reason ?? "", /negative/);
});

test("passivity of absolute matrices only", () => {
  // m00 (1 + D) ≤ 1 (San José & Gil 2020): from memory; D = 0.5 allows 2/3, recomputed.
  const gain = [0.7, 0.35, 0, 0, 0.35, 0.7, 0, 0, 0, 0, 0.6, 0, 0, 0, 0, 0.6];
  assert.equal(engine.examine({ mueller: gain }).realizability.passivity, null);
  const found = engine.examine({ mueller: gain, absolute: true }).realizability.passivity;
  assert.equal(found?.verdict, "notPassive");
  close(found?.margin.value, 0.05);
  const noisy = { mueller: gain, absolute: true, noise: { kind: "uniform", sigma: 0.05 } };
  assert.equal(engine.examine(noisy).realizability.passivity?.verdict, "notBeyondNoise");
});

test("formatValue", () => {
  assert.deepEqual(engine.formatValue({ value: -0.0038, se: 0.00206 }), { text: "\u22120.0038(21)", plain: "-0.0038(21)" });
  assert.equal(engine.formatValue({ value: 0.5 }).plain, "0.5");
  assert.equal(engine.formatValue({ value: 0.5, se: null }).plain, "0.5");
  refuses(() => engine.formatValue({ value: Number.POSITIVE_INFINITY }), "not-finite");
  refuses(() => engine.formatValue({ value: 1, se: -1 }), "bad-sigma");
  refuses(() => engine.formatValue({ value: 1, digits: 2 }), "unknown-field");
});

test("parseMatrices", () => {
  const text = "0,955;0,0226;0,0327;0,0038\r\n0,019;0,6733;0,254;-0,6306\r\n0,0297;0,25;0,7353;0,5698\r\n0,0003;0,6339;-0,5648;0,4469\r\n";
  const read = engine.parseMatrices(text, {});
  finite(read);
  assert.deepEqual(read.matrices.map((/** @type {any} */ one) => one.mueller), [FILM]);
  assert.equal(read.matrices[0].decimals, 4);
  assert.equal(read.reading.decimalChar, ",");
  assert.deepEqual(engine.parseMatrices(JSON.stringify(FILM), undefined).matrices[0].mueller, FILM);
  refuses(() => engine.parseMatrices("", {}), "no-numbers");
  assert.throws(
    () => engine.parseMatrices("1 0 0 0\n0 1 0 0\n0 0 x 0\n0 0 0 1\n", {}),
    (/** @type {any} */ error) => error.at.line === 3 && error.at.character === 5,
  );
  refuses(() => engine.parseMatrices("1", { decimal: "dot" }), "unknown-choice");
});

test("a link holds every bit of every number, and blocks that this version does not know", () => {
  const mueller = FILM.with(5, -0).with(6, 5e-324).with(7, 1.7976931348623157e308).with(8, 0.1 + 0.2);
  const configuration = {
    v: 1,
    app: "0.1.0",
    task: "properties",
    label: "kelp, α ≈ 0.1",
    measurement: {
      mueller,
      normalised: false,
      absolute: true,
      convention: CONVENTIONS[5],
      noise: { kind: "uniform", sigma: 0.004 },
      text: "1\t2\n",
      example: false,
    },
    examine: { draws: 2000, seed: 1 },
    view: { azimuthDeg: -30, elevationDeg: 20.5 },
    futureBlock: { nested: [1, { deep: "yes" }, null, true] },
  };
  const fragment = engine.encodeLink(configuration);
  assert.match(fragment, /^v1\.[A-Za-z0-9_-]+\.[a-z0-9]{7}$/);
  const back = engine.decodeLink(`#${fragment}`);
  assert.deepEqual(back, configuration);
  /** @type {any} */ (back).measurement.mueller.forEach((/** @type {number} */ v, /** @type {number} */ k) => assert.ok(Object.is(v, mueller[k])));
  assert.equal(engine.encodeLink(back), fragment);

  refuses(() => engine.decodeLink(fragment.slice(0, -3)), "link-truncated");
  refuses(() => engine.decodeLink(fragment.slice(0, fragment.length >> 1)), "link-truncated");
  refuses(() => engine.decodeLink(fragment.replace(/^v1/, "v2")), "link-newer");
  refuses(() => engine.decodeLink(""), "link-empty");
  refuses(() => engine.encodeLink({ v: 1, measurement: { mueller: mueller.with(0, Number.NaN) } }), "not-finite", { field: "measurement.mueller[0]" });
  refuses(() => engine.encodeLink({ v: 1, measurement: { mueller, normalized: true } }), "unknown-field", { field: "measurement.normalized" });
  refuses(() => engine.encodeLink({ v: 2 }), "link-newer");
  refuses(() => engine.encodeLink(/** @type {any} */ ({ v: 1, call: () => 1 })), "bad-request", { field: "call" });
  /** @type {any} */
  const cycle = { v: 1 };
  cycle.self = cycle;
  refuses(() => engine.encodeLink(cycle), "bad-request");
  const thrower = { v: 1, get label() { throw new Error("mine"); } };
  refuses(() => engine.encodeLink(thrower), "bad-request", { field: "label" });
  refuses(() => engine.encodeLink(new Proxy({}, { ownKeys: () => { throw new Error("mine"); } })), "bad-request");
  for (const odd of [10n, Symbol("s"), [1, , 2]]) refuses(() => engine.encodeLink({ v: 1, odd }), "bad-request");
});

test("plots as SVG, the same code as on the canvas", () => {
  const frame = { width: 600 };
  for (const theme of ["light", "dark", "print"]) {
    const eigenvalues = engine.eigenvaluesSvg({ eigenvalues: [1, 0.1, 0, -0.1], eigenvalueSe: [0.1, 0.1, 0.1, 0.1], frame: { ...frame, theme } });
    const sphere = engine.sphereSvg({ mueller: FILM, azimuthDeg: -55, elevationDeg: 22, frame: { ...frame, theme } });
    const ellipses = engine.ellipsesSvg({ mueller: FILM, frame: { ...frame, theme } });
    for (const svg of [eigenvalues, sphere, ellipses]) {
      assert.match(svg, /^<svg|^<\?xml/);
      assert.match(svg, /<title>/);
    }
  }
  refuses(() => engine.eigenvaluesSvg({ eigenvalues: [1, 0, 0, Number.NaN], frame }), "not-finite");
  refuses(() => engine.sphereSvg({ mueller: Array(16).fill(0), azimuthDeg: 0, elevationDeg: 0, frame }), "no-intensity");
  refuses(() => engine.ellipsesSvg({ mueller: FILM, frame: { width: 1e9 } }), "plot-size");
  refuses(() => engine.ellipsesSvg({ mueller: FILM, frame, colour: 1 }), "unknown-field");
  refuses(() => engine.eigenvaluesSvg({ eigenvalues: [1], frame }), "bad-request");
  // The canvas forms need a browser's canvas, and say so instead of trapping.
  for (const draw of [engine.drawEigenvalues, engine.drawSphere, engine.drawEllipses]) {
    assert.throws(() => draw(/** @type {any} */ ({}), /** @type {any} */ ({})));
  }
  assert.equal(engine.formatValue({ value: 1 }).plain, "1", "the engine still answers");
});
