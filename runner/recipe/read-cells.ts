/** YAML as a tree of cells.
 *
 *  YAML 1.2 with the core schema, one document. Anchors, aliases and `<<: *alias` are written out here, with a limit
 *  on what they grow to; tags, doubled keys and keys that are no text are refused. What is wrong goes into a list. */

import { Composer, isAlias, isMap, isScalar, isSeq, Lexer, type ParsedNode, Parser } from 'yaml';
import { type Cell, type CellEntry, describeCell, quoted, type Scalar } from './cells.ts';
import { type ProblemList, printable } from './recipe-problems.ts';
import type { SourceText, Spot } from './source-text.ts';

/** Lexemes in the text: three times what a recipe of a thousand stages has. */
const MOST_LEXEMES = 150_000;
/** Nodes after aliases are written out. */
const MOST_NODES = 30_000;
/** Nesting, aliases written out. The deepest parameter of a kind stands at 8. */
const DEEPEST = 64;
const LONGEST_KEY = 200;

const CORE_TAGS = ['str', 'int', 'float', 'bool', 'null', 'map', 'seq'].map(
  (tag) => `tag:yaml.org,2002:${tag}`,
);

/** Reads one YAML document. Undefined, and a problem in the list, when there is no tree to speak of. */
export function readCells(source: SourceText, problems: ProblemList): Cell | undefined {
  const before = problems.count;
  checkCharacters(source, problems);
  if (problems.count > before) return undefined;
  const contents = compose(source, problems);
  if (problems.count > before || contents === undefined) return undefined;
  return writtenOut(contents, source, problems);
}

/** YAML 1.2.2, section 5.1: characters that a stream may hold. */
function checkCharacters(source: SourceText, problems: ProblemList): void {
  const bad = /(?![\t\n\r\u0085])[\p{Cc}\ufeff\ufffe\uffff]/u.exec(source.text);
  if (bad === null) return;
  problems.add({
    spot: { source, offset: bad.index },
    code: 'control-character',
    path: '',
    expected: 'printable text',
    found: `the character ${codePoint(bad[0])}`,
  });
}

function codePoint(character: string): string {
  return `U+${(character.codePointAt(0) as number).toString(16).toUpperCase().padStart(4, '0')}`;
}

/** The root node of the only document; null contents stand for an empty text. */
function compose(source: SourceText, problems: ProblemList): ParsedNode | null | undefined {
  const tokens = tokenize(source, problems);
  if (tokens === undefined) return undefined;
  const composer = new Composer({ version: '1.2', schema: 'core', uniqueKeys: false, prettyErrors: false });
  const [first, second] = composer.compose(tokens, true, source.text.length);
  for (const error of [...first.errors, ...first.warnings]) {
    const spot = { source, offset: Math.min(error.pos[0], source.text.length) };
    if (error.code === 'TAG_RESOLVE_FAILED') addTagProblem(spot, problems);
    else problems.add({ spot, code: 'syntax', path: '', ...syntaxFault(error.code, error.message) });
  }
  if (second !== undefined) {
    problems.add({
      spot: { source, offset: Math.min(second.range[0], source.text.length) },
      code: 'several-documents',
      path: '',
      expected: 'one YAML document',
      found: 'the start of a second',
    });
  }
  return first.contents as ParsedNode | null;
}

/** Tokens of the text, or undefined when nesting or size are beyond the limits. */
function tokenize(source: SourceText, problems: ProblemList) {
  const parser = new Parser();
  const tokens = [];
  let lexemes = 0;
  for (const lexeme of new Lexer().lex(source.text)) {
    tokens.push(...parser.next(lexeme));
    lexemes++;
    const spot = { source, offset: Math.min(parser.offset, source.text.length) };
    // A level of nesting takes at most two places on the parser's stack, besides document and scalar.
    if (parser.stack.length > 2 * DEEPEST + 2) return void addTooDeep(spot, problems);
    if (lexemes > MOST_LEXEMES) return void addTooMany(spot, problems);
  }
  tokens.push(...parser.end());
  return tokens;
}

