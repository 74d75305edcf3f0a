/** Who writes in the book: from `--by`, from PLATEBOOK_BY, or from the configuration file. Nothing else about a person
 *  or a machine is ever recorded.
 *
 *  The configuration file is YAML, at $PLATEBOOK_CONFIG or $XDG_CONFIG_HOME/platebook/config.yaml (~/.config):
 *
 *      by: { name: A. Writer, orcid: 0000-0002-1825-0097 }
 *
 *  The key that signs seals lies beside it, in keys/seal.pem, or where PLATEBOOK_KEY says: ledger/signing-key.ts.
 *
 *  Source of the form and check digit of an ORCID: ISO 7064, MOD 11-2. */

import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Person } from '../ledger/entry.ts';
import { signingKeyFile } from '../ledger/signing-key.ts';
import type { Io } from './command.ts';
import { RunnerProblem } from './problem.ts';

/** The person whose name entries carry; `unnamed` when none is configured. */
export async function writer(io: Io, by: string | undefined): Promise<Person> {
  const name = by ?? io.env.PLATEBOOK_BY;
  const place = by === undefined ? 'PLATEBOOK_BY' : '--by';
  if (name !== undefined) return readPerson({ name }, place);
  const file = configurationFile(io);
  return file === null ? { name: 'unnamed' } : readConfiguration(file);
}

/** The file with the key that signs seals; it is made when it is first needed. @throws LedgerProblem 'bad-key' when the
 *  environment names no place for it. */
export function keyFile(io: Io): string {
  return signingKeyFile(io.env);
}

function configurationFile(io: Io): string | null {
  if (io.env.PLATEBOOK_CONFIG !== undefined) return io.env.PLATEBOOK_CONFIG;
  const home =
    io.env.XDG_CONFIG_HOME ?? (io.env.HOME === undefined ? undefined : join(io.env.HOME, '.config'));
  const file = home === undefined ? null : join(home, 'platebook', 'config.yaml');
  return file !== null && existsSync(file) ? file : null;
}

async function readConfiguration(file: string): Promise<Person> {
  const { parse } = await import('yaml');
  let content: unknown;
  try {
    content = parse(readFileSync(file, 'utf8'));
  } catch (error) {
    throw problem(file, error instanceof Error ? (error.message.split('\n')[0] ?? '') : String(error));
  }
  if (content === null || content === undefined) return { name: 'unnamed' };
  const { z } = await import('zod');
  const shape = z.strictObject({
    by: z.strictObject({ name: z.string(), orcid: z.string().optional() }).optional(),
  });
  const result = shape.safeParse(content);
  if (result.success)
    return result.data.by === undefined ? { name: 'unnamed' } : readPerson(result.data.by, file);
  const issue = result.error.issues[0];
  throw problem(file, `${issue?.path.join('.') || 'the document'}: ${issue?.message ?? 'not understood'}`);
}

function readPerson(given: { name: string; orcid?: string | undefined }, place: string): Person {
  const name = given.name.trim();
  if (!/^\P{Cc}{1,200}$/u.test(name))
    throw problem(place, 'the name is empty, too long or holds control characters');
  if (given.orcid === undefined) return { name };
  if (!isOrcid(given.orcid)) throw problem(place, `${JSON.stringify(given.orcid)} is no ORCID`);
  return { name, orcid: given.orcid };
}

function problem(place: string, what: string): RunnerProblem {
  const message =
    `${place}: expected by: { name, orcid } with a name and, optionally, an ORCID, got a problem: ${what}. ` +
    `Correct it or leave it out.`;
  return new RunnerProblem('bad-configuration', message, { file: place }, 2);
}

/** Whether a text is an ORCID: four groups of four digits, the last of which is the check digit. */
export function isOrcid(text: string): boolean {
  if (!/^\d{4}-\d{4}-\d{4}-\d{3}[\dX]$/.test(text)) return false;
  const digits = text.replaceAll('-', '');
  let total = 0;
  for (const digit of digits.slice(0, -1)) total = (total + Number(digit)) * 2;
  const result = (12 - (total % 11)) % 11;
  return digits.at(-1) === (result === 10 ? 'X' : String(result));
}
