/** Property tests draw the same cases on every run, so that a change is judged by the same cases as the one before.
 *  PLATEBOOK_SEED draws others: run the tests with several before a release. */

import fc from 'fast-check';

fc.configureGlobal({ seed: Number(process.env.PLATEBOOK_SEED ?? 20310310) });
