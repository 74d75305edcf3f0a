import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { PassThrough } from 'node:stream';
import { describe, expect, it } from 'vitest';
import type { Io } from '../../runner/command.ts';
import { isOrcid, writer } from '../../runner/configuration.ts';
import { temporaryFolder } from './test-jobs.ts';

function io(env: Record<string, string>): Io {
  const silent = () => {};
  return {
    out: silent,
    err: silent,
    errorStream: new PassThrough(),
    cwd: '/',
    env,
    terminal: false,
    columns: 80,
  };
}

function configured(text: string): Promise<unknown> {
  const file = join(temporaryFolder(), 'config.yaml');
  writeFileSync(file, text);
  return writer(io({ PLATEBOOK_CONFIG: file }), undefined);
}

describe('who writes', () => {
  it('comes from --by, then the environment, then the configuration, then nobody', async () => {
    expect(await writer(io({ PLATEBOOK_BY: 'B. Second' }), 'A. First')).toEqual({ name: 'A. First' });
    expect(await writer(io({ PLATEBOOK_BY: 'B. Second' }), undefined)).toEqual({ name: 'B. Second' });
    expect(await configured('by: { name: C. Third, orcid: 0000-0002-1825-0097 }')).toEqual({
      name: 'C. Third',
      orcid: '0000-0002-1825-0097',
    });
    expect(await configured('')).toEqual({ name: 'unnamed' });
    expect(await writer(io({}), undefined)).toEqual({ name: 'unnamed' });
  });

  it('is refused with a place and advice when it is wrong', async () => {
    await expect(configured('by: { name: A, orcid: 0000-0002-1825-0098 }')).rejects.toThrow('is no ORCID');
    await expect(configured('by: { nam: A }')).rejects.toThrow('config.yaml: expected by:');
    await expect(configured('by: [')).rejects.toThrow('Correct it or leave it out.');
    await expect(writer(io({}), 'a\u0007b')).rejects.toThrow('--by: expected by:');
  });

  it('knows the check digit of an ORCID', () => {
    // The example of the scheme's own documentation; the digit X from the same place. From memory.
    expect(isOrcid('0000-0002-1825-0097')).toBe(true);
    expect(isOrcid('0000-0002-1694-233X')).toBe(true);
    expect(isOrcid('0000-0002-1825-0079')).toBe(false);
    expect(isOrcid('0000-0002-1694-2330')).toBe(false);
    expect(isOrcid('0000000218250097')).toBe(false);
  });
});
