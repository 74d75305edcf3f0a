/** Recorded code whose packages are not the installed ones: they come from the registry, by the recorded lock file. */

import { spawnSync } from 'node:child_process';
import { mkdirSync, mkdtempSync, readFileSync, writeFileSync } from 'node:fs';
import { homedir, tmpdir } from 'node:os';
import { join } from 'node:path';
import { expect, test } from 'vitest';
import { declaration, forgeBook, recordedText } from '../runner/recorded-code/forged-book.ts';
import { platebook } from './small-disk.ts';

/** A package of which another version is installed here. */
const OLD = '4.0.3';
const INSTALLED = JSON.parse(
  readFileSync(new URL('../../node_modules/fft.js/package.json', import.meta.url), 'utf8'),
).version as string;

/** What this user and this machine told the package manager: certificates and registries that it cannot do without. */
const SETTINGS: Record<string, string> = {
  npm_config_userconfig: join(homedir(), '.npmrc'),
  ...Object.fromEntries(
    Object.entries(process.env).flatMap(([name, value]) =>
      value !== undefined && /^npm_config_|^NODE_EXTRA_CA_CERTS$/i.test(name) ? [[name, value]] : [],
    ),
  ),
};

/** Writes the recorded text, and only with the recorded version. */
const computation = `import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import FFT from 'fft.js';
export const compute = async (task: any): Promise<object> => {
  const require = createRequire(import.meta.url);
  const { version } = JSON.parse(readFileSync(require.resolve('fft.js/package.json'), 'utf8'));
  const made = version === '${OLD}' && new FFT(4).size === 4 ? ${JSON.stringify(recordedText)} : version;
  for (const sink of Object.values(task.outputs) as any[]) sink.write(Buffer.from(made));
  return {};
};
`;

/** A lock file of the old version, made by the package manager; null where the registry is out of reach. */
function lockFile(folder: string): { package: string; lock: string } | null {
  const at = join(folder, 'lock');
  mkdirSync(at);
  const text = `${JSON.stringify({ name: 'recorded', version: '1.0.0', type: 'module', dependencies: { 'fft.js': OLD } })}\n`;
  writeFileSync(join(at, 'package.json'), text);
  const words = ['install', '--package-lock-only', '--ignore-scripts', '--no-audit', '--no-fund'];
  if (spawnSync('npm', words, { cwd: at }).status !== 0) return null;
  return { package: text, lock: readFileSync(join(at, 'package-lock.json'), 'utf8') };
}

test('are installed, and the rerun is identical', () => {
  expect(INSTALLED).not.toBe(OLD);
  const folder = mkdtempSync(join(tmpdir(), 'platebook-old-'));
  const texts = lockFile(folder);
  if (texts === null) {
    console.log('left out: the package registry is not within reach');
    return;
  }
  const sources = { 'stages/features/features.ts': declaration, 'stages/features/compute.ts': computation };
  forgeBook(folder, sources, { packages: { 'fft.js': OLD }, texts });
  const { status, out, err } = platebook(['rerun', '1', '--as-recorded', '--json'], folder, {
    HOME: folder,
    ...SETTINGS,
    PLATEBOOK_KEY: join(folder, 'key.pem'),
  });
  expect(err).toBe('');
  expect(JSON.parse(out)).toMatchObject({ verdict: 'identical' });
  expect(status).toBe(0);
});
