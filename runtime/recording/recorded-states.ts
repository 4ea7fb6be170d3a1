import { RecordingError } from './format.js';
import type { Ending, Recording } from './reader.js';

/**
 * The hashes and snapshots of a recording by tick, to compare a run that is computed again. Ticks must not go back; the
 * file is read as they reach its blocks, and between blocks `compare` allocates nothing.
 */
export class RecordedStates {
  /** How the recording ends, once it has been read to the end. */
  ending: Ending | undefined;
  /** Rows whose tick was passed over without a comparison. */
  skipped = 0;
  private readonly blocks: ReturnType<Recording['blocks']>;
  private ticks: Float64Array = new Float64Array(0);
  private hashes: Int32Array = new Int32Array(0);
  private row = 0;
  private snapshots: { readonly tick: number; readonly block: Float64Array }[] = [];
  private lastAsked = Number.NEGATIVE_INFINITY;

  constructor(recording: Recording) {
    this.blocks = recording.blocks();
  }

  /**
   * 1 when the recorded hash of `tick` is `hash`, 0 when it differs, -1 when the recording has no row of this tick (it was
   * dropped, or lies behind the end).
   */
  compare(tick: number, hash: Int32Array): -1 | 0 | 1 {
    if (tick < this.lastAsked) throw new RecordingError(`tick ${tick} asked for after tick ${this.lastAsked}`);
    this.lastAsked = tick;
    for (;;) {
      while (this.row < this.ticks.length && this.ticks[this.row]! < tick) {
        this.row += 1;
        this.skipped += 1;
      }
      if (this.row < this.ticks.length) break;
      if (!this.load()) return -1;
    }
    if (this.ticks[this.row] !== tick) return -1;
    const same = this.hashes[2 * this.row] === hash[0] && this.hashes[2 * this.row + 1] === hash[1];
    this.row += 1;
    return same ? 1 : 0;
  }

  /** The recorded block after `tick`, or undefined when that tick has none. Reads on in the file up to the next one. */
  snapshot(tick: number): Float64Array | undefined {
    for (;;) {
      this.snapshots = this.snapshots.filter((snapshot) => snapshot.tick >= tick);
      // A snapshot stands directly behind the rows up to its tick.
      if (this.snapshots.length > 0 || (this.ticks.at(-1) ?? Number.NEGATIVE_INFINITY) > tick || !this.load()) break;
    }
    const first = this.snapshots[0];
    return first?.tick === tick ? first.block : undefined;
  }

  /** Goes on to the next block of rows or snapshot; false at the end. */
  private load(): boolean {
    for (;;) {
      const step = this.blocks.next();
      if (step.done) {
        this.ending ??= step.value;
        return false;
      }
      const block = step.value;
      if (block.kind === 'snapshot') {
        this.snapshots.push(block);
        if (this.row < this.ticks.length) return true;
        continue;
      }
      if (block.kind !== 'rows' || block.count === 0) continue;
      const left = this.ticks.length - this.row;
      if (left > 0) {
        // Rows that nobody has compared yet, when a snapshot was asked for ahead of them.
        this.ticks = Float64Array.from([...this.ticks.subarray(this.row), ...block.ticks]);
        this.hashes = Int32Array.from([...this.hashes.subarray(2 * this.row), ...block.hashes]);
      } else {
        this.ticks = block.ticks;
        this.hashes = block.hashes;
      }
      this.row = 0;
      return true;
    }
  }
}
