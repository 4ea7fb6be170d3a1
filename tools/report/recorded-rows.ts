import type { SignalInfo } from '../../runtime/contract.js';
import type { Recording } from '../../runtime/recording/reader.js';
import type { PlotSource } from './gather.js';

export interface RecordedEvent {
  readonly tick: number;
  readonly code: number;
  readonly subject: number;
  readonly values: readonly [number, number, number];
}

/** The columns of a recording that a report needs, read in one pass; counted ticks only. */
export class RecordedRows implements PlotSource {
  readonly step: number;
  /** Counted ticks up to the last row. */
  readonly ticks: number;
  /** Ticks among them that have no row. */
  readonly missing: number;
  readonly events: readonly RecordedEvent[];
  /** Events beyond the first `mostEvents`. */
  readonly eventsLeftOut: number;
  private readonly columns = new Map<string, Float32Array>();
  private readonly infos: ReadonlyMap<string, SignalInfo>;

  constructor(recording: Recording, lastTick: number, wanted: ReadonlySet<string>, mostEvents = 2000) {
    const { header } = recording;
    this.step = header.step;
    this.ticks = Number.isFinite(lastTick) ? Math.max(0, lastTick + 1) : 0;
    this.infos = new Map(header.signals.map((signal) => [signal.path, signal as SignalInfo]));
    const picked: { at: number; into: Float32Array }[] = [];
    header.signals.forEach(({ path }, at) => {
      if (!wanted.has(path)) return;
      const into = new Float32Array(this.ticks).fill(Number.NaN);
      this.columns.set(path, into);
      picked.push({ at, into });
    });
    const events: RecordedEvent[] = [];
    let left = 0;
    let rows = 0;
    for (const block of recording.blocks()) {
      if (block.kind === 'rows') {
        for (let row = 0; row < block.count; row += 1) {
          const tick = block.ticks[row]!;
          if (tick < 0 || tick >= this.ticks) continue;
          rows += 1;
          for (const { at, into } of picked) into[tick] = block.data[at * block.count + row]!;
        }
      } else if (block.kind === 'events') {
        for (let i = 0; i < block.count; i += 1) {
          if (events.length >= mostEvents) {
            left += 1;
            continue;
          }
          const [a, b, c] = block.values.subarray(3 * i, 3 * i + 3);
          events.push({
            tick: block.ticks[i]!,
            code: block.codes[i]!,
            subject: block.subjects[i]!,
            values: [a!, b!, c!],
          });
        }
      }
    }
    this.events = events;
    this.eventsLeftOut = left;
    this.missing = this.ticks - rows;
  }

  find(path: string): SignalInfo | undefined {
    return this.infos.get(path);
  }

  values(path: string, first: number, last: number): Float32Array | undefined {
    return this.columns.get(path)?.subarray(first, last + 1);
  }

  /** All ticks of a column; undefined when it was not recorded or not asked for. */
  column(path: string): Float32Array | undefined {
    return this.columns.get(path);
  }
}
