import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { formatManifest, parseManifest } from '../../../runner/bag/manifest.ts';
import {
  collisionKey,
  decodePath,
  encodePath,
  faultOfPath,
  safeName,
  uriOfPath,
} from '../../../runner/bag/paths.ts';
import { formatFetch, parseFetch } from '../../../runner/bag/tag-files.ts';

/** Letters and all that is awkward in a path. */
const awkward = fc.string({
  unit: fc.constantFrom(
    'a',
    'B',
    '%',
    '\r',
    '\n',
    ' ',
    'ü',
    'u\u0308',
    '😀',
    "'",
    '2',
    '5',
    '0',
    'A',
    'D',
    '.',
    '-',
    '*',
    '\\',
  ),
  minLength: 1,
  maxLength: 12,
});
const path = fc
  .array(awkward, { minLength: 1, maxLength: 4 })
  .map((segments) => `data/${segments.join('/')}`)
  .filter((text) => faultOfPath(text) === null);
const digest = fc.stringMatching(/^[0-9a-f]{64}$/);

describe('paths of a bag', () => {
  it('are written as RFC 8493 says', () => {
    // RFC 8493, section 2.1.3: LF, CR and % must be percent-encoded, and nothing else need be.
    expect(encodePath('data/100%\r\nü a.txt')).toBe('data/100%25%0D%0Aü a.txt');
    expect(decodePath('data/100%25%0D%0Aü a.txt')).toBe('data/100%\r\nü a.txt');
    expect(decodePath('data/%2e')).toBeNull();
    expect(decodePath('data/%0a')).toBeNull();
    expect(decodePath('data/50%')).toBeNull();
    expect(decodePath('data/%2525')).toBe('data/%25');
  });

  it('come back as they were, one spelling for each', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary' }), (text) => {
        expect(decodePath(encodePath(text))).toBe(text);
      }),
    );
    fc.assert(
      fc.property(awkward, (written) => {
        const decoded = decodePath(written);
        if (decoded !== null) expect(encodePath(decoded)).toBe(written);
      }),
    );
  });

  it('may not leave the bag, nor mean another file elsewhere', () => {
    const refused: [path: string, fault: string][] = [
      ['', 'no path'],
      ['/etc/passwd', 'an absolute path'],
      ['C:/data/x', 'an absolute path'],
      ['data/../x', 'a path with .. in it'],
      ['..', 'a path with .. in it'],
      ['data/./x', 'a path with . in it'],
      ['data//x', 'a path with an empty name in it'],
      ['data/x/', 'a path with an empty name in it'],
      ['data\\..\\x', 'a name with "\\\\" in it'],
      ['data/a:b', 'a name with ":" in it'],
      ['~/x', 'a name that begins with ~'],
      ['data/nul', 'the name of a device'],
      ['data/COM1.txt', 'the name of a device'],
      ['data/aux.tar.gz', 'the name of a device'],
      ['data/x.', 'a name that ends with a full stop or a space'],
      ['data/x ', 'a name that ends with a full stop or a space'],
      ['data/a\0b', 'a name with a control character in it'],
      ['data/a\u007f', 'a name with a control character in it'],
      [`data/${'a/'.repeat(40)}b`, 'a path of more than 40 levels'],
      [`data/${'ü'.repeat(500)}`, 'a path of more than 1000 bytes'],
      ['data/\ud800', 'a path that is no Unicode text'],
    ];
    for (const [text, fault] of refused) expect(faultOfPath(text), JSON.stringify(text)).toBe(fault);
    for (const text of [
      'data/console.txt',
      'data/a\r\nb',
      'data/100%',
      "data/it's ‘ü’",
      'data/.hidden',
      'data/nulls',
    ]) {
      expect(faultOfPath(text), JSON.stringify(text)).toBeNull();
    }
  });

  it('collide when only case or the way of composing differs', () => {
    expect(collisionKey('data/Straße.txt')).toBe(collisionKey('DATA/STRASSE.TXT'));
    expect(collisionKey('data/u\u0308')).toBe(collisionKey('data/\u00fc'));
    expect(collisionKey('data/a')).not.toBe(collisionKey('data/b'));
  });

  it('are made safe from any name, in one segment, without what sha256sum would misread', () => {
    fc.assert(
      fc.property(fc.oneof(fc.string({ unit: 'binary', maxLength: 200 }), awkward), (name) => {
        const safe = safeName(name);
        expect(faultOfPath(`data/${safe}`)).toBeNull();
        expect(safe).not.toMatch(/[/%\r\n\\]/);
        expect(encodePath(safe)).toBe(safe);
      }),
    );
    expect(safeName('../../etc/passwd')).toBe('_.._.._etc_passwd');
    expect(safeName('NUL')).toBe('_NUL');
    expect(safeName('')).toBe('_');
    expect(safeName('plain name.fits')).toBe('plain name.fits');
  });

  it('are relative references in the crate', () => {
    fc.assert(
      fc.property(path, (text) => {
        const url = new URL(uriOfPath(text), 'https://example.org/bag/');
        expect(decodeURIComponent(url.pathname)).toBe(`/bag/${text}`);
      }),
    );
  });
});

