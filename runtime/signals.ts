import type { SignalInfo } from './contract.js';

/** The list of all signals of a bench. Their values of the present tick stand in one Float64Array in this order, SI. */
export class SignalTable {
  readonly all: SignalInfo[] = [];
  private readonly byPath = new Map<string, number>();

  get length(): number {
    return this.all.length;
  }

  /** Adds a signal; its index. Throws on a path that exists: two elements may not share a name. */
  add(info: SignalInfo): number {
    if (this.byPath.has(info.path)) throw new Error(`signal ${info.path} exists already`);
    this.byPath.set(info.path, this.all.length);
    this.all.push(info);
    return this.all.length - 1;
  }

  /** Index of a path, or -1. */
  find(path: string): number {
    return this.byPath.get(path) ?? -1;
  }

  /** The paths most like `path`, best first, for messages about unknown ones. */
  nearest(path: string, count = 3): string[] {
    return nearest(path, this.byPath.keys(), count);
  }
}

/** The candidates with the least edit distance (Levenshtein 1966) to `word`, best first, none that is mostly different. */
export function nearest(word: string, candidates: Iterable<string>, count = 1): string[] {
  const scored: [number, string][] = [];
  for (const candidate of candidates) {
    const distance = editDistance(word.toLowerCase(), candidate.toLowerCase());
    if (distance <= Math.max(2, Math.floor(Math.max(word.length, candidate.length) * 0.45)))
      scored.push([distance, candidate]);
  }
  scored.sort((a, b) => a[0] - b[0] || (a[1] < b[1] ? -1 : 1));
  return scored.slice(0, count).map((entry) => entry[1]);
}

function editDistance(a: string, b: string): number {
  let row = Array.from({ length: b.length + 1 }, (_, i) => i);
  for (let i = 1; i <= a.length; i += 1) {
    const next = [i];
    for (let j = 1; j <= b.length; j += 1) {
      const swap = row[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1);
      next.push(Math.min(swap, row[j]! + 1, next[j - 1]! + 1));
    }
    row = next;
  }
  return row[b.length]!;
}
