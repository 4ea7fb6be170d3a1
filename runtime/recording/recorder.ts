import { type RingHandle, RingReader } from '../ring.js';
import { EVENT, INPUT, RECORD, ROW, SNAPSHOT } from '../ring-journal.js';
import { EventColumns, InputColumns } from './columns.js';
import type { RecordingWriter } from './writer.js';

export interface RecorderOptions {
  /** Signals in a row. */
  readonly signals: number;
  /** Ticks in a block of rows. Default 256. */
  readonly blockRows?: number;
  /** Blocks are closed after this time at the latest, ms. Default 250. */
  readonly flushEvery?: number;
  /** How often the ring is looked at, ms. Default 5. */
  readonly pollEvery?: number;
  /** While the disk owes more bytes than this, the ring is left alone: live it drops rows then, at fast pace the loop waits. Default 64 MiB. */
  readonly mostBacklog?: number;
  /** A tick is paired with the wall clock this often, ms. Default 10000. */
  readonly stampEvery?: number;
  /** Called for each event as it is read. */
  readonly onEvent?: (tick: number, code: number, subject: number, a: number, b: number, c: number) => void;
  /** Called for the last row of each look at the ring; `values` is a view that the next look overwrites. */
  readonly onRow?: (tick: number, values: Float32Array) => void;
  /** Called for all rows, in batches: `count` ticks and their values row after row, in arrays that the next batch overwrites. */
  readonly onRows?: (ticks: Float64Array, values: Float32Array, count: number) => void;
}

/** Rows in a batch for `onRows`. */
const BATCH_ROWS = 64;
const MOST_BACKLOG = 64 << 20;
/** Inputs of a block, bytes, before it is closed early. */
const MOST_INPUT_BYTES = 4 << 20;
const MOST_ROW_BYTES = 8 << 20;
/** Bytes of records after which one look at the ring yields to the rest of the host thread. */
const MOST_AT_ONCE = 4 << 20;

/**
 * The host thread's end of the evidence ring: reads what the loop recorded, gathers it into blocks and has them written.
 * Without a writer it only counts and calls back. When the disk has failed it goes on reading, so that the loop never
 * waits for it; the writer's `failure` makes the run not valid.
 */
export class Recorder {
  rows = 0;
  inputs = 0;
  events = 0;
  /** The last tick of which anything was read, NaN before. Ticks of the pre-roll are negative. */
  lastTick = Number.NaN;
  private readonly ring: RingReader;
  private readonly signals: number;
  private readonly mostBacklog: number;
  private readonly blockRows: number;
  private readonly ticks: Float64Array;
  private readonly hashes: Int32Array;
  /** Column-major: values[signal * blockRows + row]. */
  private readonly values: Float32Array;
  private readonly latest: Float32Array;
  private readonly batchTicks: Float64Array;
  private readonly batch: Float32Array;
  private batched = 0;
  private readonly inputColumns = new InputColumns();
  private readonly eventColumns = new EventColumns();
  private count = 0;
  private lastFlush = Date.now();
  private lastStamp = 0;
  private timer: NodeJS.Timeout | NodeJS.Immediate | undefined;
  private stopped = false;

  constructor(
    ring: RingHandle,
    private readonly writer: RecordingWriter | undefined,
    private readonly options: RecorderOptions,
  ) {
    this.ring = new RingReader(ring);
    this.signals = options.signals;
    this.mostBacklog = options.mostBacklog ?? MOST_BACKLOG;
    this.blockRows = Math.max(
      1,
      Math.min(options.blockRows ?? 256, Math.floor(MOST_ROW_BYTES / (4 * Math.max(1, options.signals)))),
    );
    this.ticks = new Float64Array(this.blockRows);
    this.hashes = new Int32Array(2 * this.blockRows);
    this.values = new Float32Array(this.blockRows * options.signals);
    this.latest = new Float32Array(options.signals);
    const batchRows = options.onRows === undefined ? 0 : BATCH_ROWS;
    this.batchTicks = new Float64Array(batchRows);
    this.batch = new Float32Array(batchRows * options.signals);
  }

