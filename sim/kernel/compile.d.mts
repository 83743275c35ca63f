/** Compiles assembly/kernel.ts; see compile.mjs. */
export function compile(): Promise<Uint8Array>;
