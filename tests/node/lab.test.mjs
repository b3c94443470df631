// The functions beside the examination, good calls and bad ones: files, output forms, causes,
// comparisons, states, saved configurations.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { test } from "node:test";
import * as engine from "../../dist/halfshade.js";

engine.initSync({ module: readFileSync(new URL("../../dist/halfshade_bg.wasm", import.meta.url)) });

const FILES = new URL("../samples/files/", import.meta.url);
// An invented kelp film.
const FILM = [0.955, 0.0226, 0.0327, 0.0038, 0.019, 0.6733, 0.254, -0.6306, 0.0297, 0.25, 0.7353, 0.5698, 0.0003, 0.6339, -0.5648, 0.4469];
const NOISE = /** @type {const} */ ({ kind: "uniform", sigma: 0.004 });

/** @param {() => unknown} call @param {string} code @param {RegExp} [field] */
function refuses(call, code, field) {
  assert.throws(call, (error) => {
    const { code: found, at, message } = /** @type {{ code: string, at: { field?: string } | null, message: string }} */ (error);
    assert.equal(found, code, message);
    if (field) assert.match(at?.field ?? "", field);
    assert.ok(error instanceof Error && message.length > 10);
    return true;
  });
}

test("parseFile and fileText", () => {
  const expected = JSON.parse(readFileSync(new URL("expected.json", FILES), "utf8"));
  for (const name of ["stack.npy", "utf16le.txt", "cp1252.csv"]) {
    const bytes = readFileSync(new URL(name, FILES));
    const read = engine.parseFile(bytes, undefined);
    assert.deepEqual(read.matrices.map(({ mueller }) => mueller), expected[name]);
  }
  assert.match(engine.fileText(readFileSync(new URL("cp1252.csv", FILES))), /^µ-Film – A/);
  const bytes = readFileSync(new URL("stack.npy", FILES));
  assert.equal(engine.parseFile(bytes, { stacking: "first" }).reading.stacking, "first");
  refuses(() => engine.parseFile(bytes.subarray(0, 90), undefined), "bad-file");
  refuses(() => engine.parseFile(bytes, /** @type {any} */ ({ stacking: "middle" })), "unknown-choice", /stacking/);
  refuses(() => engine.fileText(new Uint8Array([0x50, 0x4b, 3, 4, 0, 0, 1])), "form-not-read");
});

test("exportText reads back by parseMatrices in every form", () => {
  for (const form of /** @type {const} */ (["tsv", "csv", "csvEuropean", "json", "latex", "python", "matlab"])) {
    const text = engine.exportText({ form, title: "a film", matrices: [{ name: "film", mueller: FILM }] });
    assert.deepEqual(engine.parseMatrices(text, undefined).matrices[0]?.mueller, FILM, form);
  }
  const table = { name: "t", columns: [{ name: "x", unit: "deg", values: [1, null, "a"] }] };
  assert.equal(engine.exportText({ form: "tsv", tables: [table] }), "# t\nx (deg)\n1\n\"\"\na\n");
  refuses(() => engine.exportText({ form: "tsv" }), "bad-request");
  refuses(() => engine.exportText(/** @type {any} */ ({ form: "paper", tables: [table] })), "unknown-choice", /form/);
  refuses(() => engine.exportText({ form: "csv", matrices: [{ name: "m", mueller: [1] }] }), "bad-request", /matrices\[0\]\.mueller/);
  refuses(() => engine.exportText(/** @type {any} */ ({ form: "csv", tables: [{ name: "t", columns: [{ name: "x", values: [{}] }] }] })), "bad-request", /values\[0\]/);
});

