/**
 * A bounded byte ring between one producing and one consuming thread, in one SharedArrayBuffer. Records are framed,
 * never wrap around the end, and start at a multiple of 8 bytes, so that both sides write and read numbers in place
 * through typed views. Neither side allocates per record.
 *
 * When there is no room, the policy counts:
 * - `drop` (live): a droppable record is refused while less than the reserve would stay free, and counted in `dropped`.
 *   The reserve belongs to records that must not be lost; one that does not fit even there is counted in `overflows`, and
 *   a run with overflows is not valid. The producer never waits.
 * - `wait` (fast pace): the producer sleeps until there is room, at most `patience` ms at a time or until `abort()`;
 *   running out of patience counts as an overflow.
 */
export interface RingOptions {
  /** Bytes for records, a power of two. Default 8 MiB. */
  readonly capacity?: number;
  /** Bytes kept for records that must not be lost. Default a quarter of the capacity. */
  readonly reserve?: number;
  readonly whenFull: 'drop' | 'wait';
  /** ms, for `wait`. Default 30000. */
  readonly patience?: number;
}

/** What a thread needs to attach to a ring: plain data and the shared memory. */
export interface RingHandle {
  readonly memory: SharedArrayBuffer;
  readonly capacity: number;
  readonly reserve: number;
  readonly whenFull: 'drop' | 'wait';
  readonly patience: number;
}

/** Positions in the control words. Head and tail count bytes modulo 2^32. */
const HEAD = 0;
const TAIL = 16;
const WAITING = 17;
const ABORTED = 18;
const DROPPED = 32;
const OVERFLOWS = 33;
const CLOSED = 34;
/** Control words fill four cache lines, so that the two sides do not write into one line. */
const CONTROL_BYTES = 256;
/** A frame: [payload bytes, kind]. */
const FRAME_BYTES = 8;
const PADDING = -1;

export function createRing(options: RingOptions): RingHandle {
  const capacity = options.capacity ?? 8 << 20;
  const reserve = options.reserve ?? capacity / 4;
  if (!Number.isInteger(capacity) || capacity < 64 || capacity > 1 << 30 || (capacity & (capacity - 1)) !== 0) {
    throw new RangeError(`ring capacity ${capacity} bytes: a power of two between 64 and 2^30`);
  }
  if (!(reserve >= 0 && reserve < capacity))
    throw new RangeError(`ring reserve ${reserve} bytes: 0 up to less than the capacity ${capacity}`);
  return {
    memory: new SharedArrayBuffer(CONTROL_BYTES + capacity),
    capacity,
    reserve,
    whenFull: options.whenFull,
    patience: options.patience ?? 30_000,
  };
}

class RingView {
  readonly capacity: number;
  /** Views over the records: divide a byte offset by 4 or 8 for the wider ones. */
  readonly bytes: Uint8Array;
  readonly i32: Int32Array;
  readonly f32: Float32Array;
  readonly f64: Float64Array;
  protected readonly control: Int32Array;
  protected readonly mask: number;

  constructor(readonly handle: RingHandle) {
    this.capacity = handle.capacity;
    this.mask = handle.capacity - 1;
    this.control = new Int32Array(handle.memory, 0, CONTROL_BYTES / 4);
    this.bytes = new Uint8Array(handle.memory, CONTROL_BYTES, handle.capacity);
    this.i32 = new Int32Array(handle.memory, CONTROL_BYTES, handle.capacity / 4);
    this.f32 = new Float32Array(handle.memory, CONTROL_BYTES, handle.capacity / 4);
    this.f64 = new Float64Array(handle.memory, CONTROL_BYTES, handle.capacity / 8);
  }

  /** Droppable records that were refused. */
  get dropped(): number {
    return Atomics.load(this.control, DROPPED) >>> 0;
  }

  /** Records that must not be lost and were. */
  get overflows(): number {
    return Atomics.load(this.control, OVERFLOWS) >>> 0;
  }

  /** True when the producer has said that nothing more comes. */
  get closed(): boolean {
    return Atomics.load(this.control, CLOSED) !== 0;
  }

  get aborted(): boolean {
    return Atomics.load(this.control, ABORTED) !== 0;
  }

  /** Bytes in the ring, frames and padding included. */
  get used(): number {
    return (Atomics.load(this.control, HEAD) - Atomics.load(this.control, TAIL)) >>> 0;
  }

