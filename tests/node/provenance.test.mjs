// The report block: the hash of the input, times, and what the page says of conventions.

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { test } from "node:test";

import { engineInfo, examine, initSync } from "../../dist/halfshade.js";
import { HASH_PROGRAM } from "../../www/js/help-text.js";
import { hashedBytes, inputHash, provenanceOf, rfc3339 } from "../../www/js/provenance.js";
import { usualConvention } from "../../www/js/state.js";

initSync({ module: readFileSync(new URL("../../dist/halfshade_bg.wasm", import.meta.url)) });

/** @typedef {import("../../www/js/types.js").Request} Request */
/** @typedef {import("../../www/js/types.js").Convention} Convention */

// An invented kelp film, with a circular diattenuation and polarizance.
const FILM = [0.955, 0.0226, 0.0327, 0.0038, 0.019, 0.6733, 0.254, -0.6306, 0.0297, 0.25, 0.7353, 0.5698, 0.0003, 0.6339, -0.5648, 0.4469];

/** @param {Partial<Request>} [more] @returns {Request} */
function request(more = {}) {
  return { mueller: FILM, normalised: false, absolute: false, convention: usualConvention(), noise: { kind: "uniform", sigma: 0.004 }, draws: 200, seed: 1, ...more };
}

// Recomputed with Python's hashlib and struct:
// sha256(b"v1;4,4;C;<f8;" + struct.pack("<16d", *numbers)).
test("the hash of the input is that of other programs, and -0 is 0", async () => {
  assert.equal(await inputHash(FILM), "b1ddbf18d6f58196766eca60f0cf77be3b151245714dc5efc7fc0682d61675ac");
  const air = Array.from({ length: 16 }, (_, k) => (k % 5 === 0 ? 1 : 0));
  assert.equal(await inputHash(air), "2749c9dbdf1f3daff82d2daca0137f8c609061463eddb4bd1fb4d4f38fa540a8");
  assert.equal(await inputHash(air.map((value) => (value === 0 ? -0 : value))), await inputHash(air));
  // The help tells how to recompute it: with the same head.
  assert.ok(HASH_PROGRAM.includes(`b"${new TextDecoder().decode(hashedBytes([]))}"`));
});

// RFC 3339, section 5.8: 1996-12-19T16:39:57-08:00 is 1996-12-20T00:39:57Z (seen).
test("times are those of RFC 3339", () => {
  const moment = new Date(Date.UTC(1996, 11, 20, 0, 39, 57));
  assert.equal(rfc3339(moment, -480), "1996-12-19T16:39:57-08:00");
  assert.equal(rfc3339(moment, 345), "1996-12-20T06:24:57+05:45");
});

test("the block states every setting, defaults among them", () => {
  const facts = (/** @type {Partial<Request>} */ more) => provenanceOf(request(more), engineInfo(), new Date(0)).map(({ name, text }) => `${name}: ${text}`).join("\n");
  const usual = facts({});
  const { version } = JSON.parse(readFileSync(new URL("../../package.json", import.meta.url), "utf8"));
  for (const part of [`Halfshade ${version};`, "configurations of version 1", "in UTC 1970-01-01T00:00:00Z", "exp(+iωt)", "row by row", "not normalised", "Unit: relative", "deviation 0.004 ", "200 draws, seed 1"]) {
    assert.ok(usual.includes(part), `${part}\n${usual}`);
  }
  const other = facts({ normalised: true, absolute: true, noise: { kind: "rounding", decimals: 2 }, convention: { angles: "clockwise", positiveS3: "counterclockwise", zeroAngle: "y", time: "minus", order: "columns" } });
  // 10^-2 / sqrt(12) = 0.0028868 (derived).
  for (const part of ["exp(−iωt)", "column by column", "normalised to m00", "absolute", "rounding to 2 decimals", "0.00289", "angles clockwise from y", "S3 > 0 turns counter-clockwise"]) {
    assert.ok(other.includes(part), `${part}\n${other}`);
  }
  assert.match(facts({ noise: { kind: "none" } }), /none stated/);
  assert.match(facts({ noise: { kind: "relative", fraction: 0.0035 } }), /deviation 0\.0035 of m00/);
  const sigma = Array.from({ length: 16 }, (_, k) => (k + 1) / 1000);
  assert.match(facts({ noise: { kind: "perElement", sigma } }), /as given: 0\.001, 0\.002, .*0\.016/);
  // The diagonal holds squares, and rows are sixteen long.
  const covariance = Array.from({ length: 256 }, (_, k) => (k % 17 === 0 ? (sigma[k / 17] ?? 0) ** 2 : 0));
  assert.match(facts({ noise: { kind: "covariance", covariance } }), /as given: 0\.001, 0\.002, .*0\.016/);
});

/** Numbers of a result that differ from those of the usual convention, by their place. @param {Partial<Convention>} convention */
function changed(convention) {
  const plain = numbersIn(examine(request()));
  const other = numbersIn(examine(request({ convention: { ...usualConvention(), ...convention } })));
  const differs = [...plain].filter(([place, value]) => !(Math.abs(value - (other.get(place) ?? NaN)) < 1e-6 * Math.max(1, Math.abs(value))));
  return new Set(differs.map(([place]) => place.replace(/\.\d+(?=\.|$)/g, "")));
}

/** @param {unknown} value @param {string} [place] @param {Map<string, number>} [found] */
function numbersIn(value, place = "", found = new Map()) {
  if (typeof value === "number") found.set(place, value);
  else if (value && typeof value === "object") for (const [key, inner] of Object.entries(value)) numbersIn(inner, place ? `${place}.${key}` : key, found);
  return found;
}

// Derived: with K = diag(1,1,-1,1), diag(1,1,1,-1) or diag(1,-1,-1,1), M → K M K turns the
// spectrum of H into itself; a reflection of the sphere reverses the sense of retardance, the
// two together are a rotation about S1, and so is the third.
test("what the page says about conventions: which numbers depend on which answer", () => {
  const reversed = [
    "decompositions.differential.circularBirefringence",
    "decompositions.differential.linearBirefringence",
    "decompositions.differential.linearBirefringence45",
    "decompositions.isotropic.jones",
    "decompositions.polarForward.retarderAxis",
    "decompositions.polarReverse.retarderAxis",
    "decompositions.spectral.jones",
    ...["fastAxisDeg", "retarderAzimuthDeg", "retarderEllipticityDeg"].map((name) => `figures.${name}.value`),
  ].sort();
  // The simulated share and the ends of simulated intervals follow other random numbers.
  const simulated = (/** @type {string} */ place) => place === "realizability.pValue" || /\.(low|high)$/.test(place);
  const found = (/** @type {Partial<Convention>} */ convention) => [...changed(convention)].filter((place) => !simulated(place)).sort();
  assert.deepEqual(found({ angles: "clockwise" }), reversed);
  assert.deepEqual(found({ positiveS3: "counterclockwise" }), reversed);
  assert.deepEqual(found({ angles: "clockwise", positiveS3: "counterclockwise" }), []);
  assert.deepEqual(found({ zeroAngle: "y" }), []);
  assert.deepEqual(found({ time: "minus" }), ["decompositions.isotropic.jones", "decompositions.spectral.jones"]);
});
