/**
 * SHA-256 with and without Web Cryptography, against the published examples (FIPS 180-4, "abc" and the empty text,
 * values from memory).
 */
import { createHash } from 'node:crypto';
import { afterEach, expect, test, vi } from 'vitest';
import { sha256 } from '../../../sim/results/sha256.js';

afterEach(() => {
  vi.unstubAllGlobals();
});

const text = (s: string): Uint8Array<ArrayBuffer> => new TextEncoder().encode(s);

test.each(['secure', 'plain'])('on a %s page', async (page) => {
  if (page === 'plain') vi.stubGlobal('crypto', {});
  expect(await sha256(text('abc'))).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
  expect(await sha256(text(''))).toBe('e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855');
  const bytes = Uint8Array.from({ length: 100_000 }, (_, k) => (k * 31) & 255);
  expect(await sha256(bytes)).toBe(createHash('sha256').update(bytes).digest('hex'));
});
