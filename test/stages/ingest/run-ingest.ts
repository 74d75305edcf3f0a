/** Runs the kind `ingest` on bytes, with the defaults that its declaration states. */

import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Visibilities } from '../../../stages/data.ts';
import { readVisibilities } from '../../../stages/formats/visibilities.ts';
import { compute } from '../../../stages/ingest/compute.ts';
import { ingest } from '../../../stages/ingest/ingest.ts';
import type { StageReport } from '../../../stages/kind.ts';
import { InputProblem } from '../../../stages/problem.ts';
import { parseQuantity } from '../../../stages/units.ts';

export interface Ingested {
  readonly visibilities: Visibilities;
  // biome-ignore lint/suspicious/noExplicitAny: the report is read field by field in tests
  readonly report: any;
  readonly stage: StageReport;
  readonly bytes: Uint8Array;
}

function defaults(): Record<string, unknown> {
  const result: Record<string, unknown> = {};
  for (const [name, declaration] of Object.entries(ingest.parameters)) {
    if (!('default' in declaration)) continue;
    const value = declaration.default;
    result[name] = declaration.type === 'quantity' ? parseQuantity(value as string).value : value;
  }
  return result;
}

export function runIngest(bytes: Uint8Array, parameters: Record<string, unknown> = {}): Ingested {
  const visibilities = memorySink();
  const report = memorySink();
  const stage = compute({
    inputs: { data: [sourceOf(bytes, 'data')] },
    parameters: { ...defaults(), ...parameters },
    outputs: { visibilities, report },
    note: () => {},
    progress: () => {},
  });
  const written = visibilities.bytes().slice();
  return {
    visibilities: readVisibilities(sourceOf(written)),
    report: JSON.parse(new TextDecoder().decode(report.bytes())),
    stage,
    bytes: written,
  };
}

/** The problem that ingesting ends in. */
export function problemOf(bytes: Uint8Array, parameters: Record<string, unknown> = {}): InputProblem {
  try {
    runIngest(bytes, parameters);
  } catch (error) {
    if (error instanceof InputProblem) return error;
    throw error;
  }
  throw new Error('ingest accepted what it should refuse');
}
