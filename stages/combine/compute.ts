/** The computation of `combine`. */

import type { Numbers, NumberValue } from '../data.ts';
import { readNumbers, writeJson, writeNumbers } from '../formats/json.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { angleDifference, circularMean, normalQuantile } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';
import { type Combined, combineSets, type SetValue, stepTo } from './combine-sets.ts';

const UNITS_OF_CIRCLE = ['deg'];
/** Probability of the disagreement below which a warning is given. */
const INCONSISTENT = 0.05;
/** Half a 68 % interval of a normal distribution, as its ends are defined (16 % and 84 %), in standard deviations. */
const HALF = normalQuantile(0.84);
const INDEPENDENT =
  'Combined numbers count their sets as independent: an error that all of them share, such as that of a distance, of a ' +
  "calibration or of the method's bias, is not made smaller by combining, and the intervals do not hold it in full.";

export function compute(task: StageTask): StageReport {
  const { names } = task.parameters as { names: readonly string[] };
  const sets = task.inputs.numbers.map((source) => ({ name: source.name, numbers: readNumbers(source) }));
  requireSets(sets.length);
  const results = names.map((name) => combineNamed(name, sets));
  writeNumbers(task.outputs.numbers, {
    values: Object.fromEntries(results.map(({ name, number }) => [name, number])),
    remarks: [INDEPENDENT, ...new Set(sets.flatMap(({ numbers }) => numbers.remarks))],
  });
  writeJson(task.outputs.report, {
    sets: sets.length,
    numbers: Object.fromEntries(results.map(({ name, combined }) => [name, combined])),
  });
  return {
    warnings: results
      .filter(({ combined }) => combined.probability < INCONSISTENT)
      .map(
        ({ name, combined }) =>
          `${name}: the sets disagree beyond their errors (chi-square ${combined.chiSquare.toFixed(1)} of ` +
          `${combined.degreesOfFreedom}, probability ${combined.probability.toPrecision(2)}); the spread between them is in the interval`,
      ),
  };
}

interface NamedSet {
  readonly name: string;
  readonly numbers: Numbers;
}

function requireSets(count: number): void {
  if (count >= 2) return;
  throw new InputProblem({
    code: 'too-few-sets',
    place: 'input numbers',
    expected: 'two documents or more',
    found: `${count}`,
    advice: 'Name the numbers of every band, day or recipe.',
  });
}

function combineNamed(
  name: string,
  sets: readonly NamedSet[],
): { name: string; combined: Combined; number: NumberValue } {
  const found = sets.map((set) => requireNumber(set, name));
  const unit = found[0].unit;
  const odd = found.findIndex((number) => number.unit !== unit);
  if (odd >= 0) {
    throw problem(
      `${sets[odd].name}, ${name}`,
      `the unit ${unit || 'none'}, as in ${sets[0].name}`,
      found[odd].unit || 'none',
    );
  }
  const isAngle = UNITS_OF_CIRCLE.includes(unit);
  const centre = isAngle ? circularMean(found.map(({ value }) => value)).degrees : 0;
  const place = (value: number) => (isAngle ? centre + angleDifference(value, centre) : value);
  const values = found.map(
    ({ value, low, high }): SetValue => ({
      value: place(value),
      deviation: ((high as number) - (low as number)) / 2 / HALF,
    }),
  );
  const inPlace = combineSets(values);
  // A position angle is given in [0, 360); its interval may run beyond.
  const turn = isAngle ? 360 * Math.floor(inPlace.value / 360) : 0;
  const combined = { ...inPlace, value: inPlace.value - turn };
  const part = (p: number) => combined.value + stepTo(p, combined);
  return {
    name,
    combined,
    number: {
      value: combined.value,
      unit,
      low: part(0.16),
      high: part(0.84),
      low95: part(0.025),
      high95: part(0.975),
      definition:
        `Weighted mean of ${sets.length} sets with a variance between them, intervals by Student's t of ${sets.length - 1} degrees of ` +
        'freedom, none narrower than if the sets agreed; of uneven intervals half the width counts. ' +
        `Definition of each: ${found[0].definition}`,
    },
  };
}

function requireNumber({ name: place, numbers }: NamedSet, name: string): NumberValue {
  const number = Object.hasOwn(numbers.values, name) ? numbers.values[name] : undefined;
  if (number === undefined)
    throw problem(
      `${place}, ${name}`,
      'a number of that name',
      Object.keys(numbers.values).join(', ') || 'none',
    );
  if (number.low !== undefined && number.high !== undefined && number.high > number.low) return number;
  throw problem(`${place}, ${name}`, 'a number with a 68 % interval', `${number.value} without one`);
}

function problem(place: string, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'cannot-combine',
    place,
    expected,
    found,
    advice: 'Combine numbers of one name, unit and definition, each with its error.',
  });
}
