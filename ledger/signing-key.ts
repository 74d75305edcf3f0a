/** The key that signs seals: Ed25519, one for each person, in a file outside every book, PKCS #8 in PEM, readable by
 *  its owner only (mode 0600). It is made on first use. Nothing about a person or a machine is in it.
 *
 *  A lost key breaks nothing: what it signed stays signed, its public half stands in the book, and the next key joins
 *  it there. Whoever has the file can sign in its owner's place: a stolen one is answered by a new one and by word to
 *  the readers. A copy of it belongs with the passwords, never into a book. */

import { createPrivateKey, generateKeyPairSync, type KeyObject } from 'node:crypto';
import { linkSync, readFileSync, rmSync, statSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { makeDirectoryDurably, syncDirectory, writeDurably } from './durable.ts';
import { badKey, cannotWrite, noPlaceForKey } from './problem.ts';

const OWNER_ONLY = 0o600;
const OTHERS = 0o077;

/** Where the key lies: $PLATEBOOK_KEY, else keys/seal.pem in the configuration directory, which is
 *  $XDG_CONFIG_HOME/platebook or ~/.config/platebook. @throws LedgerProblem 'bad-key' when none of these is set. */
export function signingKeyFile(env: Readonly<Record<string, string | undefined>>): string {
  if (env.PLATEBOOK_KEY) return env.PLATEBOOK_KEY;
  const configuration = env.XDG_CONFIG_HOME || (env.HOME ? join(env.HOME, '.config') : undefined);
  if (configuration === undefined) throw noPlaceForKey();
  return join(configuration, 'platebook', 'keys', 'seal.pem');
}

/** The private key in a file. @throws LedgerProblem 'bad-key' when there is none, it is no Ed25519 key, or others may
 *  read it. */
export function readSigningKey(file: string): KeyObject {
  let key: KeyObject;
  try {
    const found = statSync(file);
    // Windows keeps no such modes.
    if (process.platform !== 'win32' && (found.mode & OTHERS) !== 0)
      throw badKey(file, 'a file that only its owner may read', `mode ${(found.mode & 0o777).toString(8)}`);
    key = createPrivateKey(readFileSync(file));
  } catch (cause) {
    if ((cause as Error).name === 'LedgerProblem') throw cause;
    const missing = (cause as NodeJS.ErrnoException).code === 'ENOENT';
    throw badKey(file, 'a private key in PEM', missing ? 'no such file' : (cause as Error).message, cause);
  }
  if (key.asymmetricKeyType === 'ed25519') return key;
  throw badKey(file, 'an Ed25519 key', `one of ${key.asymmetricKeyType}`);
}

/** The private key in a file; made where there is no file. Processes that do so at once make one.
 *  @throws LedgerProblem 'bad-key', 'cannot-write'. */
export function readOrMakeSigningKey(file: string): { key: KeyObject; made: boolean } {
  if (statSync(file, { throwIfNoEntry: false }) !== undefined)
    return { key: readSigningKey(file), made: false };
  const temporary = `${file}.${process.pid}`;
  try {
    makeDirectoryDurably(dirname(file), 0o700);
    const { privateKey } = generateKeyPairSync('ed25519');
    const pem = Buffer.from(privateKey.export({ format: 'pem', type: 'pkcs8' }));
    writeDurably(temporary, `${temporary}.new`, pem, OWNER_ONLY);
  } catch (cause) {
    throw cannotWrite(file, cause);
  }
  let made = true;
  try {
    // A link takes a name only when it is free: whoever comes second uses the first one's key.
    linkSync(temporary, file);
    syncDirectory(dirname(file));
  } catch (cause) {
    if ((cause as NodeJS.ErrnoException).code !== 'EEXIST') throw cannotWrite(file, cause);
    made = false;
  } finally {
    rmSync(temporary, { force: true });
  }
  return { key: readSigningKey(file), made };
}

/** The same key, and a word about it where it was made. */
export function useSigningKey(file: string, announce: (text: string, what: 'key') => void): KeyObject {
  const { key, made } = readOrMakeSigningKey(file);
  if (made)
    announce(`There was no key to sign seals with, so one was made: ${file}. Keep a copy of it.`, 'key');
  return key;
}
