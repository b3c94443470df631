/** Words inside a PNG picture: iTXt chunks (PNG specification, third edition, 11.3.3.4). */

/** The remainders of the bytes (the same specification, annex D). */
const TABLE = Uint32Array.from({ length: 256 }, (_, byte) => {
  let value = byte;
  for (let bit = 0; bit < 8; bit += 1) value = value & 1 ? 0xedb88320 ^ (value >>> 1) : value >>> 1;
  return value;
});

/** Length of the signature and of the header chunk, which stays first. */
const HEAD = 8 + 25;

/** @param {Uint8Array} bytes */
export function crc32(bytes) {
  let value = 0xffffffff;
  for (const byte of bytes) value = (TABLE[(value ^ byte) & 0xff] ?? 0) ^ (value >>> 8);
  return (value ^ 0xffffffff) >>> 0;
}

/**
 * The picture with these texts in it.
 * @param {Uint8Array} png
 * @param {[keyword: string, text: string][]} texts keywords in Latin letters
 * @returns {Uint8Array<ArrayBuffer>}
 */
export function withTexts(png, texts) {
  const chunks = texts.map(([keyword, text]) => chunk(keyword, text));
  const size = chunks.reduce((sum, each) => sum + each.length, png.length);
  const out = new Uint8Array(size);
  out.set(png.subarray(0, HEAD));
  let at = HEAD;
  for (const each of chunks) {
    out.set(each, at);
    at += each.length;
  }
  out.set(png.subarray(HEAD), at);
  return out;
}

/**
 * @param {string} keyword
 * @param {string} text
 */
function chunk(keyword, text) {
  const encoder = new TextEncoder();
  // Keyword, its end, not compressed, no language, no translation.
  const data = encoder.encode(`iTXt${keyword}\0\0\0\0\0${text}`);
  const out = new Uint8Array(data.length + 8);
  const view = new DataView(out.buffer);
  view.setUint32(0, data.length - 4);
  out.set(data, 4);
  view.setUint32(4 + data.length, crc32(data));
  return out;
}
