/** Stamping in a thread: the same bytes as at once, and nothing where there is no figure. */

import { afterAll, expect, test } from 'vitest';
import { stampFigure } from '../../../runner/plates/stamp.ts';
import { makeStampAhead } from '../../../runner/plates/stamp-ahead.ts';

const figure = Buffer.from(
  '<svg xmlns="http://www.w3.org/2000/svg" width="300" height="120" viewBox="0 0 300 120"><rect width="90" height="60"/></svg>',
);
const stamp = { plate: '7a-K3Q9M2', title: 'box', recipe: 'boxes', mark: null };
const ahead = makeStampAhead();
afterAll(() => ahead.close());

test('gives the bytes of a figure that is stamped at once', async () => {
  ahead.begin(figure, stamp);
  const [found, once] = [await ahead.take(stamp), await stampFigure(figure, stamp)];
  expect(Buffer.from(found?.svg ?? []).equals(once.svg)).toBe(true);
  expect(Buffer.from(found?.png ?? []).equals(once.png)).toBe(true);
});

test('has nothing for what was not begun, and for what is no figure', async () => {
  expect(await ahead.take({ ...stamp, title: 'another' })).toBeNull();
  const none = { ...stamp, title: 'none' };
  ahead.begin(Buffer.from('no figure'), none);
  expect(await ahead.take(none)).toBeNull();
});

test('has nothing when it is closed before it is done', async () => {
  const closed = makeStampAhead();
  closed.begin(figure, stamp);
  await closed.close();
  expect(await closed.take(stamp)).toBeNull();
});