  /** Rows lost to a full ring. */
  get dropped(): number {
    return this.ring.dropped;
  }

  /** Records that must not be lost and were: the run is not valid. */
  get overflows(): number {
    return this.ring.overflows;
  }

  /** Looks at the ring by timer from now on. */
  start(): void {
    if (this.timer !== undefined || this.stopped) return;
    const look = () => {
      const busy = this.drain();
      this.timer = undefined;
      if (this.stopped) return;
      this.timer = busy ? setImmediate(look) : setTimeout(look, this.options.pollEvery ?? 5);
    };
    this.timer = setTimeout(look, 0);
  }

  /** Reads what is in the ring now; true when there may be more at once. */
  drain(): boolean {
    const writer = this.writer;
    if (writer !== undefined && writer.failure === undefined && writer.backlog > this.mostBacklog) {
      writer.write();
      return false;
    }
    const ring = this.ring;
    let bytes = 0;
    let rowAt = -1;
    while (bytes < MOST_AT_ONCE && ring.next()) {
      bytes += ring.length;
      if (ring.kind === RECORD.row) rowAt = ring.offset;
      this.take();
    }
    if (rowAt >= 0 && this.options.onRow !== undefined) {
      const first = (rowAt + ROW.values) >> 2;
      this.latest.set(ring.f32.subarray(first, first + this.signals));
      this.options.onRow(ring.f64[rowAt >> 3]!, this.latest);
    }
    ring.release();
    this.handBatch();
    if (Date.now() - this.lastFlush >= (this.options.flushEvery ?? 250)) this.flush();
    return bytes >= MOST_AT_ONCE;
  }

  /**
   * Reads the ring to its end (the loop has stopped), writes the end with the run's summary and closes the file. Rejects
   * when the disk failed.
   */
  async finish(summary: Readonly<Record<string, unknown>>): Promise<void> {
    this.stop();
    const writer = this.writer;
    while (this.drain() || (writer !== undefined && writer.failure === undefined && writer.backlog > this.mostBacklog))
      await writer?.drained();
    this.flush();
    if (writer === undefined) return;
    if (writer.failure === undefined) {
      this.stamp(writer);
      writer.add('end', {
        rows: this.rows,
        inputs: this.inputs,
        events: this.events,
        dropped: this.dropped,
        overflows: this.overflows,
        // As the command prints it: nothing but what JSON can say.
        summary: JSON.parse(JSON.stringify(summary)) as unknown,
      });
    }
    await writer.close();
  }

  /** Stops looking at the ring. */
  stop(): void {
    this.stopped = true;
    if (this.timer !== undefined) {
      clearTimeout(this.timer as NodeJS.Timeout);
      clearImmediate(this.timer as NodeJS.Immediate);
    }
    this.timer = undefined;
  }

  private take(): void {
    const ring = this.ring;
    const at = ring.offset;
    const tick = ring.f64[at >> 3]!;
    this.lastTick = tick;
    switch (ring.kind) {
      case RECORD.row:
        this.takeRow(at, tick);
        break;
      case RECORD.input: {
        const length = ring.i32[(at + INPUT.length) >> 2]!;
        this.inputs += 1;
        if (this.writer === undefined) break;
        this.inputColumns.add(tick, ring.i32[(at + INPUT.link) >> 2]!, ring.bytes, at + INPUT.bytes, length);
        if (this.inputColumns.length > MOST_INPUT_BYTES) this.flush();
        break;
      }
      case RECORD.event: {
        // in order: the rows before it first
        this.handBatch();
        const first = (at + EVENT.values) >> 3;
        const code = ring.i32[(at + EVENT.code) >> 2]!;
        const subject = ring.i32[(at + EVENT.subject) >> 2]!;
        this.events += 1;
        if (this.writer !== undefined)
          this.eventColumns.add(tick, code, subject, ring.f64[first]!, ring.f64[first + 1]!, ring.f64[first + 2]!);
        this.options.onEvent?.(tick, code, subject, ring.f64[first]!, ring.f64[first + 1]!, ring.f64[first + 2]!);
        break;
      }
      case RECORD.snapshot: {
        if (this.writer === undefined || this.writer.failure !== undefined) break;
        // Behind the inputs of its tick, as everything that depends on them.
        this.flush();
        const first = (at + SNAPSHOT.values) >> 3;
        const block = ring.f64.slice(first, first + (ring.length - SNAPSHOT.values) / 8);
        this.writer.add('snapshot', { tick, block: Buffer.from(block.buffer, 0, block.byteLength) });
        break;
      }
    }
  }

