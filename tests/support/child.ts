import { type ChildProcess, spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

const HOOKS = fileURLToPath(new URL('./typescript-hooks.mjs', import.meta.url));

/** `execArgv` for a Worker or process that is to run the project's TypeScript. */
export const typescriptArguments: readonly string[] = ['--import', HOOKS];

/** Starts `file` (a URL or path of a .ts file) in a process of its own, with standard output and error piped. */
export function startChild(
  file: URL | string,
  argv: readonly string[] = [],
  nodeArguments: readonly string[] = [],
): ChildProcess {
  const path = typeof file === 'string' ? file : fileURLToPath(file);
  // NODE_OPTIONS of a test runner would change what the child's heap does.
  const environment = { ...process.env };
  delete environment['NODE_OPTIONS'];
  return spawn(process.execPath, [...typescriptArguments, ...nodeArguments, path, ...argv], {
    stdio: ['pipe', 'pipe', 'pipe'],
    env: environment,
  });
}

export interface ChildResult {
  readonly code: number | null;
  readonly signal: NodeJS.Signals | null;
  readonly output: string;
  readonly errors: string;
}

/** Runs `file` to its end. */
export function runChild(
  file: URL | string,
  argv: readonly string[] = [],
  nodeArguments: readonly string[] = [],
): Promise<ChildResult> {
  return finished(startChild(file, argv, nodeArguments));
}

/** Collects what a child prints until it ends. */
export function finished(child: ChildProcess): Promise<ChildResult> {
  let output = '';
  let errors = '';
  child.stdout?.setEncoding('utf8').on('data', (text: string) => (output += text));
  child.stderr?.setEncoding('utf8').on('data', (text: string) => (errors += text));
  return new Promise((resolve, reject) => {
    child.once('error', reject);
    child.once('close', (code, signal) => resolve({ code, signal, output, errors }));
  });
}
