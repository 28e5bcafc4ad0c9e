import { defineConfig } from 'vitest/config';

// Workers start from built JavaScript, so tests import the packages by name and the build comes first.
export default defineConfig({
  test: {
    include: ['tests/**/*.test.ts'],
    exclude: ['tests/long/**', 'tests/cluster/**', '**/node_modules/**'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
  },
});
