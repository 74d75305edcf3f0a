/** The commands with their words and options, as the parser takes them. What each does: commands/. */

import { availableParallelism } from 'node:os';
import { resolve } from 'node:path';
import { Command, InvalidArgumentError, Option } from 'commander';
import type { CommonOptions, ExitStatus, Io } from './command.ts';
import { programVersion } from './program.ts';

interface Raw {
  readonly book: string;
  readonly json?: boolean;
  readonly quiet?: boolean;
  readonly [name: string]: unknown;
}

/** Declares the commands. Their modules are loaded when called, so that each start pays for one only. */
export function makeProgram(io: Io, signal: AbortSignal, end: (status: ExitStatus) => void): Command {
  const program = new Command('platebook')
    .description(
      'Runs a declared imaging pipeline on interferometer data, and keeps a ledger in which every input,\n' +
        'parameter and output has its digest.',
    )
    .version(programVersion)
    .exitOverride()
    .configureOutput({ writeOut: io.out, writeErr: io.err })
    .configureHelp({ helpWidth: Math.min(100, Math.max(60, io.columns)) })
    .showHelpAfterError('(platebook --help lists the commands)')
    .helpCommand(false);
  const add = (name: string, description: string, example: string) => {
    const command = program
      .command(name)
      .description(description)
      .option('--book <dir>', 'the book', 'book')
      .option('--json', 'print one JSON document and nothing else')
      .option('--quiet', 'print problems only')
      .addHelpText('after', `\nExample:\n  ${example.split('\n').join('\n  ')}`);
    return command.copyInheritedSettings(program);
  };
  const common = (raw: Raw): CommonOptions => ({
    book: resolve(io.cwd, raw.book),
    json: raw.json === true,
    quiet: raw.quiet === true,
  });
  addExecuting(add, common, io, signal, end);
  addAsking(add, common, io, end);
  addReading(add, common, io, end);
  return program;
}

type Add = (name: string, description: string, example: string) => Command;
type Common = (raw: Raw) => CommonOptions;
type End = (status: ExitStatus) => void;

function addExecuting(add: Add, common: Common, io: Io, signal: AbortSignal, end: End): void {
  const cores = () =>
    new Option('--cores <n>', 'stages that run side by side at most')
      .default(availableParallelism(), 'all')
      .argParser(positiveInteger);
  add(
    'run',
    'execute a recipe; enter it in the book',
    'platebook run recipes/lantern/lantern.yaml --let fit.components=30',
  )
    .argument('<recipe>', 'the recipe, a YAML file')
    .addOption(cores())
    .option('--let <stage.parameter=value>', 'override one parameter for this run; may be repeated', list)
    .option('--afresh', 'compute every stage again, carry nothing forward')
    .option('--strict', 'read input files again even where size and times are as remembered')
    .option(
      '--root <dir>',
      'a folder besides the recipe’s own from which inputs may come; may be repeated',
      list,
    )
    .option('--plates <dir>', 'where the plates and numbers are laid', 'plates')
    .option('--by <name>', 'who writes in the book; otherwise from the configuration')
    .action(async (recipe: string, raw: Raw) => {
      const { runCommand } = await import('./commands/run.ts');
      const options = {
        ...common(raw),
        cores: raw.cores as number,
        let: (raw.let ?? []) as string[],
        root: (raw.root ?? []) as string[],
        afresh: raw.afresh === true,
        strict: raw.strict === true,
        plates: resolve(io.cwd, raw.plates as string),
        ...(raw.by === undefined ? {} : { by: raw.by as string }),
        signal,
      };
      end(await runCommand(recipe, options, io));
    });
  add(
    'rerun',
    'execute again what an entry, plate or run records, and compare',
    'platebook rerun run 1\nplatebook rerun plates/lantern-ring/ring-image.png\nplatebook rerun lantern-bag',
  )
    .argument('<what...>', 'an entry, a plate number, `run N`, a published number, a digest, a file or a bag')
    .addOption(cores())
    .option('--as-recorded', 'compute with the recorded code and runtime where the installed ones differ')
    .option('--trust-code', 'let code that comes out of a bag compute')
    .option('--by <name>', 'who writes in the book; otherwise from the configuration')
    .action(async (what: string[], raw: Raw) => {
      const { rerunCommand } = await import('./commands/rerun.ts');
      const by = raw.by === undefined ? {} : { by: raw.by as string };
      const code = { asRecorded: raw.asRecorded === true, trustCode: raw.trustCode === true };
      end(
        await rerunCommand(what, { ...common(raw), cores: raw.cores as number, ...code, ...by, signal }, io),
      );
    });
  add(
    'bag',
    'a bag (RFC 8493) that anyone can check without Platebook, or the entries of one taken over',
    'platebook bag run 1 --to lantern-bag\nplatebook bag lantern-bag --into other-book',
  )
    .argument(
      '<what...>',
      'an entry, a plate number, `run N`, a published number, a digest or a file; or a bag',
    )
    .option('--to <dir>', 'write the bag here')
    .option('--into <book>', 'take the entries of a bag over into this book')
    .option('--inputs <how>', 'files from outside: `kept` in the bag, or by `reference`', 'kept')
    .option('--location <file=url>', 'where a file from outside can be fetched; may be repeated', list)
    .option('--by <name>', 'who writes in the book; otherwise from the configuration')
    .action(async (what: string[], raw: Raw) => {
      const { bagCommand } = await import('./commands/bag.ts');
      const { to, into, by } = raw as { to?: string; into?: string; by?: string };
      const named = { inputs: raw.inputs as string, location: (raw.location ?? []) as string[] };
      end(await bagCommand(what, { ...common(raw), ...named, ...{ to, into, by } }, io));
    });
}

