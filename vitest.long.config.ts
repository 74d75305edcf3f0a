/** What takes too long for every `npm test`: full and bad disks, many writers, the demonstration's bag. CI runs it. */

import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    // Damage to a ledger at every byte, of which `npm test` takes every third, and to large files of data at every card.
    include: ['test/long/**/*.test.ts', 'test/ledger/damage.test.ts', 'test/stages/formats/damage.test.ts'],
    env: { PLATEBOOK_EVERY_BYTE: '1' },
    globalSetup: ['test/temporary-folder.ts'],
    setupFiles: ['test/property-seed.ts'],
    testTimeout: 600_000,
    hookTimeout: 300_000,
    maxWorkers: 2,
  },
});
