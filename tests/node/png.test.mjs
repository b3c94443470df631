// Words inside a picture: the chunks of the PNG specification, taken apart by hand, their
// checksums by Node's zlib.

import assert from "node:assert/strict";
import { test } from "node:test";
import { crc32 as reference, deflateSync } from "node:zlib";
import { crc32, withTexts } from "../../www/js/png.js";

/** @param {string} type @param {Uint8Array} data */
function chunk(type, data) {
  const body = Buffer.concat([Buffer.from(type, "latin1"), data]);
  const out = Buffer.alloc(body.length + 8);
  out.writeUInt32BE(data.length, 0);
  body.copy(out, 4);
  out.writeUInt32BE(crc32(body), 4 + body.length);
  return out;
}

/** One grey pixel. */
const PNG = Buffer.concat([
  Buffer.from([0x89, 0x50, 0x4e, 0x47, 13, 10, 26, 10]),
  chunk("IHDR", Buffer.from([0, 0, 0, 1, 0, 0, 0, 1, 8, 0, 0, 0, 0])),
  chunk("IDAT", deflateSync(Buffer.from([0, 128]))),
  chunk("IEND", Buffer.alloc(0)),
]);

test("the checksum of the specification's own example", () => {
  // Seen: every PNG file ends in the chunk IEND with the checksum AE 42 60 82.
  assert.equal(crc32(Buffer.from("IEND", "latin1")), 0xae426082);
  if (typeof reference === "function") assert.equal(crc32(Buffer.from("kelp")), reference(Buffer.from("kelp")));
});

test("texts stand behind the header, whole and in UTF-8; the rest is untouched", () => {
  const out = Buffer.from(withTexts(PNG, [["Title", "λ of H"], ["Software", "Halfshade"]]));
  /** @type {[string, Buffer][]} */
  const chunks = [];
  for (let at = 8; at < out.length; ) {
    const length = out.readUInt32BE(at);
    const body = out.subarray(at + 4, at + 8 + length);
    assert.equal(out.readUInt32BE(at + 8 + length), crc32(body));
    chunks.push([body.toString("latin1", 0, 4), body.subarray(4)]);
    at += 12 + length;
  }
  assert.deepEqual(chunks.map(([type]) => type), ["IHDR", "iTXt", "iTXt", "IDAT", "IEND"]);
  assert.equal(chunks[1]?.[1].toString("utf8"), "Title\0\0\0\0\0λ of H");
  assert.deepEqual(Buffer.concat([out.subarray(0, 33), out.subarray(out.length - (PNG.length - 33))]), PNG);
});