function addAsking(add: Add, common: Common, io: Io, end: End): void {
  add(
    'trace',
    'where does this come from: back to the bytes',
    'platebook trace plates/lantern-ring/ring-image.png\nplatebook trace ring-diameter',
  )
    .argument('<what...>', 'an entry, a plate number, `run N`, a published number, a digest or a file')
    .option('--proof <file>', 'write a proof that this is under the latest seal, to be checked by anybody')
    .action(async (what: string[], raw: Raw) => {
      const { traceCommand } = await import('./commands/trace.ts');
      const proof = raw.proof === undefined ? {} : { proof: raw.proof as string };
      end(await traceCommand(what, { ...common(raw), ...proof }, io));
    });
  add(
    'diff',
    'what is different between two runs, and what it did to the results',
    'platebook diff 1 2\nplatebook diff last-1 last',
  )
    .argument('<a>', 'a run: its number, `last` or `last-1`')
    .argument('<b>', 'another run')
    .action(async (a: string, b: string, raw: Raw) => {
      const { diffCommand } = await import('./commands/diff.ts');
      end(await diffCommand([a, b], common(raw), io));
    });
  add('contents', 'the book’s table of contents', 'platebook contents --type run --last 5')
    .option('--recipe <name>', 'runs of this recipe')
    .option('--stage <name>', 'entries of this stage')
    .option('--kind <kind>', 'entries of this kind of stage')
    .option('--type <type>', 'stage, failure, run, plate, rerun, import, withdrawal or countersignature')
    .option('--parameter <name=value>', 'entries with this value of a parameter, such as fit.components=30')
    .option('--since <date>', 'from this date on, such as 2026-03-01')
    .option('--until <date>', 'up to this date')
    .option('--digest <digest>', 'entries that name this digest')
    .option('--last <n>', 'so many of the latest', positiveInteger, 20)
    .action(async (raw: Raw) => {
      const { contentsCommand } = await import('./commands/contents.ts');
      const { recipe, stage, kind, type, since, until, digest, parameter, last } = raw;
      const filters = { recipe, stage, kind, type, since, until, digest, parameter, last };
      end(await contentsCommand({ ...common(raw), ...(filters as object) }, io));
    });
  add('audit', 'is every entry and every stored byte what the ledger says', 'platebook audit')
    .option('--quick', 'look at the ledger and at the sizes of stored files only')
    .action(async (raw: Raw) => {
      const { auditCommand } = await import('./commands/audit.ts');
      end(await auditCommand({ ...common(raw), quick: raw.quick === true }, io));
    });
  addJudging(add, common, io, end);
}

