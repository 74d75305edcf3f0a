/** `kinds [KIND]`: the stage kinds with their inputs, parameters, units and outputs. */

import type {
  InputDeclaration,
  OutputDeclaration,
  ParameterDeclaration,
  StageKind,
} from '../../stages/kind.ts';
import { didYouMean } from '../../stages/near-miss.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { RunnerProblem } from '../problem.ts';
import { quoted } from '../recipe/cells.ts';
import { describeParameter, enumerate, formatsOf } from '../recipe/describe.ts';
import { isRequired } from '../recipe/schema.ts';
import { wrapped } from '../wrapped.ts';

export interface KindsOptions extends CommonOptions {
  /** The program's kinds by default. */
  readonly kinds?: readonly StageKind[];
}

const WIDTH = 100;

/** Prints one line for each kind, or one kind in full. @throws RunnerProblem `unknown-kind` with the near miss. */
export async function kindsCommand(
  name: string | undefined,
  options: KindsOptions,
  io: Io,
): Promise<ExitStatus> {
  const kinds = options.kinds ?? (await import('../../stages/kinds.ts')).stageKinds;
  if (name === undefined) {
    io.out(options.json ? formatJson({ kinds: kinds.map(declarationOf) }) : formatList(kinds));
    return 0;
  }
  const kind = kinds.find((candidate) => candidate.kind === name);
  if (kind === undefined) throw unknownKind(name, kinds);
  io.out(options.json ? formatJson(declarationOf(kind)) : formatKind(kind));
  return 0;
}

function unknownKind(name: string, kinds: readonly StageKind[]): RunnerProblem {
  const names = kinds.map(({ kind }) => kind);
  const advice = didYouMean(name, names).trim() || 'Name one of them.';
  const message = `kinds: unknown-kind: expected ${enumerate(names, 'or')}, got ${quoted(name)}. ${advice}`;
  return new RunnerProblem('unknown-kind', message);
}

function declarationOf({ kind, version, doc, source, inputs, parameters, outputs }: StageKind) {
  return { kind, version, doc, source, inputs, parameters, outputs };
}

function formatJson(value: unknown): string {
  return `${JSON.stringify(value, null, 2)}\n`;
}

function formatList(kinds: readonly StageKind[]): string {
  const width = Math.max(...kinds.map(({ kind }) => kind.length));
  const items = kinds.map(({ kind, doc }) => {
    const summary = doc.split(/(?<=\.)\s/)[0] ?? doc;
    const text = wrapped(summary, WIDTH, width + 2).trimStart();
    return `${kind.padEnd(width)}  ${text}`;
  });
  return `${items.join('\n')}\n`;
}

function formatKind(kind: StageKind): string {
  const sections = [
    [
      `${kind.kind}, version ${kind.version}`,
      wrapped(kind.doc, WIDTH, 2),
      '',
      wrapped(`Source: ${kind.source}`, WIDTH, 2),
    ],
    section('Inputs', Object.entries(kind.inputs), formatInput),
    section('Parameters', Object.entries(kind.parameters), (name, parameter) =>
      formatParameter(name, parameter, 2),
    ),
    section('Outputs', Object.entries(kind.outputs), formatOutput),
  ];
  return `${sections.map((lines) => lines.join('\n')).join('\n\n')}\n`;
}

function section<T>(
  title: string,
  entries: readonly [string, T][],
  format: (name: string, item: T) => string[],
) {
  return [
    title,
    ...(entries.length === 0 ? ['  none'] : entries.flatMap(([name, item]) => format(name, item))),
  ];
}

function formatInput(name: string, input: InputDeclaration): string[] {
  const details = [formatsOf(input.format).join(' or ')];
  if (input.many) details.push('one or several');
  if (input.optional) details.push('may be left out');
  return [wrapped(`${name}: ${details.join('; ')}`, WIDTH, 2), wrapped(input.doc, WIDTH, 6)];
}

function formatOutput(name: string, output: OutputDeclaration): string[] {
  const needs = output.needs === undefined ? '' : `; made when ${enumerate(output.needs, 'and')} is given`;
  const chosen =
    output.chosenBy === undefined ? '' : `; unless the parameter ${output.chosenBy} leaves it out`;
  return [wrapped(`${name}: ${output.format}${needs}${chosen}`, WIDTH, 2), wrapped(output.doc, WIDTH, 6)];
}

/** Name, type and default on the first line; below it what it is and why; fields of groups further in. */
function formatParameter(name: string, declaration: ParameterDeclaration, indent: number): string[] {
  const { doc, why } = declaration;
  return [
    wrapped(`${name}: ${typeOf(declaration)}; ${presence(declaration)}`, WIDTH, indent),
    wrapped(doc, WIDTH, indent + 4),
    ...(why === undefined ? [] : [wrapped(`Default: ${why}`, WIDTH, indent + 4)]),
    ...Object.entries(fieldsOf(declaration)).flatMap(([field, below]) =>
      formatParameter(field, below, indent + 4),
    ),
  ];
}

function typeOf(declaration: ParameterDeclaration): string {
  if (declaration.type === 'group') return 'a map with the fields below';
  if (Object.keys(fieldsOf(declaration)).length === 0) return describeParameter(declaration);
  if (declaration.type === 'either') return declaration.of.map(typeOf).join(', or ');
  return `${declaration.type === 'list' ? 'a list' : 'a map from names'}, each a map with the fields below`;
}

function presence(declaration: ParameterDeclaration): string {
  if (declaration.default !== undefined) return `default ${formatValue(declaration.default)}`;
  if (declaration.optional) return 'may be left out';
  return isRequired(declaration) ? 'required' : "default: its fields' defaults";
}

/** A default as a recipe would write it, on one line. */
function formatValue(value: unknown): string {
  if (Array.isArray(value)) return `[${value.map(formatValue).join(', ')}]`;
  if (typeof value !== 'object' || value === null) return String(value);
  const entries = Object.entries(value).map(([key, item]) => `${key}: ${formatValue(item)}`);
  return entries.length === 0 ? '{}' : `{ ${entries.join(', ')} }`;
}

/** Fields of a group, or of the group that a list, a map or an alternative holds. */
function fieldsOf(declaration: ParameterDeclaration): Readonly<Record<string, ParameterDeclaration>> {
  switch (declaration.type) {
    case 'group':
      return declaration.fields;
    case 'list':
    case 'map':
      return fieldsOf(declaration.of);
    case 'either':
      return Object.assign({}, ...declaration.of.map(fieldsOf));
    default:
      return {};
  }
}
