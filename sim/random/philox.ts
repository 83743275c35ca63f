/**
 * Philox4x32-10, a counter-based generator: 128 random bits as a pure function of a 128-bit counter and a 64-bit key.
 *
 * Salmon, Moraes, Dror and Shaw 2011, "Parallel random numbers: as easy as 1, 2, 3". There is no state, so any
 * household's draw can be made alone, in any order. Does not turn bits into numbers (draws.ts).
 */

const MULTIPLIER_0 = 0xd2511f53 | 0;
const MULTIPLIER_1 = 0xcd9e8d57 | 0;
const WEYL_0 = 0x9e3779b9 | 0;
const WEYL_1 = 0xbb67ae85 | 0;

/**
 * High 32 bits of the unsigned product a·(high·2^16 + low). Written with 16-bit halves because a double cannot hold
 * 64 bits; measured four times as fast as the same through doubles.
 */
function highProduct(a: number, high: number, low: number): number {
  const a0 = a & 0xffff;
  const a1 = a >>> 16;
  const u = Math.imul(a1, low);
  const v = Math.imul(a0, high);
  const middle = (Math.imul(a0, low) >>> 16) + (u & 0xffff) + (v & 0xffff);
  return (Math.imul(a1, high) + (u >>> 16) + (v >>> 16) + (middle >>> 16)) | 0;
}

/**
 * Ten rounds on counter (c0, c1, c2, c3) with key (k0, k1), all taken modulo 2^32.
 *
 * @param out - overwritten with the four output words as signed 32-bit integers
 */
export function philox(c0: number, c1: number, c2: number, c3: number, k0: number, k1: number, out: Int32Array): void {
  for (let round = 0; round < 10; round++) {
    const high0 = highProduct(c0, 0xd251, 0x1f53);
    const high1 = highProduct(c2, 0xcd9e, 0x8d57);
    const low0 = Math.imul(c0, MULTIPLIER_0);
    const low1 = Math.imul(c2, MULTIPLIER_1);
    c0 = high1 ^ c1 ^ k0;
    c1 = low1;
    c2 = high0 ^ c3 ^ k1;
    c3 = low0;
    k0 = (k0 + WEYL_0) | 0;
    k1 = (k1 + WEYL_1) | 0;
  }
  out[0] = c0;
  out[1] = c1;
  out[2] = c2;
  out[3] = c3;
}