test("diagnose finds a mirror, and compare a difference", () => {
  const mirrored = FILM.map((value, k) => (k >= 12 ? -value : value));
  const { causes, mirrorVisible } = engine.diagnose({ mueller: mirrored, noise: NOISE });
  const mirror = causes.find(({ cause }) => cause === "mirror-one-side");
  assert.ok(mirror && mirror.pValue >= 0.05 && mirrorVisible);
  assert.equal(mirror.candidates?.length, 14);
  mirror.mueller.forEach((value, k) => assert.ok(Math.abs(value - (FILM[k] ?? 0)) < 1e-12));
  assert.deepEqual(engine.diagnose({ mueller: FILM, noise: NOISE }).causes, []);
  refuses(() => engine.diagnose({ mueller: [1] }), "bad-request", /mueller/);

  const same = engine.compare({ first: { mueller: FILM, noise: NOISE }, second: { mueller: FILM, noise: NOISE } });
  assert.deepEqual([same.chiSquare, same.degreesOfFreedom, same.pValue], [0, 16, 1]);
  const moved = FILM.map((value, k) => (k === 5 ? value + 0.04 : value));
  const other = engine.compare({ first: { mueller: FILM, noise: NOISE }, second: { mueller: moved, noise: NOISE } });
  // Derived: (0.04 / (0.004 √2))² = 50.
  assert.ok(Math.abs((other.chiSquare ?? 0) - 50) < 1e-9 && Math.abs((other.differenceInSigma?.[5] ?? 0) - 50 ** 0.5) < 1e-9);
  assert.ok((other.pValue ?? 1) < 1e-4);
  const silent = engine.compare({ first: { mueller: FILM }, second: { mueller: moved, noise: NOISE } });
  assert.equal(silent.chiSquare, null);
  assert.match(silent.reason ?? "", /noise of both/);
  refuses(() => engine.compare(/** @type {any} */ ({ first: { mueller: FILM } })), "missing-field", /second/);
});

test("mapStates: a quarter-wave plate at 45° makes circular light of horizontal, in every convention", () => {
  // Derived from the definitions of physics: fast axis at +45°, exp(+iωt).
  const plate = [1, 0, 0, 0, 0, 0, 0, -1, 0, 0, 1, 0, 0, 1, 0, 0];
  const [horizontal] = engine.mapStates({ mueller: plate });
  assert.deepEqual(horizontal?.output.stokes, [1, 0, 0, 1]);
  assert.deepEqual([horizontal?.output.degree, horizontal?.output.azimuthDeg, horizontal?.output.ellipticityDeg], [1, null, 45]);
  const turned = engine.mapStates({ mueller: plate.map((value, k) => (k === 7 || k === 13 ? -value : value)), convention: { positiveS3: "counterclockwise" } });
  assert.deepEqual(turned[0]?.output.stokes, [1, 0, 0, -1]);
  assert.equal(turned[0]?.output.ellipticityDeg, -45);
  // A horizontal polarizer blocks V (definition), also where rounding leaves something of it.
  const leaky = [0.5, 0.5 - 1e-15, 0, 0, 0.5 - 1e-15, 0.5, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0];
  assert.deepEqual(engine.mapStates({ mueller: leaky })[1]?.output, { stokes: [0, 0, 0, 0], degree: null, azimuthDeg: null, ellipticityDeg: null });
  refuses(() => engine.mapStates(/** @type {any} */ ({ mueller: plate, more: 1 })), "unknown-field", /more/);
});

