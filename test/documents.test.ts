import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { platebook } from './runner/test-io.ts';
import { temporaryFolder } from './runner/test-jobs.ts';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const readme = readFileSync(join(root, 'README.md'), 'utf8');

function documents(): string[] {
  return readdirSync(root, { recursive: true, encoding: 'utf8' })
    .filter((path) => path.endsWith('.md') && !/(^|\/)(node_modules|lib|book|plates)\//.test(path))
    .sort();
}

describe('documents', () => {
  it('link to what exists', () => {
    const broken = documents().flatMap((path) =>
      [...readFileSync(join(root, path), 'utf8').matchAll(/\]\(([^)#\s]+)[^)]*\)/g)]
        .map(([, target]) => target ?? '')
        .filter((target) => !/^[a-z]+:/.test(target) && !existsSync(join(root, dirname(path), target)))
        .map((target) => `${path}: ${target}`),
    );
    expect(broken).toEqual([]);
  });

  it('name files and scripts of this tree that exist', () => {
    const named = [
      ...`${readme}${readFileSync(join(root, 'DEVELOPERS.md'), 'utf8')}`.matchAll(
        /`([\w./-]+\.(?:ts|sh|md|json|yaml))`/g,
      ),
    ]
      .map(([, path]) => path ?? '')
      .filter((path) => path.includes('/') && !path.includes('KIND') && !path.startsWith('plates/'));
    expect(named.length).toBeGreaterThan(5);
    expect(named.filter((path) => !existsSync(join(root, path)))).toEqual([]);
  });
});

describe('the README', () => {
  it('names commands that exist, each with an example in its help', async () => {
    const commands = [...new Set([...readme.matchAll(/npx platebook (\w+)/g)].map(([, word]) => word ?? ''))];
    expect(commands.length).toBeGreaterThanOrEqual(8);
    for (const command of commands) {
      const { status, out } = await platebook(root, [command, '--help']);
      expect({ command, status }).toEqual({ command, status: 0 });
      expect(out).toContain('Example:\n  platebook');
    }
  });

  it('shows a recipe that passes proofreading', async () => {
    const folder = temporaryFolder();
    mkdirSync(folder, { recursive: true });
    const recipe = /```yaml\n([\s\S]*?)```/.exec(readme)?.[1] ?? '';
    writeFileSync(join(folder, 'my-ring.yaml'), recipe);
    writeFileSync(join(folder, 'upper-band.uvfits'), 'stands for data');
    const { status, out } = await platebook(folder, ['proofread', 'my-ring.yaml']);
    expect(out).toContain('nothing wrong');
    expect(status).toBe(0);
  });

  it('tells npm’s commands as package.json has them', () => {
    const { scripts } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'));
    expect(Object.keys(scripts)).toEqual(expect.arrayContaining(['start', 'test']));
    expect(readme).toContain('npm ci && npm start');
  });
});
