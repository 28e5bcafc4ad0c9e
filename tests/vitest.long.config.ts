import { defineConfig } from 'vitest/config';

/** The long tests alone, one file at a time: they measure times and memory. */
export default defineConfig({
  resolve: { conditions: ['source'] },
  ssr: { resolve: { conditions: ['source'] } },
  test: {
    include: ['tests/long/**/*.test.ts'],
    testTimeout: 30 * 60_000,
    hookTimeout: 10 * 60_000,
    maxWorkers: 1,
    fileParallelism: false,
  },
});
