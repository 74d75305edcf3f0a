/** Loaded before a measured program: writes the most memory that the process had, in bytes, into a file when it ends. */

import { readFileSync, writeFileSync } from 'node:fs';

process.on('exit', () => {
  const path = process.env.PLATEBOOK_BENCH_MEMORY;
  if (path !== undefined) writeFileSync(path, String(mostResident()));
});

/** Of this program alone: what the system calls the maximum may be that of the process that started it. */
function mostResident(): number {
  try {
    const kilobytes = /^VmHWM:\s*(\d+) kB$/m.exec(readFileSync('/proc/self/status', 'utf8'))?.[1];
    if (kilobytes !== undefined) return Number(kilobytes) * 1024;
  } catch {}
  return process.resourceUsage().maxRSS * 1024;
}
