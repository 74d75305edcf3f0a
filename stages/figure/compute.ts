/** Reads what was given and draws what was asked for. */

import type { ByteSource } from '../bytes.ts';
import type { Basis, Numbers, Posterior, SkyImage, Visibilities } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { readNumbers } from '../formats/json.ts';
import { readPosterior } from '../formats/posterior.ts';
import { readSkyImage } from '../formats/sky-image.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { measureRing } from '../numerics/ring.ts';
import { InputProblem } from '../problem.ts';
import { beamOf } from './beam.ts';
import { drawCalibration } from './calibration-plot.ts';
import { readCalibration } from './calibration-report.ts';
import { drawComponents } from './components-plot.ts';
import { drawCoverage, measuredPoints } from './coverage.ts';
import { drawData } from './data-plot.ts';
import { describeFindings, readFindings } from './findings.ts';
import { drawImage } from './image-plot.ts';
import { posteriorMarginals } from './marginals.ts';
import { measureRings, readMeasuredRings } from './measured-rings.ts';
import { drawPosterior } from './posterior-plot.ts';
import { drawProfile } from './profile.ts';
import { readResiduals } from './residuals.ts';
import { drawScree } from './scree.ts';
import { angleUnit, blurred, centroid, MICROARCSEC, type Place } from './sky.ts';

interface Given {
  readonly visibilities: Visibilities | null;
  readonly image: SkyImage | null;
  readonly basis: Basis | null;
  readonly samples: Posterior | null;
  readonly ring: Numbers | null;
  readonly truth: { readonly image: SkyImage; readonly label: string } | null;
  readonly heading: string;
  readonly remark: string;
  readonly sources: StageTask['inputs'];
}

interface FigureParameters {
  /** Radians; null for the whole image. */
  readonly field: number | null;
  readonly shown: number;
  readonly draws: number;
}

type Draw = (given: Given, parameters: FigureParameters, progress: (fraction: number) => void) => string;

const drawings: Readonly<Record<string, Draw>> = {
  coverage: ({ visibilities }) => drawCoverage(required(visibilities, 'visibilities')),
  data: (given) => drawData(dataPlot(given)),
  image: (given, { field }) => drawImage(imagePlot(given, field)),
  profile: (given, { field }) => drawProfile(profilePlot(given, field)),
  components: ({ basis, remark }, { shown }) => drawComponents(required(basis, 'basis'), shown, remark),
  scree: ({ basis, remark }) => drawScree(required(basis, 'basis'), remark),
  calibration: ({ heading, remark, sources }) => {
    const report = readCalibration(required(sources.calibration?.[0] ?? null, 'calibration'));
    return drawCalibration({ heading, remark, ...report });
  },
  posterior: (given, { draws }, progress) => {
    const { heading, remark, truth, sources } = given;
    const [basis, samples] = [required(given.basis, 'basis'), required(given.samples, 'samples')];
    const report = sources.features?.[0];
    const rings =
      report === undefined ? measureRings(basis, samples, draws, progress) : readMeasuredRings(report);
    const found = posteriorMarginals(basis, samples, rings, truth?.image ?? null);
    return drawPosterior({ heading, remark, ...found });
  },
};

/** Draws every output that the runner asks for. */
export function compute(task: StageTask): StageReport {
  const given = readGiven(task.inputs);
  const { field, shown, draws } = task.parameters as { field?: number; shown: number; draws: number };
  const parameters = { field: field === undefined ? null : field * MICROARCSEC, shown, draws };
  const wanted = Object.keys(drawings).filter((name) => name in task.outputs);
  wanted.forEach((name, k) => {
    const progress = (fraction: number) => task.progress((k + fraction) / wanted.length);
    const svg = new TextEncoder().encode(drawings[name](given, parameters, progress));
    task.outputs[name].write(svg);
    task.note('drew a figure', { figure: name, bytes: svg.length });
    progress(1);
  });
  return {};
}

