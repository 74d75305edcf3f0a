/** Optical data through every stage that an observation goes through: read, checked, fitted, tried with injected rings,
 *  measured, drawn. */

import { beforeAll, expect, test } from 'vitest';
import { type ByteSource, memorySink, sourceOf } from '../../stages/bytes.ts';
import { calibrationCheck } from '../../stages/calibration-check/calibration-check.ts';
import { compute as checkCalibration } from '../../stages/calibration-check/compute.ts';
import { compute as measure } from '../../stages/features/compute.ts';
import { features } from '../../stages/features/features.ts';
import { compute as draw } from '../../stages/figure/compute.ts';
import { figure } from '../../stages/figure/figure.ts';
import { compute as fitImage } from '../../stages/fit/compute.ts';
import { fit } from '../../stages/fit/fit.ts';
import { writeBasis } from '../../stages/formats/basis.ts';
import { readJson } from '../../stages/formats/json.ts';
import { readVisibilities } from '../../stages/formats/visibilities.ts';
import { observe } from '../../stages/imaging/synthetic.ts';
import { compute as ingestData } from '../../stages/ingest/compute.ts';
import { ingest } from '../../stages/ingest/ingest.ts';
import { compute as inject } from '../../stages/injection/compute.ts';
import { injection } from '../../stages/injection/injection.ts';
import type { StageKind, StageReport, StageTask } from '../../stages/kind.ts';
import { visibilitiesOfModel } from '../../stages/numerics/models.ts';
import { mean, standardDeviation } from '../../stages/numerics/statistics.ts';
import { defaultParameters } from '../stages/default-parameters.ts';
import { makeLibraryBasis } from '../stages/fit/synthetic-data.ts';
import { bytesOf, opticalFile, RING } from '../stages/optical-synthetic.ts';

type Compute = (task: StageTask) => StageReport | Promise<StageReport>;
type Files = Readonly<Record<string, ByteSource>>;
interface Done {
  readonly files: Files;
  readonly said: StageReport;
}

async function runStage(
  kind: StageKind,
  compute: Compute,
  given: Files,
  parameters: Record<string, unknown> = {},
  names = Object.keys(kind.outputs),
): Promise<Done> {
  const sinks = Object.fromEntries(names.map((name) => [name, memorySink()]));
  const said = await compute({
    inputs: Object.fromEntries(Object.entries(given).map(([name, source]) => [name, [source]])),
    parameters: { ...defaultParameters(kind), ...parameters },
    outputs: sinks,
    note: () => {},
    progress: () => {},
  });
  const files = Object.fromEntries(names.map((name) => [name, sourceOf(sinks[name].bytes().slice(), name)]));
  return { files, said };
}

let ingested: Done;
let checked: Done;
let fitted: Done;
let tried: Done;
let measured: Done;
let basis: ByteSource;

beforeAll(async () => {
  const sink = memorySink();
  writeBasis(sink, makeLibraryBasis(30, 160));
  basis = sourceOf(sink.bytes().slice(), 'basis');
  ingested = await runStage(ingest, ingestData, {
    data: sourceOf(bytesOf(opticalFile(4, undefined, 4)), 'data'),
  });
  checked = await runStage(calibrationCheck, checkCalibration, ingested.files);
  const { visibilities } = checked.files;
  fitted = await runStage(
    fit,
    fitImage,
    { visibilities, basis },
    {
      data: ['squared-visibilities', 'triple-phases'],
      components: 30,
      starts: 2,
      samples: 40,
      sampler: { chains: 2, warmUp: 20, draws: 20, most: 20, rHat: 2, ess: 4 },
    },
  );
  const { image, report, samples } = fitted.files;
  tried = await runStage(injection, inject, { visibilities, basis, image, report }, { count: 3 });
  measured = await runStage(features, measure, { basis, samples, image, bias: tried.files.bias });
}, 60_000);

test('checks pass them on, and say that there is nothing to compare', () => {
  expect(readVisibilities(checked.files.visibilities)).toEqual(readVisibilities(ingested.files.visibilities));
  expect(checked.said.findings).toEqual([]);
  expect(checked.said.warnings).toHaveLength(1);
  expect(checked.said.warnings?.[0]).toContain('No check was made');
});

