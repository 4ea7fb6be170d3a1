import { type ChildProcess, spawn } from 'node:child_process';
import { mkdirSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import type { RunSummary } from '../../runtime/run-summary.js';
import { packageRoot } from '../loop/controller-module.js';
import type { SuiteEntry } from './entries.js';
import { kept, readResult, type SuiteResult } from './result.js';

export interface SuiteOptions {
  readonly bench: string;
  readonly entries: readonly SuiteEntry[];
  /** Folder for results and recordings. */
  readonly out: string;
  readonly jobs: number;
  readonly pace: 'live' | 'fast';
  readonly seed: number;
  readonly controller: string | undefined;
  /** Takes over what stands in `out` already, when it follows from the same files. */
  readonly resume: boolean;
  readonly keep: 'all' | 'rule' | 'none';
  readonly abort: AbortSignal;
  onStart?(entry: SuiteEntry): void;
  onResult?(result: SuiteResult, again: boolean): void;
  /** Share of the simulated time of all runs that is done. */
  onProgress?(share: number): void;
}

/**
 * Runs each entry in a process of its own. At fast pace `jobs` at a time, the longest first; live one after another in the order of
 * the suite, with the reset procedure of the bench between: the end of its after-run and the beginning of its pre-roll. A crash ends
 * one run and no other. When it is aborted the runs that are on are told to end, and count as not run.
 */
export async function runSuite(options: SuiteOptions): Promise<SuiteResult[]> {
  const { entries, out, jobs, abort } = options;
  mkdirSync(out, { recursive: true });
  const results = new Map<string, SuiteResult>();
  const total = entries.reduce((sum, entry) => sum + entry.length, 0);
  let done = 0;
  const finish = (entry: SuiteEntry, result: SuiteResult, again: boolean) => {
    results.set(entry.name, result);
    done += entry.length;
    options.onProgress?.(total > 0 ? done / total : 1);
    options.onResult?.(result, again);
    if (options.keep === 'rule') thin(out, results);
  };
  const waiting: SuiteEntry[] = [];
  for (const entry of entries) {
    const before = options.resume ? readResult(resultFile(out, entry.name)) : undefined;
    if (before && before.key === entry.key && before.verdict !== 'broken') finish(entry, before, true);
    else waiting.push(entry);
  }
  const live = options.pace === 'live';
  if (!live) waiting.sort((a, b) => b.length - a.length);
  const children = new Set<ChildProcess>();
  const stop = () => {
    for (const child of children) child.kill('SIGINT');
  };
  abort.addEventListener('abort', stop);
  const work = async () => {
    for (let entry = waiting.shift(); entry !== undefined && !abort.aborted; entry = waiting.shift()) {
      options.onStart?.(entry);
      const result = await runOne(options, entry, children);
      if (!abort.aborted) finish(entry, result, false);
    }
  };
  await Promise.all(Array.from({ length: live ? 1 : Math.max(1, jobs) }, work));
  abort.removeEventListener('abort', stop);
  return entries.flatMap((entry) => results.get(entry.name) ?? []);
}

export function resultFile(out: string, name: string): string {
  return path.join(out, `${name}.json`);
}

async function runOne(options: SuiteOptions, entry: SuiteEntry, children: Set<ChildProcess>): Promise<SuiteResult> {
  const { out, bench, seed, controller, keep, pace } = options;
  const recording = path.join(out, `${entry.name}.osrec`);
  rmSync(recording, { force: true });
  rmSync(resultFile(out, entry.name), { force: true });
  const began = performance.now();
  const words = [
    path.join(packageRoot(), 'dist', 'tools', 'oilspring.js'),
    ...['run', bench, '--scenario', entry.file, '--pace', pace, '--json', '--seed', String(seed)],
    ...(entry.case === undefined ? [] : ['--case', entry.case]),
    ...(controller === undefined ? [] : ['--controller', controller]),
    ...(keep === 'none' ? ['--no-record'] : ['--record', recording]),
  ];
  const child = spawn(process.execPath, words, { stdio: ['ignore', 'pipe', 'pipe'], detached: false });
  children.add(child);
  let output = '';
  let errors = '';
  child.stdout.on('data', (chunk: Buffer) => {
    output += chunk.toString('utf8');
  });
  child.stderr.on('data', (chunk: Buffer) => {
    errors = (errors + chunk.toString('utf8')).slice(-4000);
  });
  const ended = await new Promise<string>((resolve) => {
    child.on('error', (error) => resolve(`cannot be started: ${error.message}`));
    child.on('close', (code, signal) => resolve(signal === null ? `exit code ${code}` : `signal ${signal}`));
  });
  children.delete(child);
  let summary: RunSummary | null = null;
  try {
    summary = JSON.parse(output.trim().split('\n').at(-1) ?? '') as RunSummary;
  } catch {
    summary = null;
  }
  const result: SuiteResult = {
    name: entry.name,
    title: entry.title,
    scenario: entry.case === undefined ? path.basename(entry.file) : `${path.basename(entry.file)}, case ${entry.case}`,
    key: entry.key,
    verdict: summary?.ending === 'broken' || !summary ? 'broken' : summary.verdict,
    exitCode: summary?.exitCode ?? 5,
    why: summary
      ? summary.reasons.map((one) => one.what)
      : [`the process ended with ${ended}`, ...errors.trim().split('\n').slice(-3)].filter(Boolean),
    summary,
    took: (performance.now() - began) / 1000,
    recording: keep === 'none' || !summary?.recording ? null : path.basename(recording),
  };
  if (!options.abort.aborted) write(out, result);
  return result;
}

/** Whole or not at all: a file that is torn by a power cut is no result. */
function write(out: string, result: SuiteResult): void {
  const file = resultFile(out, result.name);
  writeFileSync(`${file}.new`, `${JSON.stringify(result)}\n`);
  renameSync(`${file}.new`, file);
}

function thin(out: string, results: Map<string, SuiteResult>): void {
  const keep = kept([...results.values()]);
  for (const [name, result] of results) {
    if (result.recording === null || keep.has(name)) continue;
    rmSync(path.join(out, result.recording), { force: true });
    const thinned = { ...result, recording: null };
    results.set(name, thinned);
    write(out, thinned);
  }
}
