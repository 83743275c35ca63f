/**
 * Two sets of tests: the code, and the built viewer in a real browser. Both run by `npm test`, which builds first.
 */
import { defineConfig } from 'vitest/config';

const root = new URL('..', import.meta.url).pathname;

export default defineConfig({
  root,
  test: {
    projects: [
      {
        root,
        test: {
          name: 'code',
          include: ['test/**/*.test.ts'],
          exclude: ['test/browser/**'],
          testTimeout: 60_000,
          hookTimeout: 60_000,
        },
      },
      {
        root,
        test: {
          name: 'browser',
          include: ['test/browser/**/*.test.ts'],
          // one page at a time: two software renderers on two cores only get in each other's way
          fileParallelism: false,
          testTimeout: 120_000,
          hookTimeout: 120_000,
        },
      },
    ],
  },
});
