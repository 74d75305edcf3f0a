// Checks that an entry of a Platebook ledger stands under a signed seal. Needs Node 20 or later, nothing else:
//
//     node check-proof.mjs PROOF.json [KEY]
//
// KEY (name+hash+base64) is the verifier key as you know it from elsewhere, such as a paper. Without it the proof's own
// key is used, and the proof is worth as much as whoever handed it to you. Exit status 0: it holds. 1: it does not.
// Standards: RFC 9162 section 2.1 (tree), C2SP signed-note and tlog-checkpoint (seal), RFC 8032 (Ed25519).

import { createHash, createPublicKey, verify } from 'node:crypto';
import { readFileSync } from 'node:fs';

const sha256 = (...parts) => createHash('sha256').update(Buffer.concat(parts)).digest();
const node = (left, right) => sha256(Buffer.of(1), left, right);

function require(holds, what) {
  if (!holds) throw new Error(what);
}

/** Base64 in its one proper spelling. */
function base64(text) {
  const bytes = Buffer.from(String(text), 'base64');
  require(bytes.toString('base64') === text, `not proper base64: ${text}`);
  return bytes;
}

/** The text of a note, if this key has signed it. */
function openNote(note, key) {
  const [, name, id, encoded] = /^([^\s+]+)\+([0-9a-f]{8})\+(.+)$/.exec(key) ?? [];
  require(encoded !== undefined, 'the key is not name+hash+base64');
  const publicKey = base64(encoded);
  require(publicKey.length === 33 && publicKey[0] === 1, 'the key is not one of Ed25519');
  require(sha256(Buffer.from(`${name}\n`), publicKey).toString('hex', 0, 4) ===
    id, 'the hash in the key is wrong');
  const end = note.lastIndexOf('\n\n');
  require(end >= 0 && note.endsWith('\n'), 'the checkpoint is no signed note');
  const text = note.slice(0, end + 1);
  const der = Buffer.concat([Buffer.from('302a300506032b6570032100', 'hex'), publicKey.subarray(1)]);
  const open = createPublicKey({ key: der, format: 'der', type: 'spki' });
  let signed = false;
  for (const line of note.slice(end + 2, -1).split('\n')) {
    const [dash, by, signature, ...rest] = line.split(' ');
    require(dash === '—' && signature !== undefined && rest.length === 0, 'a signature line is malformed');
    const bytes = base64(signature);
    if (by !== name || bytes.toString('hex', 0, 4) !== id) continue;
    require(verify(null, Buffer.from(text), open, bytes.subarray(4)), 'the signature is wrong');
    signed = true;
  }
  require(signed, 'this key has not signed the checkpoint');
  return text;
}

/** RFC 9162 section 2.1.3.2. */
function rootFrom(leaf, index, size, path) {
  let [fn, sn, root] = [index, size - 1, leaf];
  for (const hash of path) {
    require(hash.length === 32 && sn > 0, 'the path is too long, or holds no hash');
    if (fn % 2 === 1 || fn === sn) {
      root = node(hash, root);
      for (; fn % 2 === 0 && fn !== 0; fn /= 2) sn = Math.floor(sn / 2);
    } else root = node(root, hash);
    [fn, sn] = [Math.floor(fn / 2), Math.floor(sn / 2)];
  }
  require(sn === 0, 'the path is too short');
  return root;
}

function check(proof, trusted) {
  require(trusted === undefined ||
    trusted === proof.key, 'the proof rests on another key than the one you gave');
  const text = openNote(proof.checkpoint, proof.key);
  const [origin, size, root, ...more] = text.slice(0, -1).split('\n');
  require(size === String(proof.size) &&
    Number.isSafeInteger(proof.index), 'the size is not that of the checkpoint');
  require(proof.index >= 0 && proof.index < proof.size, 'the index is not one under the checkpoint');
  const entry = JSON.parse(proof.entry);
  require(entry.number === proof.index + 1, 'the entry has another number');
  require(entry.book === decodeURIComponent(origin), 'the entry is of another book');
  const leaf = sha256(Buffer.of(0), Buffer.from(proof.entry));
  const found = rootFrom(leaf, proof.index, proof.size, proof.inclusion.map(base64));
  require(found.equals(base64(root)), 'the entry is not under the checkpoint');
  const time = more.find((line) => line.startsWith('time '))?.slice(5) ?? 'an unknown time';
  return `holds: entry ${entry.number} (${entry.type}) of book ${entry.book} is under the seal of ${size} entries of ${time}`;
}

try {
  const [file, key] = process.argv.slice(2);
  console.log(check(JSON.parse(readFileSync(file, 'utf8')), key));
  if (key === undefined)
    console.log(`It rests on the key that came with it: ${JSON.parse(readFileSync(file)).key}`);
} catch (error) {
  console.log(`does not hold: ${error.message}`);
  process.exitCode = 1;
}
