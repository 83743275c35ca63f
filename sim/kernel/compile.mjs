/**
 * Compiles the sources in assembly/ to bytes.ts: `node sim/kernel/compile.mjs`. A test compiles again and compares, so
 * that they cannot drift apart.
 */
import { readFileSync, writeFileSync } from 'node:fs';
import asc from 'assemblyscript/asc';

/** Pages of memory and options of each source; neither has anything of the compiler's own in its memory. */
const MEMORY = {
  // three pages: the source places everything itself
  kernel: ['--initialMemory', '3', '--maximumMemory', '3', '--memoryBase', '190000'],
  // grows with the ties it holds
  rows: ['--initialMemory', '2', '--memoryBase', '130000'],
};

/** The bytes of `kernel` or `rows`. */
export async function compile(name) {
  const source = readFileSync(new URL(`assembly/${name}.ts`, import.meta.url), 'utf8');
  const options = ['-O3', '--runtime', 'stub', '--noAssert', '--enable', 'simd', ...MEMORY[name]];
  let bytes = new Uint8Array(0);
  const { error, stderr } = await asc.main([`${name}.ts`, '--outFile', `${name}.wasm`, ...options], {
    readFile: (file) => (file === `${name}.ts` ? source : null),
    writeFile: (file, contents) => {
      if (file === `${name}.wasm`) bytes = contents;
    },
    listFiles: () => [],
  });
  if (error) throw new Error(`${error.message}\n${stderr.toString()}`);
  return bytes;
}

async function constant(name) {
  const text = Buffer.from(await compile(name)).toString('base64');
  const lines = text.match(/.{1,110}/g).map((line) => `  '${line}'`);
  return `/** assembly/${name}.ts. */\nexport const ${name.toUpperCase()}_BYTES =\n${lines.join(' +\n')};\n`;
}

if (process.argv[1] === new URL(import.meta.url).pathname) {
  const head = '/**\n * The compiled modules in base64, written by compile.mjs.\n */\n\n';
  writeFileSync(
    new URL('bytes.ts', import.meta.url),
    head + (await constant('kernel')) + '\n' + (await constant('rows')),
  );
}
