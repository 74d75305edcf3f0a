/** The problem of a file of uv data that is not as it should be. */

import { InputProblem } from '../problem.ts';

export function uvProblem(code: string, place: string, expected: string, found: string): InputProblem {
  return new InputProblem({
    code,
    place,
    expected,
    found,
    advice: 'The file is no uv data as this program reads them: correct it with the program that wrote it.',
  });
}
