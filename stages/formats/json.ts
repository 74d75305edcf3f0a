/** The formats `json` and `numbers`: UTF-8, two spaces of indentation, a final newline, numbers as ECMAScript writes
 *  them. Layout: CONVENTIONS. JSON: RFC 8259. */

import { z } from 'zod';
import type { ByteSink, ByteSource } from '../bytes.ts';
import { readAll } from '../bytes.ts';
import type { Numbers, NumberValue } from '../data.ts';
import { InputProblem, InternalError } from '../problem.ts';

/** Parses a JSON document. @throws InputProblem when it is no JSON in UTF-8. */
export function readJson(source: ByteSource): unknown {
  try {
    return JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(readAll(source)));
  } catch (cause) {
    if (cause instanceof InputProblem) throw cause;
    throw new InputProblem(
      {
        code: 'bad-json',
        place: source.name,
        expected: 'one JSON document in UTF-8',
        found: (cause as Error).message,
        advice: 'Correct the file at that place.',
      },
      { cause },
    );
  }
}

/** Writes a value; typed arrays become lists.
 *  @throws InternalError for a number that is not finite, which JSON cannot hold */
export function writeJson(sink: ByteSink, value: unknown): void {
  const text = JSON.stringify(
    value,
    (key, each: unknown) => {
      if (typeof each === 'number' && !Number.isFinite(each)) {
        throw new InternalError('writeJson', `${key === '' ? 'the value' : key} is ${each}`);
      }
      return ArrayBuffer.isView(each) ? Array.from(each as Float64Array) : each;
    },
    2,
  );
  if (text === undefined) throw new InternalError('writeJson', `${typeof value} is no JSON value`);
  sink.write(new TextEncoder().encode(`${text}\n`));
}

const numberSchema = z.strictObject({
  value: z.number(),
  unit: z.string(),
  low: z.number().optional(),
  high: z.number().optional(),
  low95: z.number().optional(),
  high95: z.number().optional(),
  definition: z.string(),
});

const numbersSchema = z.strictObject({
  values: z.record(z.string(), numberSchema),
  remarks: z.array(z.string()),
});

/** Reads a `numbers` document. @throws InputProblem that names the place within the document. */
export function readNumbers(source: ByteSource): Numbers {
  const result = numbersSchema.safeParse(readJson(source));
  if (result.success) return result.data as Numbers;
  const [issue] = result.error.issues;
  throw new InputProblem({
    code: 'bad-numbers',
    place: `${source.name}, ${issue?.path.join('.') || 'the document'}`,
    expected: 'a document of values (value, unit, definition and intervals) and remarks',
    found: issue?.message ?? 'something else',
    advice: 'Give the output of a stage whose format is numbers.',
  });
}

/** Writes a `numbers` document, keys in the order of the type. @throws InternalError for a value that is not finite */
export function writeNumbers(sink: ByteSink, numbers: Numbers): void {
  const values = Object.fromEntries(
    Object.entries(numbers.values).map(([name, number]) => [name, inOrder(number)]),
  );
  writeJson(sink, { values, remarks: numbers.remarks });
}

function inOrder({ value, unit, low, high, low95, high95, definition }: NumberValue): NumberValue {
  return {
    value,
    unit,
    ...(low === undefined ? {} : { low }),
    ...(high === undefined ? {} : { high }),
    ...(low95 === undefined ? {} : { low95 }),
    ...(high95 === undefined ? {} : { high95 }),
    definition,
  };
}
