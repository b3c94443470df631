// Fits through the interface: other conventions say the same, texts for Python compute the
// fitted matrix again, slices join, and requests that are wrong say where.

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { readFileSync } from "node:fs";
import { join } from "node:path";
import { before, test } from "node:test";
import { DIST, needPython } from "../../www/build/tools.mjs";

/** @type {typeof import("../../dist/halfshade.js")} */
let engine;
/** @type {string} */
let python;
before(async () => {
  engine = await import("../../dist/halfshade.js");
  engine.initSync({ module: readFileSync(join(DIST, "halfshade_bg.wasm")) });
  python = await needPython("tests/reference/requirements.txt");
});

// An invented kelp film with α = 0.132, σ = 0.004.
const FILM = [0.9468, -0.0564, 0.0692, 0.0017, -0.0107, 0.6453, 0.2882, -0.4184, 0.0482, 0.0963, 0.5972, 0.5529, -0.0764, 0.5075, -0.4868, 0.4276];
/** @type {import("../../dist/halfshade.js").Noise} */
const NOISE = { kind: "uniform", sigma: 0.004 };
const MODELS = /** @type {const} */ (["linearRetarder", "linearDiattenuator", "alignedDiattenuatingRetarder", "ellipticalRetarder", "ellipticalDiattenuator", "pure", "pureIsotropic", "pureLinearCircular", "pureDiagonal", "rankTwo", "rankThree", "rankFour"]);

test("a text for Python gives the fitted matrix, in every model and convention", () => {
  const conventions = /** @type {const} */ ([{}, { angles: "clockwise", positiveS3: "counterclockwise", zeroAngle: "y", time: "minus" }]);
  const parts = [];
  /** @type {number[][]} */
  const expected = [];
  for (const convention of conventions) {
    for (const side of /** @type {const} */ (["parallel", "after", "before"])) {
      const target = { mueller: FILM, noise: NOISE, convention };
      const { fits } = engine.fit({ target, side });
      for (const model of MODELS) {
        const text = engine.fitRecipe({ target, side, model });
        assert.match(text, /\nprint\(M\)\n$/);
        parts.push(text.replace(/print\(M\)\n$/, "print(json.dumps(M.tolist()))\n"));
        expected.push(fits.find((fit) => fit.model === model)?.mueller ?? []);
      }
    }
  }
  const answer = execFileSync(python, ["-c", `import json\n${parts.join("\n")}`], { encoding: "utf8" });
  const found = answer.trim().split("\n").map((line) => JSON.parse(line).flat());
  assert.equal(found.length, expected.length);
  found.forEach((matrix, k) => matrix.forEach((/** @type {number} */ value, /** @type {number} */ i) => assert.ok(Math.abs(value - (expected[k]?.[i] ?? NaN)) < 1e-9, `${k} ${MODELS[k % 12]} ${i}: ${value} ${expected[k]?.[i]}`)));
});

test("the same measurement in another convention has the same fit, in its own words", () => {
  // Angles counted clockwise: S2 changes its sign.
  const signs = [1, 1, -1, 1].flatMap((a) => [1, 1, -1, 1].map((b) => a * b));
  const one = engine.fit({ target: { mueller: FILM, noise: NOISE } });
  const other = engine.fit({ target: { mueller: FILM.map((value, k) => value * (signs[k] ?? 1)), noise: NOISE, convention: { angles: "clockwise" } } });
  one.fits.forEach((fit, k) => {
    const again = other.fits[k];
    assert.ok(again);
    assert.ok(Math.abs((fit.chiSquare ?? 0) - (again.chiSquare ?? 0)) < 1e-6 * (1 + (fit.chiSquare ?? 0)), fit.model);
    for (const { name, value, se } of [...fit.parameters, ...fit.derived]) {
      if (name.startsWith("jones")) continue;
      const mirrored = [...again.parameters, ...again.derived].find((parameter) => parameter.name === name);
      const expected = name === "axisDeg" ? (180 - value) % 180 : /Vector(Deg)?1$/.test(name) ? -value : value;
      assert.ok(Math.abs((mirrored?.value ?? NaN) - expected) < 1e-5 * (1 + Math.abs(expected)), `${fit.model} ${name}: ${mirrored?.value} ${expected}`);
      if (se !== null && mirrored?.se !== null) assert.ok(Math.abs((mirrored?.se ?? NaN) / se - 1) < 1e-3 || se < 1e-9, `${fit.model} ${name}`);
    }
    fit.mueller.forEach((value, i) => assert.ok(Math.abs(value * (signs[i] ?? 1) - (again.mueller[i] ?? NaN)) < 1e-6));
  });
  assert.equal(one.recommended?.model, other.recommended?.model);
});

