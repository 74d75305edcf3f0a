/** The crash harness: some two hundred writers, each killed at another step. Longer than the rest; CI runs it. */

import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    include: ['test/crash/**/*.test.ts'],
    globalSetup: ['test/temporary-folder.ts'],
    testTimeout: 300_000,
    hookTimeout: 120_000,
  },
});