  private handBatch(): void {
    if (this.batched === 0) return;
    const count = this.batched;
    this.batched = 0;
    this.options.onRows?.(this.batchTicks, this.batch, count);
  }

  private takeRow(at: number, tick: number): void {
    this.rows += 1;
    if (this.batchTicks.length > 0) {
      const row = (at + ROW.values) >> 2;
      this.batchTicks[this.batched] = tick;
      this.batch.set(this.ring.f32.subarray(row, row + this.signals), this.batched * this.signals);
      this.batched += 1;
      if (this.batched === this.batchTicks.length) this.handBatch();
    }
    if (this.writer === undefined) return;
    const ring = this.ring;
    const row = this.count;
    this.ticks[row] = tick;
    this.hashes[2 * row] = ring.i32[(at + ROW.hash) >> 2]!;
    this.hashes[2 * row + 1] = ring.i32[(at + ROW.hash + 4) >> 2]!;
    const first = (at + ROW.values) >> 2;
    const from = ring.f32;
    const into = this.values;
    const stride = this.blockRows;
    for (let i = 0; i < this.signals; i += 1) into[i * stride + row] = from[first + i]!;
    this.count = row + 1;
    if (this.count === this.blockRows) this.flush();
  }

  /** Closes the present blocks and has them written, inputs ahead of rows. */
  flush(): void {
    this.lastFlush = Date.now();
    const writer = this.writer;
    if (writer !== undefined && writer.failure === undefined) {
      if (this.inputColumns.count > 0) writer.add('inputs', this.inputColumns.fields());
      if (this.eventColumns.count > 0) writer.add('events', this.eventColumns.fields());
      if (this.count > 0) writer.add('rows', this.rowFields());
      if (!Number.isNaN(this.lastTick) && this.lastFlush - this.lastStamp >= (this.options.stampEvery ?? 10_000))
        this.stamp(writer);
      writer.write();
    }
    this.inputColumns.clear();
    this.eventColumns.clear();
    this.count = 0;
  }

  private rowFields(): Record<string, unknown> {
    const count = this.count;
    const data = new Float32Array(count * this.signals);
    for (let i = 0; i < this.signals; i += 1)
      data.set(this.values.subarray(i * this.blockRows, i * this.blockRows + count), i * count);
    const ticks = this.ticks;
    let contiguous = true;
    for (let i = 1; i < count; i += 1) if (ticks[i] !== ticks[0]! + i) contiguous = false;
    return {
      ...(contiguous ? { first: ticks[0]! } : { ticks: bytesOf(ticks.slice(0, count)) }),
      hashes: bytesOf(this.hashes.slice(0, 2 * count)),
      data: bytesOf(data),
    };
  }

  private stamp(writer: RecordingWriter): void {
    if (Number.isNaN(this.lastTick)) return;
    this.lastStamp = Date.now();
    writer.add('stamp', { tick: this.lastTick, wall: this.lastStamp });
  }
}

function bytesOf(view: Float64Array | Float32Array | Int32Array): Buffer {
  return Buffer.from(view.buffer as ArrayBuffer, view.byteOffset, view.byteLength);
}
