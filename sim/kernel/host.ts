/**
 * Starts a compiled module on whatever host this is; null where the host does not allow WebAssembly.
 */

/** The part of the WebAssembly interface used here; libraries of types differ between hosts. */
interface WebAssemblyHost {
  readonly Module: new (bytes: Uint8Array) => object;
  readonly Instance: new (module: object) => { readonly exports: unknown };
}

/** The exports of the module whose bytes these are, in base64. It imports nothing. */
export function instantiate<Exports>(base64: string): Exports | null {
  const host = (globalThis as unknown as { WebAssembly?: WebAssemblyHost }).WebAssembly;
  if (host === undefined) return null;
  try {
    return new host.Instance(new host.Module(fromBase64(base64))).exports as Exports;
  } catch {
    // forbidden by the host: not an error, only slower
    return null;
  }
}

function fromBase64(text: string): Uint8Array {
  const alphabet = 'ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/';
  const length = (text.length / 4) * 3 - (text.endsWith('==') ? 2 : text.endsWith('=') ? 1 : 0);
  const bytes = new Uint8Array(length);
  let at = 0;
  for (let i = 0; i < text.length; i += 4) {
    let word = 0;
    for (let j = 0; j < 4; j++) word = (word << 6) | Math.max(alphabet.indexOf(text[i + j]), 0);
    for (let shift = 16; shift >= 0 && at < length; shift -= 8) bytes[at++] = (word >> shift) & 255;
  }
  return bytes;
}
