/**
 * SHA-256 in hexadecimal, in Node and in any page: Web Cryptography is there on secure pages only, and a static
 * build may be served without.
 */
import { sha256 as plain } from '@noble/hashes/sha2.js';
import { bytesToHex } from '@noble/hashes/utils.js';

export async function sha256(bytes: Uint8Array<ArrayBuffer>): Promise<string> {
  // a library of types for pages promises it is there; pages without TLS prove otherwise
  const host = globalThis.crypto as
    | { readonly subtle?: { digest(name: string, data: Uint8Array<ArrayBuffer>): Promise<ArrayBuffer> } }
    | undefined;
  if (host?.subtle === undefined) return bytesToHex(plain(bytes));
  return bytesToHex(new Uint8Array(await host.subtle.digest('SHA-256', bytes)));
}
