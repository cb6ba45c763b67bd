// SHA-256 (FIPS 180-4) of a text's UTF-8 bytes, in hexadecimal. Browsers have one of their own, but some hide it from
// pages that are opened from a file.
const sha256 = (() => {
  "use strict";
  const primes = [];
  for (let n = 2; primes.length < 64; n += 1) if (primes.every((p) => n % p)) primes.push(n);
  // The first 32 bits of a root's fraction.
  const fraction = (root) => Math.floor((root - Math.floor(root)) * 2 ** 32) | 0;
  const first = primes.slice(0, 8).map((p) => fraction(Math.sqrt(p)));
  const round = primes.map((p) => fraction(Math.cbrt(p)));
  const turn = (x, by) => (x >>> by) | (x << (32 - by));

  function block(state, words) {
    for (let i = 16; i < 64; i += 1) {
      const a = words[i - 15], b = words[i - 2];
      const low = turn(a, 7) ^ turn(a, 18) ^ (a >>> 3), high = turn(b, 17) ^ turn(b, 19) ^ (b >>> 10);
      words[i] = (words[i - 16] + low + words[i - 7] + high) | 0;
    }
    let [a, b, c, d, e, f, g, h] = state;
    for (let i = 0; i < 64; i += 1) {
      const one = (h + (turn(e, 6) ^ turn(e, 11) ^ turn(e, 25)) + ((e & f) ^ (~e & g)) + round[i] + words[i]) | 0;
      const two = ((turn(a, 2) ^ turn(a, 13) ^ turn(a, 22)) + ((a & b) ^ (a & c) ^ (b & c))) | 0;
      [a, b, c, d, e, f, g, h] = [(one + two) | 0, a, b, c, (d + one) | 0, e, f, g];
    }
    return [a, b, c, d, e, f, g, h].map((value, i) => (value + state[i]) | 0);
  }

  return (text) => {
    const bytes = new TextEncoder().encode(text);
    const length = Math.ceil((bytes.length + 9) / 64) * 64;
    const view = new DataView(new ArrayBuffer(length));
    bytes.forEach((byte, i) => view.setUint8(i, byte));
    view.setUint8(bytes.length, 0x80);
    view.setUint32(length - 8, Math.floor(bytes.length / 2 ** 29));
    view.setUint32(length - 4, (bytes.length << 3) >>> 0);
    let state = first;
    for (let at = 0; at < length; at += 64) {
      const words = new Int32Array(64);
      for (let i = 0; i < 16; i += 1) words[i] = view.getInt32(at + 4 * i);
      state = block(state, words);
    }
    return state.map((value) => (value >>> 0).toString(16).padStart(8, "0")).join("");
  };
})();
