/** Compiles a source in assembly/; see compile.mjs. */
export function compile(name: 'kernel' | 'rows'): Promise<Uint8Array>;
