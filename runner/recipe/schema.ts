/** The JSON Schema of recipes (draft 2020-12), with which editors complete and check them. Made from the declarations
 *  of the kinds, so that it says what readRecipe checks, as far as a schema can: references, dimensions, loops and
 *  files are beyond it. The same kinds give the same bytes. */

import type { Json } from '../../ledger/entry.ts';
import type { InputDeclaration, ParameterDeclaration, StageKind } from '../../stages/kind.ts';
import { describeParameter, formatsOf } from './describe.ts';
import { NAME } from './keys.ts';

type Schema = { readonly [keyword: string]: Json };

/** A number, a space and a unit. */
const QUANTITY_PATTERN = '^[+-]?([0-9]+\\.?[0-9]*|\\.[0-9]+)([eE][+-]?[0-9]+)? +[^ ].*$';

const text: Schema = { type: 'string', minLength: 1 };

/** The schema's text: two spaces of indentation and a final newline. */
export function formatRecipeSchema(kinds: readonly StageKind[]): string {
  return `${JSON.stringify(recipeSchema(kinds), null, 2)}\n`;
}

export function recipeSchema(kinds: readonly StageKind[]): Schema {
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    title: 'Platebook recipe',
    description: 'Declares the stages of a pipeline and what is published from them.',
    ...object(
      {
        recipe: { type: 'string', pattern: NAME.source, description: 'Name of the recipe.' },
        purpose: { ...text, description: 'What the recipe is for, in a sentence.' },
        stages: { ...named({ $ref: '#/$defs/stage' }), minProperties: 1, description: 'Stages by name.' },
        publish: publishSchema(),
      },
      ['recipe', 'stages'],
    ),
    $defs: {
      file: fileSchema(),
      output: object({ stage: text, output: text }, ['stage', 'output'], 'An output of a stage.'),
      number: numberReference('A number in an output of a stage.', {}),
      reference: { anyOf: [{ $ref: '#/$defs/file' }, { $ref: '#/$defs/output' }] },
      stage: { anyOf: kinds.map(({ kind }) => ({ $ref: `#/$defs/kind-${kind}` })) },
      ...Object.fromEntries(kinds.map((kind) => [`kind-${kind.kind}`, kindSchema(kind)])),
    },
  };
}

function publishSchema(): Schema {
  const tolerance: Schema = {
    anyOf: [
      { type: 'number', minimum: 0 },
      { type: 'string', pattern: QUANTITY_PATTERN },
    ],
    description: 'How far a rerun may deviate, such as `0.01 uas`.',
  };
  const against = { $ref: '#/$defs/number', description: 'The truth of synthetic data.' };
  const number = numberReference('A published number.', { tolerance, against });
  return object(
    { figures: named({ $ref: '#/$defs/output' }), numbers: named(number) },
    [],
    'What is published.',
  );
}

function numberReference(description: string, further: Schema): Schema {
  return object(
    { stage: text, output: text, value: { ...text, description: 'Name of the number.' }, ...further },
    ['stage', 'output', 'value'],
    description,
  );
}

function fileSchema(): Schema {
  const file = { ...text, description: 'Path from the directory of the recipe.' };
  const keep = { type: 'boolean', description: 'Whether the store keeps a copy.' };
  return object({ file, keep }, ['file'], 'A file.');
}

function kindSchema(kind: StageKind): Schema {
  const inputs = Object.entries(kind.inputs);
  const required = inputs.filter(([, input]) => !input.optional).map(([name]) => name);
  const inputsSchema = object(
    Object.fromEntries(inputs.map(([name, input]) => [name, inputSchema(input)])),
    required,
  );
  const parametersSchema = fieldsSchema(kind.parameters);
  const needed = [
    'kind',
    ...(required.length > 0 ? ['inputs'] : []),
    ...(Object.values(kind.parameters).some(isRequired) ? ['parameters'] : []),
  ];
  const properties = { kind: { const: kind.kind }, inputs: inputsSchema, parameters: parametersSchema };
  return object(properties, needed, kind.doc);
}

function inputSchema(input: InputDeclaration): Schema {
  const one: Schema = { $ref: '#/$defs/reference' };
  const description = `${input.doc} Format: ${formatsOf(input.format).join(' or ')}.`;
  if (!input.many) return { ...one, description };
  return { anyOf: [one, { type: 'array', minItems: 1, items: one }], description };
}

function fieldsSchema(fields: Readonly<Record<string, ParameterDeclaration>>): Schema {
  const entries = Object.entries(fields);
  const required = entries.filter(([, field]) => isRequired(field)).map(([name]) => name);
  return object(Object.fromEntries(entries.map(([name, field]) => [name, parameterSchema(field)])), required);
}

/** Whether a recipe must give it: without default, not optional, and no group that its fields' defaults make up. */
export function isRequired(declaration: ParameterDeclaration): boolean {
  if (declaration.optional || declaration.default !== undefined) return false;
  return declaration.type !== 'group' || Object.values(declaration.fields).some(isRequired);
}

function parameterSchema(declaration: ParameterDeclaration): Schema {
  const { doc, why, default: standard } = declaration;
  const sentences = [
    doc,
    `${capital(describeParameter(declaration))}.`,
    why === undefined ? '' : `Default: ${why}`,
  ];
  return {
    description: sentences.filter((sentence) => sentence !== '').join(' '),
    ...(standard === undefined ? {} : { default: standard as Json }),
    ...typeSchema(declaration),
  };
}

function typeSchema(declaration: ParameterDeclaration): Schema {
  switch (declaration.type) {
    case 'integer':
    case 'number':
      return { type: declaration.type, ...bounds('minimum', declaration.from, 'maximum', declaration.to) };
    case 'quantity':
      if (declaration.unit === '') return { type: ['number', 'string'] };
      return {
        type: 'string',
        pattern: QUANTITY_PATTERN,
        examples: [declaration.default ?? `1 ${declaration.unit}`],
      };
    case 'boolean':
      return { type: 'boolean' };
    case 'word':
      return { enum: [...declaration.words] };
    case 'text':
      return {
        type: 'string',
        ...(declaration.pattern === undefined ? {} : { pattern: declaration.pattern }),
      };
    case 'list':
      return {
        type: 'array',
        items: parameterSchema(declaration.of),
        ...bounds('minItems', declaration.least, 'maxItems', declaration.most),
      };
    case 'group':
      return fieldsSchema(declaration.fields);
    case 'map':
      return { type: 'object', additionalProperties: parameterSchema(declaration.of) };
    case 'either':
      return { anyOf: declaration.of.map(parameterSchema) };
  }
}

function bounds(least: string, from: number | undefined, most: string, to: number | undefined): Schema {
  return { ...(from === undefined ? {} : { [least]: from }), ...(to === undefined ? {} : { [most]: to }) };
}

/** A map with these keys and no others. */
function object(properties: Schema, required: readonly string[], description?: string): Schema {
  return {
    type: 'object',
    ...(description === undefined ? {} : { description }),
    properties,
    additionalProperties: false,
    ...(required.length === 0 ? {} : { required }),
  };
}

/** A map from names of the recipe's own choice. */
function named(value: Schema): Schema {
  return { type: 'object', propertyNames: { pattern: NAME.source }, additionalProperties: value };
}

function capital(sentence: string): string {
  return sentence.slice(0, 1).toUpperCase() + sentence.slice(1);
}