function readGiven(sources: StageTask['inputs']): Given {
  const read = <T>(name: string, reader: (source: ByteSource) => T): T | null => {
    const source = sources[name]?.[0];
    return source === undefined ? null : reader(source);
  };
  const visibilities = read('visibilities', readVisibilities);
  const basis = read('basis', readBasis);
  const samples = read('samples', readPosterior);
  const ring = read('ring', readNumbers);
  const truth = read('truth', readSkyImage);
  if (basis !== null && samples !== null) requireMatch(basis, samples, sources.samples[0]);
  return {
    visibilities,
    image: read('image', readSkyImage),
    basis,
    samples,
    ring,
    truth: truth === null ? null : truthAtResolution(truth, basis),
    heading: visibilities?.target.name ?? '',
    remark: visibilities?.remark || (ring?.remarks.find((text) => /\binvented\b/i.test(text)) ?? ''),
    sources,
  };
}

/** The truth as the library's band limit would show it, so that it can be compared with the image. */
function truthAtResolution(image: SkyImage, basis: Basis | null): { image: SkyImage; label: string } {
  const fwhm = basis?.resolutionRadians ?? 0;
  if (!(fwhm > 0)) return { image, label: 'truth' };
  const unit = angleUnit(fwhm);
  const size = (fwhm / unit.radians).toFixed(1).replace(/\.0$/, '');
  return { image: blurred(image, fwhm), label: `truth, blurred to ${size} ${unit.name}` };
}

function dataPlot({ heading, remark, sources }: Given) {
  const residuals = readResiduals(required(sources.residuals?.[0] ?? null, 'residuals'));
  const report = sources.calibration?.[0];
  const calibration = report === undefined ? '' : describeFindings(readFindings(report));
  return { heading, remark, ...residuals, calibration };
}

function imagePlot(given: Given, field: number | null) {
  const { heading, remark, ring, truth, visibilities } = given;
  const image = required(given.image, 'image');
  const beam = visibilities === null ? null : beamOf(...measuredPoints(visibilities));
  return { heading, remark, image, field: fieldOf(image, field), beam, ring, centre: centreOf(image), truth };
}

function profilePlot(given: Given, field: number | null) {
  const { heading, remark, ring, basis, samples } = given;
  const image = required(given.image, 'image');
  const truth = given.truth === null ? null : { ...given.truth, centre: centreOf(given.truth.image) };
  const posterior = basis === null || samples === null ? null : { basis, samples };
  return {
    heading,
    remark,
    image,
    centre: centreOf(image),
    reach: fieldOf(image, field) / 2,
    posterior,
    ring,
    truth,
  };
}

function fieldOf({ nx, ny, pixelRadians }: SkyImage, field: number | null): number {
  return field ?? Math.max(nx, ny) * pixelRadians;
}

/** The centre of the ring if there is one, else the centroid. */
function centreOf(image: SkyImage): Place {
  if (!(image.nx >= 8 && image.ny >= 8 && image.pixels.some((value) => value > 0))) return centroid(image);
  const ring = measureRing(image);
  return ring.ring ? { east: ring.centreEast, north: ring.centreNorth } : centroid(image);
}

function requireMatch(basis: Basis, samples: Posterior, source: ByteSource): void {
  if (samples.components <= basis.components.length && samples.count > 0) return;
  throw new InputProblem({
    code: 'wrong-basis',
    place: source.name,
    expected: `draws with at most the ${basis.components.length} components of the basis`,
    found: `${samples.count} draws of ${samples.components} components`,
    advice: 'Give the samples and the basis of one fit.',
  });
}

function required<T>(value: T | null, name: string): T {
  if (value !== null) return value;
  throw new InputProblem({
    code: 'missing-input',
    place: name,
    expected: 'an input of that name',
    found: 'none',
    advice: 'Give it in the recipe; this figure is drawn from it.',
  });
}