describe('manifests', () => {
  it('come back as they were', () => {
    const manifest = fc.uniqueArray(fc.tuple(path, digest), {
      selector: ([text]) => collisionKey(text),
      maxLength: 12,
    });
    fc.assert(
      fc.property(manifest, (files) => {
        const text = formatManifest(new Map(files));
        expect(text.split('\n').length).toBe(files.length + 1);
        expect(parseManifest(text, 'm')).toEqual(new Map(files.toSorted(([a], [b]) => (a < b ? -1 : 1))));
        expect(formatManifest(parseManifest(text, 'm'))).toBe(text);
      }),
    );
  });

  it('refuse every other line, with its number', () => {
    const a = 'a'.repeat(64);
    const say = (text: string) => {
      try {
        parseManifest(text, 'm');
        return '';
      } catch (error) {
        return (error as Error).message.split('.')[0];
      }
    };
    expect(say(`${a}  data/x`)).toBe('m: expected a line feed at the end of the last line, got none');
    expect(say(`${a}  data/x\n\n`)).toBe(
      'm:2: expected 64 hexadecimal digits in lower case, two spaces and a path, got ""',
    );
    expect(say(`${'A'.repeat(64)}  data/x\n`)).toContain('m:1: expected 64 hexadecimal digits in lower case');
    expect(say(`${a} *data/x\n`)).toContain('m:1: expected 64 hexadecimal digits in lower case');
    expect(say(`${a}  data/x\n${a}  data/x\n`)).toBe('m:2: expected each file once, got "data/x" again');
    expect(say(`${a}  data/x\n${a}  data/X\n`)).toBe(
      'm:2: expected names that differ in more than case, got "data/X" beside "data/x"',
    );
    expect(say(`${a}  data/50%\n`)).toContain(
      'm:1: expected no per cent sign but %25, %0A and %0D, got "data/50%"',
    );
    expect(say(`${a}  /etc/passwd\n`)).toBe(
      'm:1: expected a path below the bag, got an absolute path ("/etc/passwd")',
    );
    expect(say(`${a}  data/\r\n`)).toContain('m:1: expected no per cent sign but %25, %0A and %0D');
  });

  it('give fetch.txt back as it was', () => {
    const item = fc.record({ url: fc.webUrl(), bytes: fc.option(fc.nat()), path });
    fc.assert(
      fc.property(fc.uniqueArray(item, { selector: (each) => each.path, maxLength: 6 }), (items) => {
        const sorted = items.toSorted((x, y) => (x.path < y.path ? -1 : 1));
        expect(parseFetch(formatFetch(items))).toEqual(sorted);
      }),
    );
  });
});