test("every parameter has a row of the covariance, and Jones entries spell the Jones matrix", () => {
  const time = /** @type {const} */ ({ time: "minus", zeroAngle: "y" });
  for (const convention of [{}, time]) {
    for (const fit of engine.fit({ target: { mueller: FILM, noise: NOISE, convention } }).fits) {
      if (fit.covariance.length === 0) continue;
      assert.equal(fit.covariance.length, fit.parameters.length);
      fit.parameters.forEach(({ name, se }, k) => {
        const variance = fit.covariance[k]?.[k] ?? NaN;
        assert.ok(se === null || Math.abs(Math.sqrt(variance) - se) < 1e-9 * (1 + se), `${fit.model} ${name}`);
        const [, row, column, part] = /^jones\.(\d)(\d)\.(re|im)$/.exec(name) ?? [];
        if (row) assert.ok(Math.abs((fit.jones?.[2 * Number(row) + Number(column)]?.[part === "re" ? 0 : 1] ?? NaN) - (fit.parameters[k]?.value ?? 0)) < 1e-12, `${fit.model} ${name}`);
      });
    }
  }
});

test("profiles, and samples whose slices join", () => {
  const question = { target: { mueller: FILM, noise: NOISE }, model: /** @type {const} */ ("pureIsotropic") };
  const alpha = engine.fit({ target: question.target, models: ["pureIsotropic"] }).fits[0]?.parameters.find(({ name }) => name === "alpha");
  const profile = engine.profile({ ...question, parameter: "alpha" });
  assert.ok(profile.low !== null && profile.high !== null && alpha?.low && alpha.high);
  assert.ok(Math.abs(profile.low - alpha.low) < 0.05 * (alpha.se ?? 0));
  const whole = engine.bootstrap({ ...question, first: 0, count: 12 });
  const parts = [engine.bootstrap({ ...question, first: 0, count: 5 }), engine.bootstrap({ ...question, first: 5, count: 7 })];
  whole.samples.forEach((sample, k) => assert.deepEqual(sample.values, parts.flatMap((part) => part.samples[k]?.values ?? [])));
});

test("what is wrong with a request stands at its field", () => {
  const target = { mueller: FILM, noise: NOISE };
  const refused = (/** @type {() => unknown} */ call) => {
    try {
      call();
    } catch (error) {
      return /** @type {{ code: string, at: { field: string } }} */ (error);
    }
    throw new Error("was taken");
  };
  const any = (/** @type {unknown} */ value) => /** @type {any} */ (value);
  assert.equal(refused(() => engine.fit(any({}))).at.field, "target");
  assert.equal(refused(() => engine.fit(any({ target, models: ["other"] }))).at.field, "models[0]");
  assert.equal(refused(() => engine.fit(any({ target, side: "left" }))).at.field, "side");
  assert.equal(refused(() => engine.fit({ target: { mueller: FILM.map(() => 0) } })).code, "no-m00");
  assert.equal(refused(() => engine.profile(any({ target, model: "pure", parameter: "alpha" }))).at.field, "parameter");
  assert.equal(refused(() => engine.bootstrap({ target, model: "rankTwo" })).code, "no-bootstrap");
});
