import { type ChildProcess, fork } from 'node:child_process';
import { createHash } from 'node:crypto';
import { appendFileSync, existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import type { SuiteEntry } from '../suite/entries.js';
import type { Mutant } from './mutant.js';
import { compiled } from './mutate.js';
import { moduleFile, type Trial } from './trial.js';
import type { TrialOrder, TrialReport } from './trial-worker.js';

/** What came of a mutant. */
export interface MutantResult {
  readonly name: string;
  readonly kind: Mutant['kind'];
  readonly what: string;
  readonly key: string;
  /** The run that caught it and what it said; null: it survived. */
  readonly caught: { readonly run: string; readonly how: string } | null;
  /** Runs that it went through. */
  readonly runs: number;
  /** Of those, runs that ended in the very state of the sound controller's. */
  readonly same: number;
  readonly took: number;
}

export interface TryOptions {
  readonly bench: string;
  readonly folder: string;
  readonly seed: number;
  readonly entries: readonly SuiteEntry[];
  readonly source: string;
  readonly mutants: readonly Mutant[];
  readonly out: string;
  readonly jobs: number;
  readonly resume: boolean;
  readonly abort: AbortSignal;
  /** Wall time without a word after which a mutant counts as hung, s. */
  readonly patience?: number;
  onResult?(result: MutantResult): void;
  onProgress?(share: number, what: string): void;
}

/** Runs a suite against every mutant, each until one run catches it, the runs that caught most first; the results in order. */
export async function tryMutants(options: TryOptions): Promise<{ before: Trial[]; results: MutantResult[] }> {
  const { entries, out, mutants, source, abort } = options;
  mkdirSync(path.join(out, 'modules'), { recursive: true });
  const suite = createHash('sha256');
  for (const entry of entries) suite.update(entry.key);
  const suiteKey = suite.update(source).digest('hex');
  const workers = Array.from({ length: Math.max(1, options.jobs) }, () => new TrialProcess(options));
  try {
    const before = await soundRuns(options, workers, suiteKey);
    if (abort.aborted) return { before, results: [] };
    const ledger = path.join(out, 'results.jsonl');
    const known = options.resume ? knownResults(ledger) : new Map<string, MutantResult>();
    if (!options.resume) writeFileSync(ledger, '');
    const results = new Map<string, MutantResult>();
    const waiting: Mutant[] = [];
    const keyOf = (mutant: Mutant) => createHash('sha256').update(suiteKey).update(mutant.source).digest('hex');
    for (const mutant of mutants) {
      const so = known.get(mutant.name);
      if (so && so.key === keyOf(mutant)) results.set(mutant.name, so);
      else waiting.push(mutant);
    }
    const kills = entries.map(() => 0);
    for (const { caught } of results.values()) {
      const at = entries.findIndex((entry) => entry.name === caught?.run);
      if (at >= 0) kills[at] = kills[at]! + 1;
    }
    const order = () =>
      entries.map((_, i) => i).sort((a, b) => (kills[b]! + 1) / before[b]!.took - (kills[a]! + 1) / before[a]!.took);
    await Promise.all(
      workers.map(async (worker) => {
        for (let mutant = waiting.shift(); mutant !== undefined && !abort.aborted; mutant = waiting.shift()) {
          const file = moduleFile(path.join(out, 'modules'), mutant.name);
          writeFileSync(file, compiled(mutant.source));
          const began = performance.now();
          const said = await worker.tries({ module: file, entries: order(), before: { ...before } });
          if (abort.aborted) return;
          if (said.caught && said.caught.entry >= 0) kills[said.caught.entry] = kills[said.caught.entry]! + 1;
          const result: MutantResult = {
            name: mutant.name,
            kind: mutant.kind,
            what: mutant.what,
            key: keyOf(mutant),
            caught: said.caught && { run: entries[said.caught.entry]?.name ?? '', how: said.caught.how },
            runs: said.trials.length,
            same: said.same,
            took: (performance.now() - began) / 1000,
          };
          results.set(mutant.name, result);
          appendFileSync(ledger, `${JSON.stringify(result)}\n`);
          options.onResult?.(result);
          options.onProgress?.(results.size / mutants.length, mutant.name);
        }
      }),
    );
    return { before, results: mutants.flatMap((mutant) => results.get(mutant.name) ?? []) };
  } finally {
    for (const worker of workers) worker.end();
  }
}

/** The sound controller through every run: what mutants are compared to. Kept beside the results. */
async function soundRuns(options: TryOptions, workers: readonly TrialProcess[], key: string): Promise<Trial[]> {
  const { out, entries, source, abort } = options;
  const file = path.join(out, 'sound.json');
  if (existsSync(file)) {
    const kept = JSON.parse(readFileSync(file, 'utf8')) as { key: string; trials: Trial[] };
    if (kept.key === key) return kept.trials;
  }
  const module = moduleFile(path.join(out, 'modules'), 'sound');
  writeFileSync(module, compiled(source));
  const trials: Trial[] = [];
  const waiting = entries.map((_, i) => i);
  await Promise.all(
    workers.map(async (worker) => {
      for (let entry = waiting.shift(); entry !== undefined && !abort.aborted; entry = waiting.shift()) {
        const said = await worker.tries({ module, entries: [entry] });
        const own = said.trials[0];
        if (!own)
          throw new Error(`the sound controller does not get through ${entries[entry]!.name}: ${said.caught?.how}`);
        trials[entry] = own;
        options.onProgress?.(0, `sound controller, ${entries[entry]!.name}`);
      }
    }),
  );
  if (!abort.aborted) writeFileSync(file, JSON.stringify({ key, trials }));
  return trials;
}

function knownResults(file: string): Map<string, MutantResult> {
  const known = new Map<string, MutantResult>();
  if (!existsSync(file)) return known;
  for (const line of readFileSync(file, 'utf8').split('\n')) {
    try {
      const one = JSON.parse(line) as MutantResult;
      known.set(one.name, one);
    } catch {
      // the last line of a run that was cut off
    }
  }
  return known;
}

interface Said {
  readonly caught: { readonly entry: number; readonly how: string } | null;
  readonly same: number;
  readonly trials: Trial[];
}

/** A worker process, started again after one that hung or died. */
class TrialProcess {
  private child: ChildProcess | undefined;

  constructor(private readonly options: TryOptions) {
    options.abort.addEventListener('abort', () => this.end());
  }

  tries(order: TrialOrder): Promise<Said> {
    const { bench, folder, seed } = this.options;
    const child = (this.child ??= fork(
      path.join(path.dirname(fileURLToPath(import.meta.url)), 'trial-worker.js'),
      [bench, folder, String(seed)],
      { stdio: ['ignore', 'inherit', 'inherit', 'ipc'] },
    ));
    const trials: Trial[] = [];
    return new Promise((resolve) => {
      const patience = 1000 * (this.options.patience ?? 300);
      const gone = (how: string) => {
        this.end();
        leave({ caught: { entry: order.entries[trials.length] ?? -1, how }, same: 0, trials });
      };
      let timer = setTimeout(() => gone('hung'), patience);
      const onMessage = (report: TrialReport) => {
        clearTimeout(timer);
        if (report.kind === 'end') return leave({ caught: report.caught, same: report.same, trials });
        trials.push(report.trial);
        timer = setTimeout(() => gone('hung'), patience);
      };
      const onExit = (code: number | null, signal: string | null) => gone(`the process ended with ${signal ?? code}`);
      const leave = (said: Said) => {
        clearTimeout(timer);
        child.off('message', onMessage);
        child.off('exit', onExit);
        resolve(said);
      };
      child.on('message', onMessage);
      child.once('exit', onExit);
      child.send(order);
    });
  }

  end(): void {
    this.child?.kill('SIGKILL');
    this.child = undefined;
  }
}
