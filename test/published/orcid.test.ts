/** The check digit of an ORCID, ISO 7064 MOD 11-2. */

import { expect, test } from 'vitest';
import { isOrcid } from '../../runner/configuration.ts';

// The sample identifiers of the scheme's own documentation; from memory.
const SAMPLES = ['0000-0002-1825-0097', '0000-0001-5109-3700', '0000-0002-1694-233X'];

test.each(SAMPLES)('takes %s', (orcid) => {
  expect(isOrcid(orcid)).toBe(true);
});

test.each(SAMPLES)('refuses %s with any one digit changed, or two neighbours exchanged', (orcid) => {
  // ISO 7064: MOD 11-2 finds every single substitution and every transposition of neighbours.
  for (let i = 0; i < orcid.length; i += 1) {
    if (orcid[i] === '-') continue;
    for (const digit of '0123456789X') {
      const changed = orcid.slice(0, i) + digit + orcid.slice(i + 1);
      if (changed !== orcid) expect(isOrcid(changed), changed).toBe(false);
    }
  }
  const digits = orcid.replaceAll('-', '');
  for (let i = 0; i + 1 < digits.length; i += 1) {
    if (digits[i] === digits[i + 1]) continue;
    const swapped = digits.slice(0, i) + digits[i + 1] + digits[i] + digits.slice(i + 2);
    expect(isOrcid(swapped.replace(/(.{4})(?=.)/g, '$1-')), swapped).toBe(false);
  }
});

test.each([
  '',
  '0000000218250097',
  'https://orcid.org/0000-0002-1825-0097',
  '0000-0002-1694-233x',
  ' 0000-0002-1825-0097',
])('refuses the form %j', (text) => {
  expect(isOrcid(text)).toBe(false);
});