/** What the parser's codes mean in a recipe: what stands there, and what to do. */
const syntaxFaults: Readonly<Record<string, readonly [found: string, advice: string]>> = {
  TAB_AS_INDENT: ['a tab', 'Indent with spaces.'],
  BLOCK_AS_IMPLICIT_KEY: ['a second `:` in one line', 'Put text that holds `: ` into quotes.'],
  BAD_SCALAR_START: ['a character that cannot begin plain text', 'Put the text into quotes.'],
  BAD_DQ_ESCAPE: ['an unknown `\\` escape', 'Write `\\\\` for a backslash, or use single quotes.'],
  BAD_DIRECTIVE: ['a directive', 'Delete the line: recipes are YAML 1.2 without directives.'],
};

/** Other faults in the parser's own words. */
function syntaxFault(code: string, message: string) {
  if (Object.hasOwn(syntaxFaults, code)) {
    const [found, advice] = syntaxFaults[code];
    return { expected: 'well-formed YAML', found, advice };
  }
  return { expected: 'well-formed YAML', found: `a fault: ${printable(message.split('\n')[0])}` };
}

interface Expansion {
  readonly source: SourceText;
  readonly problems: ProblemList;
  /** Anchored nodes that stand before, by anchor. */
  readonly targets: ReadonlyMap<ParsedNode, ParsedNode | undefined>;
  /** Nodes that are being written out, from the root down. */
  readonly open: ParsedNode[];
  nodes: number;
  /** Set when a limit was passed: nothing more is written out. */
  exhausted: boolean;
}

function writtenOut(root: ParsedNode | null, source: SourceText, problems: ProblemList): Cell | undefined {
  if (root === null) return { type: 'scalar', value: null, written: '', spot: { source, offset: 0 } };
  const targets = resolveAliases(root, source, problems);
  const expansion: Expansion = { source, problems, targets, open: [], nodes: 0, exhausted: false };
  const cell = expand(root, expansion);
  return expansion.exhausted ? undefined : cell;
}

/** The node that each alias stands for: the last with that anchor before it (YAML 1.2.2, section 3.2.2.2). Tags are
 *  refused on the way. */
function resolveAliases(root: ParsedNode, source: SourceText, problems: ProblemList) {
  const anchors = new Map<string, ParsedNode>();
  const targets = new Map<ParsedNode, ParsedNode | undefined>();
  const pending: (ParsedNode | null)[] = [root];
  for (let node = pending.pop(); node !== undefined; node = pending.pop()) {
    if (node === null) continue;
    if (isAlias(node)) {
      targets.set(node, anchors.get(node.source));
      continue;
    }
    if (node.anchor !== undefined) anchors.set(node.anchor, node);
    if (node.tag !== undefined && node.tag !== '!' && !CORE_TAGS.includes(node.tag)) {
      addTagProblem({ source, offset: node.range[0] }, problems);
    }
    if (isMap(node)) for (const { key, value } of node.items.toReversed()) pending.push(value, key);
    else if (isSeq(node)) pending.push(...node.items.toReversed());
  }
  return targets;
}

function expand(node: ParsedNode | null, expansion: Expansion, fallback = 0): Cell {
  const { source, problems, open } = expansion;
  const spot = { source, offset: node === null ? fallback : node.range[0] };
  const nothing: Cell = { type: 'scalar', value: null, written: '', spot };
  if (node === null || expansion.exhausted) return nothing;
  expansion.nodes++;
  if (expansion.nodes > MOST_NODES || open.length > DEEPEST) {
    expansion.exhausted = true;
    if (open.length > DEEPEST) addTooDeep(spot, problems);
    else addTooMany(spot, problems);
    return nothing;
  }
  open.push(node);
  const cell = expandOpen(node, spot, expansion);
  open.pop();
  return cell;
}

function expandOpen(node: ParsedNode, spot: Spot, expansion: Expansion): Cell {
  if (isAlias(node)) return expandAlias(node, spot, expansion);
  if (isMap(node)) return { type: 'map', spot, entries: expandEntries(node, expansion) };
  if (isSeq(node)) {
    return { type: 'list', spot, items: node.items.map((item) => expand(item, expansion, spot.offset)) };
  }
  return { type: 'scalar', spot, value: node.value as Scalar, written: node.source };
}

