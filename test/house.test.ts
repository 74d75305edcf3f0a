import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join, relative, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { importsOf } from '../runner/code-digest.ts';

const root = dirname(dirname(fileURLToPath(import.meta.url)));

function sourcesBelow(folder: string): string[] {
  return readdirSync(join(root, folder), { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.ts'))
    .map((name) => join(folder, name))
    .sort();
}

/** Relative imports of a file, as paths below the root. */
function ownImports(file: string): string[] {
  const source = readFileSync(join(root, file), 'utf8').replaceAll('import type', 'import');
  return importsOf(source)
    .filter((specifier) => specifier.startsWith('.'))
    .map((specifier) => relative(root, resolve(root, dirname(file), specifier)));
}

function violations(folder: string, allowed: (imported: string, file: string) => boolean): string[] {
  return sourcesBelow(folder).flatMap((file) =>
    ownImports(file)
      .filter((imported) => !allowed(imported, file))
      .map((imported) => `${file} imports ${imported}`),
  );
}

describe('the rules of import (design, section 2)', () => {
  it('keeps the ledger to itself', () => {
    expect(violations('ledger', (imported) => imported.startsWith('ledger/'))).toEqual([]);
  });

  it('keeps stages from the runner and the ledger', () => {
    expect(violations('stages', (imported) => imported.startsWith('stages/'))).toEqual([]);
  });

  it('keeps numerics to itself', () => {
    expect(violations('stages/numerics', (imported) => imported.startsWith('stages/numerics/'))).toEqual([]);
  });

  it('keeps one kind out of another', () => {
    const kindFolder = (path: string) => path.split('/')[1] ?? '';
    const shared = new Set(['formats', 'imaging', 'numerics']);
    const foreign = (imported: string, file: string) =>
      kindFolder(file) === 'kinds.ts' ||
      !imported.slice('stages/'.length).includes('/') ||
      shared.has(kindFolder(imported)) ||
      kindFolder(imported) === kindFolder(file);
    expect(violations('stages', foreign)).toEqual([]);
  });

  it('finds imports at all', () => {
    expect(ownImports('runner/execute.ts')).toContain('ledger/book.ts');
    expect(violations('runner', (imported) => !imported.startsWith('ledger/')).length).toBeGreaterThan(0);
  });
});

describe('what differs between processors', () => {
  it('is not used in stages', () => {
    const forbidden =
      /\bMath\.(sin|cos|tan|asin|acos|atan|atan2|sinh|cosh|tanh|asinh|acosh|atanh|exp|expm1|log|log2|log10|log1p|pow|hypot|cbrt|random)\b|[\w)\]]\s*\*\*\s*[\w(-]/;
    const code = (line: string) =>
      line.replace(/^\s*(\/\*\*|\*|\/\/).*$/, '').replace(/'[^']*'|`[^`]*`/g, "''");
    const found = sourcesBelow('stages').flatMap((file) =>
      readFileSync(join(root, file), 'utf8')
        .split('\n')
        .flatMap((line, i) => (forbidden.test(code(line)) ? [`${file}:${i + 1}: ${line.trim()}`] : [])),
    );
    expect(found).toEqual([]);
    expect(forbidden.test('x = Math.sin(1)')).toBe(true);
    expect(forbidden.test('x = y ** 2')).toBe(true);
  });

  it('is refused by the linter', () => {
    const config = JSON.parse(readFileSync(join(root, 'biome.json'), 'utf8'));
    const rule = config.overrides.find((each: { includes: string[] }) =>
      each.includes.includes('stages/**/*.ts'),
    );
    expect(rule.plugins).toContain('./lint/no-platform-math.grit');
  });
});
