import { spawnSync } from 'node:child_process';
import { existsSync } from 'node:fs';
import { homedir } from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

const root = fileURLToPath(new URL('../../', import.meta.url));
const tools = path.join(root, 'tools/kernel-can');
const folder =
  process.env['OILSPRING_KERNEL_CAN'] ??
  path.join(process.env['XDG_CACHE_HOME'] ?? path.join(homedir(), '.cache'), 'oilspring/kernel-can');

/** In CI these tests run whatever it takes; elsewhere once `tools/kernel-can/setup` has been run by hand. */
export const mustRun = process.env['CI'] === 'true';
export const canRun = mustRun || existsSync(path.join(folder, 'complete'));

/** Fetches the guest kernel and its tools where they are missing. Throws with what the script said. */
export function prepareGuest(): void {
  const { status, stderr } = spawnSync(path.join(tools, 'setup'), [folder], { encoding: 'utf8' });
  if (status !== 0) throw new Error(`tools/kernel-can/setup failed: ${stderr.slice(-2000)}`);
}

/**
 * Runs one of the scripts in tests/kernel-can/inside where there is CAN, and returns what it reports: the object in its
 * line that begins with `report `. A script that fails throws here, with all that it printed.
 */
export function runInside(script: string, words: readonly string[] = [], seconds = 100): Record<string, unknown> {
  const file = fileURLToPath(new URL(`./inside/${script}`, import.meta.url));
  const hooks = path.join(root, 'tests/support/typescript-hooks.mjs');
  const environment = { ...process.env };
  delete environment['NODE_OPTIONS'];
  const { status, stdout, stderr } = spawnSync(
    path.join(tools, 'run'),
    ['-d', folder, '-t', `${seconds}`, '--', process.execPath, '--import', hooks, file, ...words],
    { encoding: 'utf8', cwd: root, env: environment, maxBuffer: 1 << 26 },
  );
  const line = stdout.split('\n').find((one) => one.startsWith('report '));
  if (status !== 0 || line === undefined)
    throw new Error(`${script} ended with ${status}:\n${stdout.slice(-4000)}\n${stderr.slice(-2000)}`);
  return JSON.parse(line.slice('report '.length)) as Record<string, unknown>;
}