/** What an alias stands for, at the alias's own place: that is where it does not fit. */
function expandAlias(node: ParsedNode & { source: string }, spot: Spot, expansion: Expansion): Cell {
  const { problems, targets, open } = expansion;
  const target = targets.get(node);
  const path = '';
  if (target !== undefined && !open.includes(target)) return { ...expand(target, expansion), spot };
  if (target === undefined) {
    const expected = `an anchor \`&${node.source}\` before this alias`;
    problems.add({ spot, code: 'unknown-alias', path, expected, found: 'none' });
  } else {
    const found = `\`*${node.source}\` inside \`&${node.source}\``;
    problems.add({ spot, code: 'alias-loop', path, expected: 'an alias of something else', found });
  }
  expansion.exhausted = true;
  return { type: 'scalar', value: null, written: '', spot };
}

type MapNode = Extract<ParsedNode, { items: { key: unknown }[] }>;

function expandEntries(node: MapNode, expansion: Expansion): CellEntry[] {
  const entries = new Map<string, CellEntry>();
  const merged: CellEntry[] = [];
  for (const pair of node.items) {
    const key = pair.key as ParsedNode | null;
    const spot = { source: expansion.source, offset: key === null ? node.range[0] : key.range[0] };
    const value = expand(
      pair.value as ParsedNode | null,
      expansion,
      isScalar(key) ? key.range[1] : spot.offset,
    );
    if (isScalar(key) && key.source === '<<' && key.type === 'PLAIN') {
      merged.push(...mergedEntries(value, expansion.problems));
      continue;
    }
    const name = checkedKey(key, spot, expansion.problems);
    if (name === undefined) continue;
    const first = entries.get(name);
    if (first === undefined) entries.set(name, { key: name, spot, value });
    else addDoubledKey(name, spot, first.spot, expansion.problems);
  }
  for (const entry of merged) if (!entries.has(entry.key)) entries.set(entry.key, entry);
  return [...entries.values()];
}

/** Entries of the map, or of the list of maps, that `<<` brings in; earlier ones hold. */
function mergedEntries(value: Cell, problems: ProblemList): readonly CellEntry[] {
  if (value.type === 'map') return value.entries;
  if (value.type === 'list' && value.items.every((item) => item.type === 'map')) {
    return value.items.flatMap((item) => (item.type === 'map' ? item.entries : []));
  }
  const expected = 'a map, or a list of maps, after `<<`';
  problems.add({ spot: value.spot, code: 'wrong-type', path: '<<', expected, found: describeCell(value) });
  return [];
}

function checkedKey(key: ParsedNode | null, spot: Spot, problems: ProblemList): string | undefined {
  const name = isScalar(key) && typeof key.source === 'string' ? key.source : '';
  const usable = name !== '' && name !== '__proto__' && name.length <= LONGEST_KEY;
  if (usable && !/[\p{Cc}\p{Cf}\u2028\u2029]/u.test(name)) return name;
  const expected = `a name of 1 to ${LONGEST_KEY} printable characters before the colon`;
  const found = name === '' ? 'none' : quoted(name);
  problems.add({ spot, code: 'bad-key', path: '', expected, found });
  return undefined;
}

function addDoubledKey(name: string, spot: Spot, first: Spot, problems: ProblemList): void {
  const line = first.source.lines?.linePos(first.offset).line;
  const found = line === undefined ? 'it twice' : `it here and in line ${line}`;
  problems.add({ spot, code: 'doubled-key', path: name, expected: 'each key once', found });
}

function addTagProblem(spot: Spot, problems: ProblemList): void {
  problems.add({ spot, code: 'tag', path: '', expected: 'a value without a tag', found: 'a tag' });
}

function addTooDeep(spot: Spot, problems: ProblemList): void {
  const expected = `at most ${DEEPEST} levels of nesting`;
  problems.add({ spot, code: 'too-deep', path: '', expected, found: 'more' });
}

function addTooMany(spot: Spot, problems: ProblemList): void {
  const expected = `at most ${MOST_NODES} values, aliases written out`;
  problems.add({ spot, code: 'too-many-nodes', path: '', expected, found: 'more' });
}
