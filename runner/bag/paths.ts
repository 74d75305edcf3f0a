/** Paths in a bag. A manifest writes a path with line feed, carriage return and per cent sign as %0A, %0D and %25 (RFC
 *  8493, section 2.1.3) and everything else as it is; a path in any other spelling is refused. What a path may be is
 *  narrower than what a file system allows: a bag must mean the same files everywhere and none outside itself (RFC 8493,
 *  sections 5 and 6.1). */

const LONGEST_BYTES = 1000;
const DEEPEST = 40;
/** Names that Windows keeps for devices, with or without an extension. Source: common practice. */
const DEVICE = /^(con|prn|aux|nul|conin\$|conout\$|(com|lpt)[0-9¹²³])(\.|$)/i;
const FORBIDDEN_ON_SOME = /[\\:*?"<>|]/;

/** The path as a manifest writes it. The inverse of decodePath. */
export function encodePath(path: string): string {
  return path.replaceAll('%', '%25').replaceAll('\r', '%0D').replaceAll('\n', '%0A');
}

/** The path that a manifest means; null when a per cent sign stands before anything else than 0A, 0D or 25. */
export function decodePath(text: string): string | null {
  if (/%(?!0A|0D|25)/.test(text) || /[\r\n]/.test(text)) return null;
  return text.replace(/%(0A|0D|25)/g, (_, code: string) => ({ '0A': '\n', '0D': '\r' })[code] ?? '%');
}

/** What keeps a path from being used, as the end of "expected a path below the bag, got …"; null when nothing does.
 *  @param path  decoded, relative to the bag */
export function faultOfPath(path: string): string | null {
  if (path === '') return 'no path';
  if (!path.isWellFormed()) return 'a path that is no Unicode text';
  if (Buffer.byteLength(path) > LONGEST_BYTES) return `a path of more than ${LONGEST_BYTES} bytes`;
  if (path.startsWith('/') || /^[A-Za-z]:/.test(path)) return 'an absolute path';
  const segments = path.split('/');
  if (segments.length > DEEPEST) return `a path of more than ${DEEPEST} levels`;
  for (const segment of segments) {
    const fault = faultOfSegment(segment);
    if (fault !== null) return fault;
  }
  return null;
}

function faultOfSegment(segment: string): string | null {
  if (segment === '') return 'a path with an empty name in it';
  if (segment === '..' || segment === '.') return `a path with ${segment} in it`;
  if (segment.startsWith('~')) return 'a name that begins with ~';
  if (FORBIDDEN_ON_SOME.test(segment))
    return `a name with ${JSON.stringify(FORBIDDEN_ON_SOME.exec(segment)?.[0])} in it`;
  // Line feed and carriage return are the two that RFC 8493 knows how to write.
  if (/\p{Cc}/u.test(segment.replace(/[\r\n]/g, ''))) return 'a name with a control character in it';
  if (DEVICE.test(segment)) return 'the name of a device';
  if (/[. ]$/.test(segment)) return 'a name that ends with a full stop or a space';
  return null;
}

/** Paths with the same key are one file where upper and lower case, or two ways of composing a letter, are the same. */
export function collisionKey(path: string): string {
  return path.normalize('NFC').toUpperCase().toLowerCase().normalize('NFC');
}

/** A name for a file of a bag that is made after somebody's name: one segment, usable everywhere and by `sha256sum -c`,
 *  which knows no per cent encoding. Characters that are not are replaced by `_`. */
export function safeName(name: string): string {
  const plain = name
    .toWellFormed()
    .normalize('NFC')
    .replace(/[\\/:*?"<>|%\p{Cc}\p{Cf}\p{Zl}\p{Zp}\ufffd]/gu, '_')
    .replace(/^[~ ]+/, '_');
  const short = shorten(plain, 120).replace(/[. ]+$/, '_');
  return short === '' || short.startsWith('.') || DEVICE.test(short) ? `_${short}` : short;
}

/** Keeps the end, where the extension is. */
function shorten(text: string, bytes: number): string {
  let short = text;
  while (Buffer.byteLength(short) > bytes) short = [...short].slice(1).join('');
  return short;
}

/** A path as a relative reference of a URI (RFC 3986, section 4.2). */
export function uriOfPath(path: string): string {
  return path.split('/').map(encodeURIComponent).join('/');
}