test("sphereMarks: where the view puts them, by name in every convention; a frame brings its colours", () => {
  const identity = Array.from({ length: 16 }, (_, k) => (k % 5 === 0 ? 1 : 0));
  const request = { mueller: identity, azimuthDeg: 0, elevationDeg: 0, frame: { width: 240 } };
  // Definition of the view: +S1 in front, S2 to the right, S3 up, twenty pixels round the sphere.
  const places = [[120, 120], [120, 120], [220, 120], [20, 120], [120, 20], [120, 220]];
  for (const [convention, labels] of /** @type {[import("../../dist/halfshade.js").Convention, string[]][]} */ ([
    [{}, ["H", "V", "+45°", "−45°", "R", "L"]],
    [{ zeroAngle: "y" }, ["V", "H", "+45°", "−45°", "R", "L"]],
    [{ positiveS3: "counterclockwise" }, ["H", "V", "+45°", "−45°", "L", "R"]],
  ])) {
    const marks = engine.sphereMarks({ ...request, convention });
    assert.deepEqual(marks.map(({ label }) => label), labels);
    marks.forEach(({ input, output }, k) => {
      for (const [x, y] of [input, output ?? []]) assert.ok(Math.hypot((x ?? NaN) - (places[k]?.[0] ?? 0), (y ?? NaN) - (places[k]?.[1] ?? 0)) < 1e-9);
    });
    // The names are those of mapStates: it says which Stokes vector each has.
    for (const { label, input } of engine.mapStates({ mueller: identity, convention })) {
      const axis = 1 + Math.floor(labels.indexOf(label) / 2);
      assert.deepEqual(input.stokes.map((value) => value + 0), [1, 0, 0, 0].map((value, k) => (k === axis ? 1 - 2 * (labels.indexOf(label) % 2) : value)));
    }
  }
  const polarizer = identity.map((_, k) => ([0, 1, 4, 5].includes(k) ? 0.5 : 0));
  assert.equal(engine.sphereMarks({ ...request, mueller: polarizer })[1]?.output, null);
  refuses(() => engine.sphereMarks({ ...request, frame: { width: 1 } }), "plot-size");

  const rings = (/** @type {string} */ chosen) => engine.sphereSvg({ ...request, chosen }).split(`r="${Math.round(16 * 6.8)}"`).length - 1;
  assert.deepEqual(["R", "none of them"].map(rings), [2, 0]);
  const svg = engine.sphereSvg({ ...request, frame: { width: 240, colours: { background: [1, 2, 3], ink: [999, -5, 254.6] } } });
  assert.match(svg, /#010203/);
  assert.match(svg, /#FF00F[EF]/);
  refuses(() => engine.sphereSvg(/** @type {any} */ ({ ...request, frame: { width: 240, colours: { paper: [1, 2, 3] } } })), "unknown-field", /paper/);
});

test("a configuration as a file", () => {
  const configuration = { v: 1, measurement: { mueller: FILM, noise: NOISE }, series: { use: /** @type {"series"} */ ("series"), matrices: [FILM, FILM.map((x) => -x)] } };
  const text = engine.encodeFile(configuration);
  assert.deepEqual(engine.decodeFile(text), configuration);
  refuses(() => engine.decodeFile(text.slice(0, -9)), "file-damaged");
  refuses(() => engine.decodeFile('{"v": 9}'), "link-newer");
  refuses(() => engine.encodeFile(/** @type {any} */ ({ v: 1, series: { use: "other" } })), "unknown-choice", /series\.use/);
});

test("noise statements: the same errors said in four ways give the same test", () => {
  const p = (/** @type {any} */ noise) => engine.examine({ mueller: FILM, noise, draws: 1 }).realizability;
  const one = p(NOISE);
  const relative = p({ kind: "relative", fraction: 0.004 / 0.955 });
  const each = p({ kind: "perElement", sigma: Array(16).fill(0.004) });
  const covariance = p({ kind: "covariance", covariance: Array.from({ length: 256 }, (_, k) => (k % 17 === 0 ? 1.6e-5 : 0)) });
  assert.equal(relative.pValue, one.pValue);
  for (const other of [each, covariance]) {
    assert.equal(other.verdict, one.verdict);
    assert.ok(Math.abs((other.statistic ?? 0) / (one.statistic ?? 1) - 1) < 1e-8);
    assert.ok(Math.abs((other.pValue ?? 0) - (one.pValue ?? 0)) < 0.06);
    other.eigenvalueSe?.forEach((se, k) => assert.ok(Math.abs(se / (one.eigenvalueSe?.[k] ?? 1) - 1) < 1e-9));
  }
  refuses(() => p({ kind: "perElement", sigma: Array(16).fill(-1) }), "bad-sigma", /noise\.sigma/);
  refuses(() => p({ kind: "covariance", covariance: Array(256).fill(1) }), "covariance-singular");
  refuses(() => p({ kind: "covariance", covariance: Array.from({ length: 256 }, (_, k) => (k === 1 ? 1 : k % 17 === 0 ? 4 : 0)) }), "covariance-not-symmetric");
  refuses(() => p({ kind: "covariance", covariance: Array.from({ length: 256 }, (_, k) => (k % 17 === 0 ? 1 : 2)) }), "covariance-not-positive");
  refuses(() => p({ kind: "uniform", sigma: 1, fraction: 1 }), "unknown-field", /fraction/);
  refuses(() => engine.examine({ mueller: FILM, noise: NOISE, draws: 1e9 }), "too-large", /draws/);
});

test("detectable: what a noise can show", () => {
  // Derived: 2σ/√3 and σ/√3; sqrt(χ² of 3 at 95 %) = 2.7955 by a handbook table; ½ over σ/2.
  const found = engine.detectable({ sigma: 0.005 });
  assert.ok(Math.abs(found.alphaSe - 0.01 / Math.sqrt(3)) < 1e-12);
  assert.ok(Math.abs(found.diattenuation - 2.7955 * 0.005) < 1e-6);
  assert.ok(Math.abs(found.mirrorMargin - 200) < 1e-9);
  assert.ok(Math.abs(engine.detectable({ sigma: 0.005, normalised: true }).alphaSe - 0.005 / Math.sqrt(3)) < 1e-12);
  refuses(() => engine.detectable({ sigma: 0 }), "bad-sigma", /sigma/);
});
