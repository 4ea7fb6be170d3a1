import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { chooser } from '../determinism/draw.js';
import { changed } from './change.js';
import type { Coverage, Fresh } from './coverage.js';

/** Something that reads what may come from a stranger. */
export interface Target {
  readonly name: string;
  readonly about: string;
  /** Inputs that are right, or nearly. */
  readonly seeds: readonly Uint8Array[];
  /** Of its language; empty for what is not text. */
  readonly words: readonly string[];
  /** Longest input, bytes. */
  readonly longest: number;
  /** Sets checksums and lengths right, in place: else nothing behind them is ever reached. Done for most inputs. */
  repair?(input: Uint8Array): void;
  /** Reads it; undefined when it was refused as it should be. Throws what nobody foresaw, and what must not be. */
  decode(input: Uint8Array): unknown;
  /** A bug that the fuzzer must find: whether what was read would set it off. Not so for the seeds. */
  planted(read: unknown): boolean;
}

export interface FuzzWishes {
  readonly seed: number;
  readonly inputs: number;
  /** Without it, inputs are not kept for the code that they reach. */
  readonly coverage?: Coverage | undefined;
  /** Folder in which inputs that reach something new are kept from one time to the next. */
  readonly corpus?: string | undefined;
  readonly planted?: boolean;
  /** Between batches; false ends it. */
  readonly goOn?: (done: number) => boolean;
}

export interface Fuzzed {
  readonly inputs: number;
  /** Inputs that were read and not refused. */
  readonly read: number;
  /** Inputs kept, the seeds among them, and characters of code that they reach. */
  readonly kept: number;
  readonly reached: number;
  readonly failures: readonly { readonly input: Uint8Array; readonly error: Error }[];
}

/** Failures after which it is enough. */
const mostFailures = 5;
const largestBatch = 2000;

/**
 * Changes inputs at random and keeps those that reach code that none reached before (after the manner of coverage-guided
 * fuzzing: Miller et al. 1990 for chance, Zalewski 2014 for keeping what is new). Same seed, same corpus, same inputs.
 */
export function fuzz(target: Target, wishes: FuzzWishes): Fuzzed {
  const choose = chooser(wishes.seed);
  const { coverage } = wishes;
  const failures: { input: Uint8Array; error: Error }[] = [];
  let read = 0;
  const attempt = (input: Uint8Array) => {
    try {
      const result = target.decode(input);
      if (result === undefined) return;
      read += 1;
      if (wishes.planted === true && target.planted(result)) throw new Error('the planted bug');
    } catch (error) {
      failures.push({ input, error: error as Error });
    }
  };
  const pool = [...target.seeds, ...kept(wishes.corpus)];
  for (const input of pool) attempt(input);
  const first = coverage?.take();
  first?.mark();
  let reached = first?.count ?? 0;

  const keep = (input: Uint8Array, fresh: Fresh) => {
    fresh.mark();
    reached += fresh.count;
    pool.push(input);
    if (wishes.corpus === undefined) return;
    fs.mkdirSync(wishes.corpus, { recursive: true });
    const name = createHash('sha256').update(input).digest('hex').slice(0, 24);
    fs.writeFileSync(path.join(wishes.corpus, name), input);
  };
  /** Which of the inputs reached what is new: halves are run again until one is left. */
  const find = (inputs: readonly Uint8Array[]) => {
    for (const input of inputs) attempt(input);
    const fresh = coverage!.take();
    if (fresh.count === 0) return;
    if (inputs.length === 1) {
      keep(inputs[0]!, fresh);
      return;
    }
    find(inputs.slice(0, inputs.length >> 1));
    find(inputs.slice(inputs.length >> 1));
  };

  let done = 0;
  let size = 16;
  while (
    done < wishes.inputs &&
    failures.length < (wishes.planted === true ? 1 : mostFailures) &&
    wishes.goOn?.(done) !== false
  ) {
    const batch: Uint8Array[] = [];
    for (let i = Math.min(size, wishes.inputs - done); i > 0; i -= 1) {
      const from = pool[choose(pool.length)]!;
      const input = changed(from, choose, pool, target.words, target.longest);
      if (choose(8) > 0) target.repair?.(input);
      batch.push(input);
    }
    for (const input of batch) {
      attempt(input);
      if (wishes.planted === true && failures.length > 0) break;
    }
    done += batch.length;
    if (coverage !== undefined && coverage.take().count > 0) {
      const before = read;
      const failed = failures.length;
      find(batch);
      read = before;
      failures.length = failed;
      size = Math.max(16, size >> 1);
    } else size = Math.min(largestBatch, 2 * size);
  }
  return { inputs: done, read, kept: pool.length, reached, failures };
}

function kept(folder: string | undefined): Uint8Array[] {
  if (folder === undefined || !fs.existsSync(folder)) return [];
  return fs
    .readdirSync(folder)
    .sort()
    .map((name) => Uint8Array.from(fs.readFileSync(path.join(folder, name))));
}
