import { type ChildProcess, spawn } from 'node:child_process';
import { existsSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { type ChildResult, finished } from '../support/child.js';

/** The command line as a user starts it: the built program in a process of its own, from the project's folder. */
export const root = path.resolve(import.meta.dirname, '..', '..');
export const program = path.join(root, 'dist', 'tools', 'oilspring.js');
export const truck = 'configs/harbour-truck/bench.yaml';

export function startCommand(words: readonly string[], environment: NodeJS.ProcessEnv = {}): ChildProcess {
  if (!existsSync(program)) throw new Error('build first: npm run build, or run the tests by npm test');
  const env: NodeJS.ProcessEnv = { ...process.env, NO_COLOR: '1', ...environment };
  delete env['NODE_OPTIONS'];
  return spawn(process.execPath, [program, ...words], { cwd: root, env, stdio: ['ignore', 'pipe', 'pipe'] });
}

export function runCommand(...words: string[]): Promise<ChildResult> {
  return finished(startCommand(words));
}

/** A folder that is gone after the tests. */
export function scratch(): { file(name: string): string; remove(): void } {
  const folder = mkdtempSync(path.join(tmpdir(), 'oilspring-'));
  return { file: (name) => path.join(folder, name), remove: () => rmSync(folder, { recursive: true, force: true }) };
}
