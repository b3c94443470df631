// The verdicts as sentences, over what the engine finds: every case has words of its
// own, and none is a bare "not realizable".

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { test } from "node:test";

import { examine, formatValue, initSync, parseMatrices } from "../../dist/halfshade.js";
import { usualConvention } from "../../www/js/state.js";
import { changeInWords, checksOf, verdictOf } from "../../www/js/words.js";

initSync({ module: readFileSync(new URL("../../dist/halfshade_bg.wasm", import.meta.url)) });

/** @typedef {import("../../www/js/types.js").Request} Request */

/**
 * @param {number[]} mueller
 * @param {Partial<Request>} [more]
 * @returns {Request}
 */
function request(mueller, more = {}) {
  return { mueller, normalised: false, absolute: false, convention: usualConvention(), noise: { kind: "none" }, draws: 2000, seed: 1, ...more };
}

/** @param {Request} asked */
function verdict(asked, pending = false) {
  const found = verdictOf(examine(pending ? { ...asked, draws: 0 } : asked), asked, pending, formatValue);
  const text = (/** @type {import("../../www/js/types.js").Part[]} */ parts) =>
    parts.map((part) => (typeof part === "string" ? part : "number" in part ? part.number : part.mute)).join("");
  return { ...found, reason: text(found.reason), next: text(found.next) };
}

/** @param {...number} diagonal */
const diagonal = (...diagonal) => Array.from({ length: 16 }, (_, k) => (k % 5 === 0 ? (diagonal[k / 5] ?? 0) : 0));
const FILM = [0.955, 0.0226, 0.0327, 0.0038, 0.019, 0.6733, 0.254, -0.6306, 0.0297, 0.25, 0.7353, 0.5698, 0.0003, 0.6339, -0.5648, 0.4469];
// A quarter-wave plate at 36°, printed to four decimals.
const TEXTBOOK = [1, 0, 0, 0, 0, 0.0955, 0.2939, -0.9511, 0, 0.2939, 0.9045, 0.309, 0, 0.9511, -0.309, 0];

test("every verdict says what, how sure and why", () => {
  /** @type {[Request, RegExp, RegExp][]} */
  const cases = [
    [request(diagonal(1, 1, 1, 1)), /^Realizable$/, /the smallest is 0 within the accuracy/],
    [request(diagonal(1, 0.8, 0.7, 0.6)), /^Realizable$/, /the smallest is 0\.025 of m00/],
    [request(FILM), /no noise is stated$/, /Noise of σ = 0\.002\d? or more on each element would explain it/],
    [request(FILM, { noise: { kind: "uniform", sigma: 0.004 } }), /^Not realizable, but within noise$/, /−0\.0038\(21\) of m00.*in 4\d of 100 measurements \(p = 0\.4\d\)/],
    [request(FILM, { noise: { kind: "uniform", sigma: 0.001 } }), /^Not realizable, beyond noise$/, /fewer than 1 of 1000 measurements/],
    [request(TEXTBOOK), /^Not realizable as printed, but consistent with rounding to 4 decimals$/, /−2\.62e−5 of m00/],
    [request(TEXTBOOK, { noise: { kind: "rounding", decimals: 4 } }), /^Not realizable as printed, but consistent with rounding to 4 decimals$/, /of 100 measurements/],
    [request(FILM, { noise: { kind: "rounding", decimals: 4 } }), /^Not realizable: rounding does not explain it$/, /Rounding to 4 decimals/],
    [request(diagonal(0, 0, 0, 0)), /^The zero matrix/, /perfect absorber/],
    [request(diagonal(0, 1, 1, 1)), /^Not realizable: m00 is 0, other elements are not$/, /every other element must be 0/],
    [request(diagonal(-1, -1, -1, -1)), /^Not realizable: m00 is negative$/, /here −1/],
    [request(diagonal(1, 1, 1, -1)), /no noise is stated$/, /−0\.5/],
  ];
  for (const [asked, title, reason] of cases) {
    const said = verdict(asked);
    assert.match(said.title, title);
    assert.match(said.reason, reason);
    assert.notEqual(said.title, "Not realizable");
    assert.doesNotMatch(said.reason + said.next, /undefined|NaN|null|Infinity/);
    // While the slow part is still to come, nothing is claimed that it may take back.
    assert.doesNotMatch(verdict(asked, true).title, /beyond noise|within noise/);
  }
});

test("checks and changes in words", () => {
  const asked = request(FILM, { noise: { kind: "uniform", sigma: 0.004 } });
  const found = examine(asked);
  assert.deepEqual(checksOf(found, asked, false, formatValue).map((check) => check.answer), ["within noise", "not exactly", "not tested"]);
  assert.equal(changeInWords(found.nearest), "Largest change 1.3 σ, in m00.");
  assert.equal(changeInWords(examine(request(diagonal(1, 1, 1, 1))).nearest), "The matrix is realizable: nothing changes.");
  const gain = request(diagonal(1.2, 1, 1, 1), { absolute: true });
  assert.deepEqual(checksOf(examine(gain), gain, false, formatValue).map((check) => check.answer), ["yes", "yes", "no"]);
});

// The p-values stand in demo-data/README.md, simulated there by NumPy.
test("every example reads, and its verdict is the one that it was made for", () => {
  const folder = new URL("../../demo-data/", import.meta.url);
  /** @type {import("../../www/js/types.js").Example[]} */
  const index = JSON.parse(readFileSync(new URL("index.json", folder), "utf8"));
  const verdicts = index.map(({ file, normalised, absolute, noise }) => {
    const { matrices, notes, alternatives } = parseMatrices(readFileSync(new URL(file, folder), "utf8"), {});
    assert.equal(matrices.length, 1, file);
    assert.deepEqual([notes, alternatives], [[], []], file);
    const asked = request(matrices[0]?.mueller ?? [], { normalised, absolute, noise });
    return [file.replace(".txt", ""), examine(asked).realizability.verdict];
  });
  assert.deepEqual(Object.fromEntries(verdicts), {
    "air": "withinNoise",
    "quarter-wave-film": "withinNoise",
    "kelp-diattenuating-film": "withinNoise",
    "scattering-film": "realizable",
    "wrong-sign-one-side": "beyondNoise",
    "over-subtracted": "beyondNoise",
    "textbook-quarter-wave": "withinNoise",
    "polarizer-sheet": "withinNoise",
    "tunicate-uneven-film": "withinNoise",
    "twisted-film-counts": "realizable",
  });
});
