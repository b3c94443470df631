// Trains through the interface: degrees, conventions, places of errors. Physical
// expectations are derived from the elements; the numbers in depth are the business of the
// native tests.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { test } from "node:test";

import * as typed from "../../dist/halfshade.js";

/** Without its types: much of this is calling it wrongly. @type {any} */
const engine = typed;

typed.initSync({ module: readFileSync(new URL("../../dist/halfshade_bg.wasm", import.meta.url)) });

const IDENTITY = [1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1];
const CONVENTIONS = ["counterclockwise", "clockwise"].flatMap((angles) =>
  ["clockwise", "counterclockwise"].flatMap((positiveS3) =>
    ["x", "y"].flatMap((zeroAngle) => ["plus", "minus"].map((time) => ({ angles, positiveS3, zeroAngle, time }))),
  ),
);

/**
 * @param {() => unknown} call
 * @param {string} code
 * @param {string} [field]
 */
function refuses(call, code, field) {
  assert.throws(call, (/** @type {any} */ error) => {
    assert.ok(error instanceof Error);
    assert.equal(/** @type {any} */ (error).code, code, error.message);
    assert.match(error.message, /[.?]$/, "a sentence");
    if (field !== undefined) assert.deepEqual(/** @type {any} */ (error).at, { field });
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

/** @param {Record<string, number>} values */
const fixed = (values) => Object.fromEntries(Object.entries(values).map(([name, value]) => [name, { value }]));
/** @param {number} value */
const free = (value) => ({ value, free: true });
/** @param {number} axisDeg */
const polarizer = (axisDeg) => ({
  kind: "linearDiattenuator",
  parameters: fixed({ transmittanceMax: 1, transmittanceMin: 0, axisDeg }),
});
/** @param {number} retardanceDeg @param {number} axisDeg */
const retarder = (retardanceDeg, axisDeg) => ({ kind: "linearRetarder", parameters: fixed({ retardanceDeg, axisDeg }) });

test("follow: crossed polarizers with a third between", () => {
  const found = engine.follow({ source: [1, 0, 0, 0], train: [polarizer(0), polarizer(45), polarizer(90)] });
  finite(found);
  assert.deepEqual(
    found.states.map((/** @type {any} */ state) => Math.round(1e12 * state.power) / 1e12),
    [0.5, 0.25, 0.125],
  );
  close(found.states[1].azimuthDeg, 45);
  assert.ok(found.notes.some((/** @type {any} */ note) => note.code === "order-matters" && note.at.field === "train[1]"));
  const dark = engine.follow({ source: [1, 0, 0, 0], train: [polarizer(0), polarizer(90)] });
  assert.deepEqual(dark.states[1], { stokes: [0, 0, 0, 0], degree: null, azimuthDeg: null, ellipticityDeg: null, power: 0 });
});

// Light linear at 45° counter-clockwise from the fast axis leaves a quarter wave left
// circular, counter-clockwise facing the source (E. Hecht, problem 8.82: seen), however a
// person writes angles and S3.
test("follow: the same bench in all sixteen conventions", () => {
  for (const convention of CONVENTIONS) {
    const written = (/** @type {number} */ angle) =>
      (convention.angles === "clockwise" ? -1 : 1) * (angle - (convention.zeroAngle === "y" ? 90 : 0));
    const train = [polarizer(written(75)), retarder(90, written(30))];
    const found = engine.follow({ source: [1, 0, 0, 0], train, convention });
    const [s0, , , s3] = found.states[1].stokes;
    close(s0, 0.5);
    close(s3, convention.positiveS3 === "clockwise" ? -0.5 : 0.5);
    close(found.states[0].azimuthDeg, ((written(75) % 180) + 180) % 180);
    // A circular retarder, fast for positive S3 as the person has it, and a rotator that
    // undoes it: δ fast for clockwise turns counter-clockwise angles by -δ/2 (derived).
    const sense = convention.positiveS3 === "clockwise" ? 1 : -1;
    const turn = 20 * sense * (convention.angles === "clockwise" ? -1 : 1);
    const undone = engine.follow({
      source: [1, 0.3, 0.4, 0.5],
      train: [
        { kind: "circularRetarder", parameters: fixed({ retardanceDeg: 40 }) },
        { kind: "rotator", parameters: fixed({ angleDeg: turn }) },
      ],
      convention,
    });
    undone.mueller.forEach((/** @type {number} */ v, /** @type {number} */ k) => close(v, IDENTITY[k] ?? NaN));
  }
});

test("follow: ties speak the person's angles", () => {
  for (const convention of CONVENTIONS) {
    const tied = {
      kind: "linearRetarder",
      parameters: { retardanceDeg: { value: 30 }, axisDeg: { tie: { element: 0, name: "axisDeg", factor: 2, offset: 7 } } },
    };
    const one = engine.follow({ source: [1, 0, 0, 0], train: [polarizer(20), tied], convention });
    const other = engine.follow({ source: [1, 0, 0, 0], train: [polarizer(20), retarder(30, 47)], convention });
    one.mueller.forEach((/** @type {number} */ v, /** @type {number} */ k) => close(v, other.mueller[k]));
  }
});

test("fitTrain: comes back in all sixteen conventions", () => {
  for (const convention of CONVENTIONS) {
    const film = { transmittance: 0.8, diattenuation: 0.2, retardanceDeg: 70, axisDeg: 25 };
    const turn = { retardanceDeg: 20 };
    const truth = engine.follow({
      source: [1, 0, 0, 0],
      train: [
        { kind: "alignedDiattenuatingRetarder", parameters: fixed(film) },
        { kind: "circularRetarder", parameters: fixed(turn) },
      ],
      convention,
    }).mueller;
    const fit = engine.fitTrain({
      target: { mueller: truth, convention, noise: { kind: "uniform", sigma: 1e-6 } },
      train: [
        {
          kind: "alignedDiattenuatingRetarder",
          parameters: { transmittance: free(1), diattenuation: free(0.1), retardanceDeg: free(60), axisDeg: free(40) },
        },
        { kind: "circularRetarder", parameters: { retardanceDeg: free(10) } },
      ],
    });
    finite(fit);
    const values = { ...film, turn: 20 };
    Object.values(values).forEach((value, k) => close(fit.parameters[k].value, value, 1e-4));
    for (const one of fit.parameters) assert.ok(one.low < one.value && one.value < one.high && one.se > 0);
    assert.deepEqual(
      fit.parameters.map((/** @type {any} */ one) => one.name),
      ["transmittance", "diattenuation", "retardanceDeg", "axisDeg", "retardanceDeg"],
    );
    close(fit.covariance[2][2], fit.parameters[2].se ** 2, 1e-12);
    assert.equal(fit.degreesOfFreedom, 11);
    fit.mueller.forEach((/** @type {number} */ v, /** @type {number} */ k) => close(v, truth[k], 1e-6));
  }
});

test("fitTrain: what can't be told apart is a sentence", () => {
  const target = { mueller: engine.follow({ source: [1, 0, 0, 0], train: [retarder(90, 30)] }).mueller, noise: { kind: "uniform", sigma: 0.001 } };
  const half = (/** @type {string} */ label) => ({ kind: "linearRetarder", label, parameters: { retardanceDeg: free(40), axisDeg: { value: 30 } } });
  const fit = engine.fitTrain({ target, train: [half("window"), half("film")] });
  finite(fit);
  assert.equal(
    fit.nullDirections[0].sentence,
    "Only the sum of the retardance of window (element 1) and the retardance of film (element 2) is determined.",
  );
  assert.deepEqual(fit.nullDirections[0].parameters, [0, 1]);
  assert.equal(fit.parameters[0].se, null);
  close(fit.parameters[0].value + fit.parameters[1].value, 90, 1e-6);
  const repeated = engine.fitTrain({ target, train: [half("window"), half("film")] });
  assert.deepEqual(repeated, fit);
});

test("removeOptics: a train or a measurement on either side", () => {
  const film = retarder(70, 25);
  const whole = engine.follow({ source: [1, 0, 0, 0], train: [retarder(20, 10), film, retarder(50, 80)] }).mueller;
  const sample = engine.follow({ source: [1, 0, 0, 0], train: [film] }).mueller;
  const post = engine.follow({ source: [1, 0, 0, 0], train: [retarder(50, 80)] }).mueller;
  const measured = { mueller: whole, noise: { kind: "uniform", sigma: 0.001 } };
  const found = engine.removeOptics({
    measured,
    pre: [retarder(20, 10)],
    post: { mueller: post, noise: { kind: "uniform", sigma: 0.002 } },
    direct: IDENTITY,
  });
  finite(found);
  found.mueller.forEach((/** @type {number} */ v, /** @type {number} */ k) => close(v, sample[k], 1e-12));
  close(found.conditionNumber, 1);
  assert.equal(found.covariance.length, 256);
  // Turns on both sides: σ² of the measurement and of the optics add (derived).
  for (const growth of found.sigmaGrowth) close(growth, Math.sqrt(5), 1e-9);
  assert.deepEqual(
    found.samples.map((/** @type {any} */ one) => one.model),
    ["pureIsotropic", "realizable"],
  );
  assert.equal(found.direct.weight, 0);
  // The result is a measurement again.
  const again = engine.examine({ mueller: found.mueller, noise: { kind: "covariance", covariance: found.covariance }, draws: 0 });
  finite(again);
  const silent = engine.removeOptics({ measured: { mueller: whole } });
  assert.equal(silent.covariance, null);
  assert.deepEqual(silent.mueller, whole);
});

test("symmetries", () => {
  const { mueller } = engine.follow({ source: [1, 0, 0, 0], train: [retarder(70, 25)] });
  const tests = engine.symmetries({ mueller, noise: { kind: "uniform", sigma: 0.001 } });
  finite(tests);
  assert.deepEqual(
    tests.map((/** @type {any} */ one) => [one.symmetry, one.pValue > 0.05]),
    [
      ["reciprocalSameFrame", true],
      ["reciprocalMirrored", false],
      ["noCircularPart", true],
      ["blockDiagonal", false],
    ],
  );
  for (const one of engine.symmetries({ mueller })) assert.ok(one.pValue === null && one.reason !== null);
});

test("hostile requests are refused at their place", () => {
  const source = [1, 0, 0, 0];
  const follow = (/** @type {any} */ train) => () => engine.follow({ source, train });
  const rotator = (/** @type {any} */ angleDeg) => ({ kind: "rotator", parameters: { angleDeg } });
  refuses(() => engine.follow({ train: [] }), "missing-field", "source");
  refuses(() => engine.follow({ source: [1, 1, 1, 0], train: [] }), "bad-source", "source");
  refuses(() => engine.follow({ source: [0, 0, 0, 0], train: [] }), "bad-source", "source");
  refuses(() => engine.follow({ source, train: [], seed: 1 }), "unknown-field", "seed");
  refuses(follow({}), "bad-request", "train");
  refuses(follow([{ kind: "lens" }]), "unknown-choice", "train[0].kind");
  refuses(follow([{ kind: "rotator" }]), "missing-field", "train[0].parameters");
  refuses(follow([{ kind: "rotator", parameters: {} }]), "missing-field", "train[0].parameters.angleDeg");
  refuses(follow([{ kind: "rotator", parameters: { angle: { value: 1 } } }]), "unknown-field", "train[0].parameters.angle");
  refuses(follow([rotator({})]), "missing-field", "train[0].parameters.angleDeg.value");
  refuses(follow([rotator({ value: Number.NaN })]), "not-finite", "train[0].parameters.angleDeg.value");
  refuses(follow([rotator({ value: 1e300 })]), "bad-parameter", "train[0].parameters.angleDeg");
  refuses(follow([rotator({ value: 1, free: true, low: 2 })]), "bad-bounds", "train[0].parameters.angleDeg.value");
  refuses(follow([rotator({ value: 1, free: true, tie: { element: 0, name: "angleDeg" } })]), "bad-tie", "train[0].parameters.angleDeg.free");
  refuses(follow([rotator({ tie: { element: 5, name: "angleDeg" } })]), "bad-tie", "train[0].parameters.angleDeg.tie.name");
  refuses(follow([rotator({ tie: { element: 0, name: "angleDeg" } })]), "bad-tie", "train[0].parameters.angleDeg.tie");
  refuses(follow([{ kind: "measured" }]), "missing-field", "train[0].measurement");
  refuses(follow([{ kind: "measured", measurement: { mueller: [1] } }]), "bad-request", "train[0].measurement.mueller");
  refuses(
    follow([{ kind: "measured", measurement: { mueller: IDENTITY, noise: { kind: "uniform", sigma: -1 } } }]),
    "bad-sigma",
    "train[0].measurement.noise.sigma",
  );
  const swapped = { kind: "linearDiattenuator", parameters: fixed({ transmittanceMax: 0.1, transmittanceMin: 0.9, axisDeg: 0 }) };
  refuses(follow([swapped]), "bad-parameter", "train[0].parameters.transmittanceMin");
  refuses(
    follow([{ kind: "ellipticalRetarder", parameters: fixed({ retardanceDeg: 1, azimuthDeg: 0, ellipticityDeg: 50 }) }]),
    "bad-parameter",
    "train[0].parameters.ellipticityDeg",
  );
  const glass = { indexBefore: 1.5, indexAfter: 1, absorption: 0, incidenceDeg: 60, planeDeg: 0 };
  refuses(follow([{ kind: "fresnelTransmission", parameters: fixed(glass) }]), "total-reflection", "train[0].parameters.incidenceDeg");
  refuses(follow(Array(501).fill(rotator({ value: 1 }))), "too-large", "train");

  const measured = { mueller: IDENTITY };
  refuses(() => engine.removeOptics({ measured, pre: [retarder(1, 2), polarizer(0)] }), "singular-element", "pre[1]");
  refuses(() => engine.removeOptics({ measured, post: { mueller: Array(16).fill(0) } }), "singular-element", "post[0]");
  refuses(() => engine.removeOptics({ measured: { mueller: [] } }), "bad-request", "measured.mueller");
  refuses(() => engine.removeOptics({ measured, pre: 5 }), "bad-request", "pre");
  refuses(
    () => engine.removeOptics({ measured, direct: IDENTITY.map((v, k) => (k === 5 ? 0 : v)) }),
    "not-pure",
    "direct",
  );
  refuses(() => engine.fitTrain({ train: [] }), "missing-field", "target");
  refuses(() => engine.fitTrain({ target: { ...measured, noise: { kind: "uniform", sigma: 0 } }, train: [] }), "bad-sigma", "target.noise.sigma");
  refuses(() => engine.fitTrain({ target: measured, train: [], starts: 1e6 }), "too-large");
  refuses(() => engine.symmetries({}), "missing-field", "mueller");
});
