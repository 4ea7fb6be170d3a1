import type { WatchLevel } from './contract.js';
import type { WatchLadder } from './watch-ladders.js';
import { SLOT } from './watch-tables.js';

/** A warning for people and for `--json`. Times in s since tick 0, values in SI, pressures absolute. */
export interface WatchWarning {
  readonly path: string;
  readonly unit: string;
  readonly side: 'above' | 'below';
  /** The worst that it reached. */
  readonly level: WatchLevel;
  /** First tick of it. */
  readonly since: number;
  /** Last tick of it; null while it lasts. */
  readonly until: number | null;
  /** Largest value for `above`, least for `below`, while it lasted. */
  readonly peak: number;
  /** That of the worst level. */
  readonly setting: number;
  /** How often it came before it was acknowledged. */
  readonly times: number;
  readonly acknowledged: boolean;
  readonly meaning: string;
  /** Where the setting comes from. */
  readonly from: string;
  /** For `acknowledge`, while it is open; -1 once it is closed. */
  readonly index: number;
}

const FIELDS = 1 + SLOT.count;
const most = 256;

/** Warnings that are over and acknowledged: an output of the ticks, not a state. The first 256 are kept. */
export class WatchLog {
  /** Closed warnings beyond the first 256. */
  forgotten = 0;
  private readonly kept = new Float64Array(FIELDS * most);
  private count = 0;

  clear(): void {
    this.count = 0;
    this.forgotten = 0;
  }

  /** Keeps the warning of ladder `k`, whose slots begin at `at`. */
  add(block: Float64Array, at: number, k: number): void {
    if (this.count === most) {
      this.forgotten += 1;
      return;
    }
    const into = FIELDS * this.count;
    this.kept[into] = k;
    for (let i = 0; i < SLOT.count; i += 1) this.kept[into + 1 + i] = block[at + i];
    this.count += 1;
  }

  /** The kept warnings, oldest first. Not for the tick. */
  list(ladders: readonly WatchLadder[], step: number): WatchWarning[] {
    return Array.from({ length: this.count }, (_, i) => {
      const fields = this.kept.subarray(FIELDS * i, FIELDS * (i + 1));
      return { ...describeWarning(ladders[fields[0]], fields.subarray(1), step), index: -1 };
    });
  }
}

/** What a warning's slots say, in words and units. */
export function describeWarning(ladder: WatchLadder, slots: Float64Array, step: number): Omit<WatchWarning, 'index'> {
  const { path, unit, side, rungs } = ladder;
  const { level, setting, meaning, from } = rungs[slots[SLOT.worst] - 1];
  const seconds = (ticks: number) => Number((ticks * step).toFixed(9));
  return {
    path,
    unit,
    side,
    level,
    since: seconds(slots[SLOT.since]),
    until: slots[SLOT.present] > 0 ? null : seconds(slots[SLOT.until]),
    peak: slots[SLOT.peak],
    setting,
    times: slots[SLOT.times],
    acknowledged: slots[SLOT.acknowledged] !== 0,
    meaning,
    from,
  };
}
