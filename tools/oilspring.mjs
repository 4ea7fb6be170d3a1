#!/usr/bin/env node
// The `oilspring` command: installs and builds on its first call, then hands over to the built program.
import { spawnSync } from 'node:child_process';
import { existsSync, realpathSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';

const root = resolve(dirname(realpathSync(fileURLToPath(import.meta.url))), '..');
const program = join(root, 'dist', 'tools', 'oilspring.js');
if (!existsSync(program) || !existsSync(join(root, 'node_modules', 'koffi'))) {
  const { status } = spawnSync(process.execPath, [join(root, 'tools', 'prepare.mjs')], {
    stdio: ['ignore', 'ignore', 'inherit'],
  });
  if (status !== 0) process.exit(2);
}
await import(pathToFileURL(program).href);
