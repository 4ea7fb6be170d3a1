import type { Journal } from './journal.js';
import { type RingHandle, RingWriter } from './ring.js';

/** Record kinds in the evidence ring. Every payload starts with the tick as a double. */
export const RECORD = { row: 1, input: 2, event: 3, snapshot: 4 } as const;

/** Byte offsets within the payloads. */
export const ROW = { hash: 8, values: 16 } as const;
export const INPUT = { link: 8, length: 12, bytes: 16 } as const;
export const EVENT = { code: 8, subject: 12, values: 16, length: 40 } as const;
export const SNAPSHOT = { values: 8 } as const;

/**
 * The journal of a run whose evidence another thread writes to disk. Rows hold the selected signals as 32-bit floats.
 * Rows are droppable when the ring drops (live); inputs, events and snapshots never are.
 */
export class RingJournal implements Journal {
  private readonly ring: RingWriter;
  private readonly rowBytes: number;

  /** `selection`: indices into the signals, in the order of the recording's columns. */
  constructor(
    handle: RingHandle,
    private readonly selection: Int32Array,
  ) {
    this.ring = new RingWriter(handle);
    this.rowBytes = ROW.values + 4 * selection.length;
  }

  row(tick: number, signals: Float64Array, hash: Int32Array): void {
    const ring = this.ring;
    const at = ring.claim(RECORD.row, this.rowBytes, true);
    if (at < 0) return;
    ring.f64[at >> 3] = tick;
    ring.i32[(at + ROW.hash) >> 2] = hash[0]!;
    ring.i32[(at + ROW.hash + 4) >> 2] = hash[1]!;
    const values = ring.f32;
    const selection = this.selection;
    const first = (at + ROW.values) >> 2;
    for (let i = 0; i < selection.length; i += 1) values[first + i] = signals[selection[i]!]!;
    ring.publish();
  }

  input(tick: number, link: number, bytes: Uint8Array, length: number): void {
    const ring = this.ring;
    const at = ring.claim(RECORD.input, INPUT.bytes + length, false);
    if (at < 0) return;
    ring.f64[at >> 3] = tick;
    ring.i32[(at + INPUT.link) >> 2] = link;
    ring.i32[(at + INPUT.length) >> 2] = length;
    const into = ring.bytes;
    const first = at + INPUT.bytes;
    for (let i = 0; i < length; i += 1) into[first + i] = bytes[i]!;
    ring.publish();
  }

  event(tick: number, code: number, subject: number, a: number, b: number, c: number): void {
    const ring = this.ring;
    const at = ring.claim(RECORD.event, EVENT.length, false);
    if (at < 0) return;
    ring.f64[at >> 3] = tick;
    ring.i32[(at + EVENT.code) >> 2] = code;
    ring.i32[(at + EVENT.subject) >> 2] = subject;
    const first = (at + EVENT.values) >> 3;
    ring.f64[first] = a;
    ring.f64[first + 1] = b;
    ring.f64[first + 2] = c;
    ring.publish();
  }

  snapshot(tick: number, block: Float64Array): void {
    const ring = this.ring;
    const at = ring.claim(RECORD.snapshot, SNAPSHOT.values + 8 * block.length, false);
    if (at < 0) return;
    ring.f64[at >> 3] = tick;
    ring.f64.set(block, (at + SNAPSHOT.values) >> 3);
    ring.publish();
  }

  /** Says that nothing more comes. */
  close(): void {
    this.ring.close();
  }

  /** Rows lost to a full ring, and records that must not be lost and were. */
  get dropped(): number {
    return this.ring.dropped;
  }

  get overflows(): number {
    return this.ring.overflows;
  }
}
