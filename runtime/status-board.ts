/**
 * What the host may want to know of a run at any time and no row need carry: warnings, ages and counts of messages, the
 * state of the scenario. The loop copies it every few ticks into memory that both threads see; the host reads whenever
 * it likes. Guarded by a sequence number that is odd while the loop writes (a sequence lock): the loop never waits, the
 * host reads again.
 */
export interface BoardHandle {
  readonly memory: SharedArrayBuffer;
  /** What stands at each place: paths of slots of the block, then of signals. */
  readonly names: readonly string[];
}

const HEAD = 16;

export function boardBytes(count: number): number {
  return HEAD + 8 * (count + 1);
}

/** The loop's side. `write` allocates nothing and never waits. */
export class BoardWriter {
  readonly memory: SharedArrayBuffer;
  private readonly sequence: Int32Array;
  private readonly values: Float64Array;

  constructor(
    private readonly slots: Int32Array,
    private readonly signals: Int32Array,
    /** Ticks between two writings. */
    readonly every: number,
  ) {
    const count = slots.length + signals.length;
    this.memory = new SharedArrayBuffer(boardBytes(count));
    this.sequence = new Int32Array(this.memory, 0, 1);
    this.values = new Float64Array(this.memory, HEAD, count + 1);
  }

  write(block: Float64Array, signals: Float64Array, tick: number): void {
    const { sequence, values, slots } = this;
    Atomics.add(sequence, 0, 1);
    values[0] = tick;
    for (let i = 0; i < slots.length; i += 1) values[1 + i] = block[slots[i]!]!;
    const first = 1 + slots.length;
    for (let i = 0; i < this.signals.length; i += 1) values[first + i] = signals[this.signals[i]!]!;
    Atomics.add(sequence, 0, 1);
  }
}

/** The host's side. */
export class BoardReader {
  /** Tick of the last reading; NaN before. */
  tick = Number.NaN;
  private readonly sequence: Int32Array;
  private readonly shared: Float64Array;
  private readonly values: Float64Array;
  private readonly places: ReadonlyMap<string, number>;

  constructor(handle: BoardHandle) {
    const count = handle.names.length;
    this.sequence = new Int32Array(handle.memory, 0, 1);
    this.shared = new Float64Array(handle.memory, HEAD, count + 1);
    this.values = new Float64Array(count + 1);
    this.places = new Map(handle.names.map((name, i) => [name, i + 1]));
  }

  /** Reads the board as a whole; false when nothing was written yet or the loop wrote at every try. */
  read(): boolean {
    for (let tries = 0; tries < 1000; tries += 1) {
      const before = Atomics.load(this.sequence, 0);
      if (before === 0) return false;
      if ((before & 1) !== 0) continue;
      this.values.set(this.shared);
      if (Atomics.load(this.sequence, 0) !== before) continue;
      this.tick = this.values[0]!;
      return true;
    }
    return false;
  }

  /** As of the last reading; undefined for what is not on the board. */
  value(name: string): number | undefined {
    const place = this.places.get(name);
    return place === undefined ? undefined : this.values[place];
  }

  /** Place of a name, -1 when it is not there: for stretches of slots. */
  place(name: string): number {
    return this.places.get(name) ?? -1;
  }

  /** A view of `count` values from a place on, as of the last reading. */
  stretch(place: number, count: number): Float64Array {
    return this.values.subarray(place, place + count);
  }
}
