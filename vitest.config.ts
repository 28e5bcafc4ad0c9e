import { defineConfig } from 'vitest/config';

// Tests read the TypeScript sources through the `source` condition; only worker threads and the CLI run from
// `dist`, which `npm test` builds first.
export default defineConfig({
  resolve: { conditions: ['source'] },
  ssr: { resolve: { conditions: ['source'] } },
  test: {
    include: ['tests/**/*.test.ts'],
    exclude: ['tests/long/**', 'tests/cluster/**', '**/node_modules/**'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
  },
});
