/**
 * Builds the viewer into dist/viewer: a static site that works from any folder of any file server.
 *
 * No inline script or style and no data: font, so that a strict content security policy holds.
 */
import { fileURLToPath } from 'node:url';
import { defineConfig } from 'vite';

const here = fileURLToPath(new URL('.', import.meta.url));

export default defineConfig({
  root: here,
  base: './',
  publicDir: false,
  worker: { format: 'es' },
  build: {
    outDir: fileURLToPath(new URL('../dist/viewer', import.meta.url)),
    emptyOutDir: true,
    target: 'es2022',
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    chunkSizeWarningLimit: 1500,
  },
});