test('a fit explains squared visibilities and triple phases to their noise', () => {
  const { terms } = readJson(fitted.files.report) as {
    terms: { term: string; reducedChiSquare: number; measurements: number }[];
  };
  expect(terms.map(({ term }) => term)).toEqual(['squared visibilities', 'triple phases']);
  for (const { reducedChiSquare, measurements } of terms) {
    // Five standard deviations of a reduced chi-square; above, the library does not hold the truth itself.
    expect(reducedChiSquare).toBeGreaterThan(1 - 5 * Math.sqrt(2 / measurements));
    expect(reducedChiSquare).toBeLessThan(1 + 5 * Math.sqrt(2 / measurements));
  }
});

test('rings are injected into them, and the ring is measured', () => {
  const { injected, trials } = readJson(tried.files.bias) as {
    injected: number;
    trials: { truth: { diameter: number }; measured: { diameter: { value: number } } | null }[];
  };
  expect(injected).toBe(3);
  const ratios = trials.flatMap(({ truth, measured: found }) =>
    found === null ? [] : [found.diameter.value / truth.diameter],
  );
  // Some are at the edge of being a ring; those that come out are good to a tenth.
  expect(ratios.length).toBeGreaterThan(0);
  for (const ratio of ratios) expect(Math.abs(ratio - 1)).toBeLessThan(0.1);
  const { values } = readJson(measured.files.ring) as { values: Record<string, { value: number }> };
  // The ridge of a ring of 48 uas blurred by 11 and the basis's 10 uas is 46.3 uas (Bessel functions).
  expect(Math.abs(values.diameter.value / 46.3 - 1)).toBeLessThan(0.05);
});

test('they are drawn: coverage, data and image', async () => {
  const { visibilities } = checked.files;
  const { residuals, image } = fitted.files;
  const drawn = await runStage(figure, draw, { visibilities, residuals, image }, {}, [
    'coverage',
    'data',
    'image',
  ]);
  const text = (name: string) => new TextDecoder().decode(drawn.files[name].read(0, drawn.files[name].size));
  // 4 exposures of 15 pairs and 20 triangles in 2 channels.
  expect(text('coverage')).toContain('120 points of 6 stations');
  expect(text('data')).toContain('120 squared visibilities, 160 triple phases');
  expect(text('image')).toContain('<svg');
});

// Identity: what is observed again differs from the model by noise of the stated size.
test('a known source is observed again with their noise', () => {
  const template = readVisibilities(ingested.files.visibilities);
  const again = observe(template, RING, { gainDeviations: new Float64Array(6).fill(0.5), seed: 2 });
  const { squared, triples } = again as Required<typeof again>;
  const modelOf = (u: Float64Array, v: Float64Array) => {
    const [re, im] = [new Float64Array(u.length), new Float64Array(u.length)];
    visibilitiesOfModel(re, im, RING, u, v);
    return { re, im };
  };
  const { re, im } = modelOf(squared.u, squared.v);
  const off = Array.from(squared.value, (value, k) => (value - re[k] ** 2 - im[k] ** 2) / squared.sigma[k]);
  expect(Math.abs(mean(off))).toBeLessThan(4 / Math.sqrt(off.length));
  expect(Math.abs(standardDeviation(off) - 1)).toBeLessThan(4 / Math.sqrt(2 * off.length));
  const sides = [
    modelOf(triples.u1, triples.v1),
    modelOf(triples.u2, triples.v2),
    modelOf(
      triples.u1.map((u, t) => u + triples.u2[t]),
      triples.v1.map((v, t) => v + triples.v2[t]),
    ),
  ];
  const angle = (side: number, t: number) => Math.atan2(sides[side].im[t], sides[side].re[t]);
  const phases = Array.from(triples.phase, (phase, t) => {
    const difference = phase - angle(0, t) - angle(1, t) + angle(2, t);
    return Math.atan2(Math.sin(difference), Math.cos(difference)) / triples.sigmaPhase[t];
  });
  expect(Math.abs(standardDeviation(phases) - 1)).toBeLessThan(4 / Math.sqrt(2 * phases.length));
});
