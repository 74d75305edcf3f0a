/** The formats `json` and `numbers`: UTF-8, two spaces of indentation, a final newline, numbers as ECMAScript writes
 *  them. Layout: CONVENTIONS. JSON: RFC 8259. */

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

const requiredFields = { value: 'number', unit: 'string', definition: 'string' } as const;
const intervalFields = ['low', 'high', 'low95', 'high95'] as const;

/** Reads a `numbers` document. @throws InputProblem that names the place within the document. */
export function readNumbers(source: ByteSource): Numbers {
  const document = readJson(source);
  const place = misplaced(document);
  if (place === null) return document as Numbers;
  throw new InputProblem({
    code: 'bad-numbers',
    place: `${source.name}, ${place}`,
    expected: 'a document of values (value, unit, definition and intervals) and remarks',
    found: 'something else there',
    advice: 'Give the output of a stage whose format is numbers.',
  });
}

/** The first place at which a document is no `numbers`; null when it is one. */
function misplaced(document: unknown): string | null {
  if (!isRecord(document)) return 'the document';
  if (!isRecord(document.values)) return 'values';
  const { remarks } = document;
  if (!Array.isArray(remarks) || !remarks.every((remark) => typeof remark === 'string')) return 'remarks';
  for (const [name, number] of Object.entries(document.values)) {
    const field = misplacedField(number);
    if (field !== null) return `values.${name}${field}`;
  }
  const other = Object.keys(document).find((key) => key !== 'values' && key !== 'remarks');
  return other ?? null;
}

function misplacedField(number: unknown): string | null {
  if (!isRecord(number)) return '';
  for (const [field, type] of Object.entries(requiredFields)) {
    if (typeof number[field] !== type || isEndless(number[field])) return `.${field}`;
  }
  for (const [field, value] of Object.entries(number)) {
    if (field in requiredFields) continue;
    const known = intervalFields.some((each) => each === field);
    if (!known || typeof value !== 'number' || isEndless(value)) return `.${field}`;
  }
  return null;
}

/** JSON's grammar allows 1e999, which no double holds. */
function isEndless(value: unknown): boolean {
  return typeof value === 'number' && !Number.isFinite(value);
}

function isRecord(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
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
