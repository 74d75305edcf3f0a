import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    exclude: ['test/bench/**', 'test/crash/**', 'test/long/**'],
    globalSetup: ['test/temporary-folder.ts'],
    setupFiles: ['test/property-seed.ts'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
  },
});
