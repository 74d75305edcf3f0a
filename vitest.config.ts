import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    exclude: ['test/bench/**', 'test/crash/**', 'test/long/**'],
    globalSetup: ['test/temporary-folder.ts'],
    setupFiles: ['test/own-environment.ts', 'test/property-seed.ts'],
    // Two processes for all files, not one for each: most of their time went into loading the same modules.
    isolate: false,
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
  },
});
