/**
 * Compiles assembly/kernel.ts to bytes.ts: `node sim/kernel/compile.mjs`. A test compiles again and compares, so the two
 * cannot drift apart.
 */
import { readFileSync, writeFileSync } from 'node:fs';
import asc from 'assemblyscript/asc';

/** The module's bytes. */
export async function compile() {
  const source = readFileSync(new URL('assembly/kernel.ts', import.meta.url), 'utf8');
  // three pages of memory, nothing of the compiler's own in it: the source places everything itself
  const options = ['-O3', '--runtime', 'stub', '--noAssert', '--enable', 'simd'];
  const memory = ['--initialMemory', '3', '--maximumMemory', '3', '--memoryBase', '190000'];
  let bytes = new Uint8Array(0);
  const { error, stderr } = await asc.main(['kernel.ts', '--outFile', 'kernel.wasm', ...options, ...memory], {
    readFile: (name) => (name === 'kernel.ts' ? source : null),
    writeFile: (name, contents) => {
      if (name === 'kernel.wasm') bytes = contents;
    },
    listFiles: () => [],
  });
  if (error) throw new Error(`${error.message}\n${stderr.toString()}`);
  return bytes;
}

if (process.argv[1] === new URL(import.meta.url).pathname) {
  const text = Buffer.from(await compile()).toString('base64');
  const lines = text.match(/.{1,110}/g).map((line) => `  '${line}'`);
  writeFileSync(
    new URL('bytes.ts', import.meta.url),
    `/** The compiled kernel in base64, written by compile.mjs. */\nexport const KERNEL_BYTES =\n${lines.join(' +\n')};\n`,
  );
}
