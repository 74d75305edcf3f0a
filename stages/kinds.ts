/** The stage kinds, in the order in which a pipeline uses them. */

import { basisBuild } from './basis-build/basis-build.ts';
import { calibrationCheck } from './calibration-check/calibration-check.ts';
import { combine } from './combine/combine.ts';
import { features } from './features/features.ts';
import { figure } from './figure/figure.ts';
import { fit } from './fit/fit.ts';
import { imageLibrary } from './image-library/image-library.ts';
import { ingest } from './ingest/ingest.ts';
import { injection } from './injection/injection.ts';
import type { StageKind } from './kind.ts';
import { recoverySummary } from './recovery-summary/recovery-summary.ts';
import { simulate } from './simulate/simulate.ts';
import { truthRecovery } from './truth-recovery/truth-recovery.ts';

export const stageKinds: readonly StageKind[] = [
  simulate,
  ingest,
  calibrationCheck,
  imageLibrary,
  basisBuild,
  fit,
  injection,
  features,
  combine,
  figure,
  truthRecovery,
  recoverySummary,
];
