/** JSON documents that one stage writes and another reads: what is read of them is declared as a schema. */

import type { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { InputProblem } from '../problem.ts';
import { readJson } from './json.ts';

const ADVICE = 'Refer to the right output.';

/** Returns the part of a document that its schema names.
 *  @param expected  whose document it is, such as "the output `report` of a stage of kind fit"
 *  @throws InputProblem, `wrong-document`, at the first place that is otherwise */
export function readDocument<T>(
  schema: z.ZodType<T>,
  source: ByteSource,
  expected: string,
  advice = ADVICE,
): T {
  const result = schema.safeParse(readJson(source));
  if (result.success) return result.data;
  const [issue] = result.error.issues;
  throw new InputProblem({
    code: 'wrong-document',
    place: `${source.name}, ${issue?.path.join('.') || 'the document'}`,
    expected,
    found: issue?.message ?? 'something else',
    advice,
  });
}