/** What depends on an entry, and what is said of it afterwards. */
function addJudging(add: Add, common: Common, io: Io, end: End): void {
  const what = 'an entry, a plate number, `run N`, a published number, a digest or a file';
  const by = (raw: Raw) => (raw.by === undefined ? {} : { by: raw.by as string });
  add('reach', 'what depends on this: forward to every plate and published number', 'platebook reach 5')
    .argument('<what...>', what)
    .action(async (words: string[], raw: Raw) => {
      const { reachCommand } = await import('./commands/reach.ts');
      end(reachCommand(words, common(raw), io));
    });
  add(
    'withdraw',
    'mark an entry as withdrawn, with the reason; nothing is deleted',
    'platebook withdraw 5 --reason "the gain table of station ONE was wrong"',
  )
    .argument('<what...>', what)
    .requiredOption('--reason <text>', 'why it does not stand any more')
    .option('--by <name>', 'who writes in the book; otherwise from the configuration')
    .action(async (words: string[], raw: Raw) => {
      const { withdrawCommand } = await import('./commands/withdraw.ts');
      end(await withdrawCommand(words, { ...common(raw), reason: raw.reason as string, ...by(raw) }, io));
    });
  add(
    'countersign',
    'a second person’s signature under an entry or a seal',
    'platebook countersign 57b-K3Q9M2\nplatebook countersign seal --key second.pem --by "B. Reader"',
  )
    .argument('<what...>', `${what}; \`seal\` for the latest seal, or a file that holds one`)
    .option('--key <file>', 'the signer’s key; otherwise from the configuration')
    .option('--by <name>', 'who signs and writes in the book; otherwise from the configuration')
    .action(async (words: string[], raw: Raw) => {
      const { countersignCommand } = await import('./commands/countersign.ts');
      const key = raw.key === undefined ? {} : { key: raw.key as string };
      end(await countersignCommand(words, { ...common(raw), ...key, ...by(raw) }, io));
    });
}

function addReading(add: Add, common: Common, io: Io, end: End): void {
  add(
    'proofread',
    'read a recipe, say what is wrong, compute nothing',
    'platebook proofread recipes/lantern/lantern.yaml',
  )
    .argument('<recipe>', 'the recipe, a YAML file')
    .option(
      '--root <dir>',
      'a folder besides the recipe’s own from which inputs may come; may be repeated',
      list,
    )
    .option('--let <stage.parameter=value>', 'override one parameter; may be repeated', list)
    .action(async (recipe: string, raw: Raw) => {
      const { proofreadCommand } = await import('./commands/proofread.ts');
      const options = {
        ...common(raw),
        root: (raw.root ?? []) as string[],
        let: (raw.let ?? []) as string[],
      };
      end(await proofreadCommand(recipe, options, io));
    });
  add(
    'kinds',
    'the stage kinds with their inputs, parameters, units and outputs',
    'platebook kinds\nplatebook kinds fit',
  )
    .argument('[kind]', 'one kind, in full')
    .action(async (kind: string | undefined, raw: Raw) => {
      const { kindsCommand } = await import('./commands/kinds.ts');
      end(await kindsCommand(kind, common(raw), io));
    });
}

/** Gathers an option that may be repeated. */
function list(value: string, before: readonly string[] = []): string[] {
  return [...before, value];
}

function positiveInteger(text: string): number {
  const value = Number(text);
  if (!(Number.isSafeInteger(value) && value >= 1)) {
    throw new InvalidArgumentError('Expected a whole number from 1 on.');
  }
  return value;
}