  /** Wakes a producer that waits for room and makes it give up, from either side. */
  abort(): void {
    Atomics.store(this.control, ABORTED, 1);
    Atomics.notify(this.control, TAIL);
  }
}

/** The producing side. `claim`, write through the views, `publish`. */
export class RingWriter extends RingView {
  private head: number;
  private claimed = 0;
  private readonly reserve: number;
  private readonly waits: boolean;

  constructor(handle: RingHandle) {
    super(handle);
    this.head = Atomics.load(this.control, HEAD);
    this.reserve = handle.reserve;
    this.waits = handle.whenFull === 'wait';
  }

  /**
   * Room for a record of `length` bytes: the byte offset of its payload (a multiple of 8), or -1 when it was refused and
   * counted. A claim that is not published is forgotten by the next one.
   */
  claim(kind: number, length: number, droppable: boolean): number {
    const total = (FRAME_BYTES + length + 7) & ~7;
    const at = this.head & this.mask;
    const toEnd = this.capacity - at;
    // A record that does not fit before the end starts over at the beginning, behind a padding record.
    const skipped = toEnd < total ? toEnd : 0;
    const needed = skipped + total;
    if (length < 0 || total > this.capacity / 2) return this.refuse(false);
    const spare = droppable && !this.waits ? this.reserve : 0;
    if (this.free() < needed + spare && !(this.waits && this.waitFor(needed)))
      return this.refuse(droppable && !this.waits);
    let start = at;
    if (skipped > 0) {
      this.i32[at >> 2] = skipped - FRAME_BYTES;
      this.i32[(at >> 2) + 1] = PADDING;
      start = 0;
    }
    this.i32[start >> 2] = length;
    this.i32[(start >> 2) + 1] = kind;
    this.claimed = needed;
    return start + FRAME_BYTES;
  }

  /** Hands the claimed record over. */
  publish(): void {
    this.head = (this.head + this.claimed) | 0;
    this.claimed = 0;
    Atomics.store(this.control, HEAD, this.head);
  }

  /** Says that nothing more comes. */
  close(): void {
    Atomics.store(this.control, CLOSED, 1);
  }

  private free(): number {
    return this.capacity - ((this.head - Atomics.load(this.control, TAIL)) >>> 0);
  }

  private refuse(droppable: boolean): number {
    this.claimed = 0;
    Atomics.add(this.control, droppable ? DROPPED : OVERFLOWS, 1);
    return -1;
  }

  private waitFor(needed: number): boolean {
    Atomics.store(this.control, WAITING, 1);
    let room = false;
    for (;;) {
      const tail = Atomics.load(this.control, TAIL);
      room = this.capacity - ((this.head - tail) >>> 0) >= needed;
      if (room || Atomics.load(this.control, ABORTED) !== 0) break;
      // Any progress of the consumer starts the patience anew.
      if (Atomics.wait(this.control, TAIL, tail, this.handle.patience) === 'timed-out') break;
    }
    Atomics.store(this.control, WAITING, 0);
    return room;
  }
}

/** The consuming side. `next`, read through the views, `release`. */
export class RingReader extends RingView {
  /** The record that `next` found: byte offset and length of its payload, and its kind. */
  offset = 0;
  length = 0;
  kind = 0;
  private tail: number;
  private after: number;

  constructor(handle: RingHandle) {
    super(handle);
    this.tail = Atomics.load(this.control, TAIL);
    this.after = this.tail;
  }

  /** Moves to the next record; false when there is none. Records stay in place until `release`. */
  next(): boolean {
    const head = Atomics.load(this.control, HEAD);
    while (this.after !== head) {
      const at = this.after & this.mask;
      const length = this.i32[at >> 2]!;
      const kind = this.i32[(at >> 2) + 1]!;
      this.after = (this.after + ((FRAME_BYTES + length + 7) & ~7)) | 0;
      if (kind === PADDING) continue;
      this.offset = at + FRAME_BYTES;
      this.length = length;
      this.kind = kind;
      return true;
    }
    return false;
  }

  /** Gives the room of all records so far back to the producer and wakes it if it waits. */
  release(): void {
    if (this.tail === this.after) return;
    this.tail = this.after;
    Atomics.store(this.control, TAIL, this.tail);
    if (Atomics.load(this.control, WAITING) !== 0) Atomics.notify(this.control, TAIL);
  }
}
