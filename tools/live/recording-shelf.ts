import { readdir, stat } from 'node:fs/promises';
import { join } from 'node:path';
import { setImmediate } from 'node:timers/promises';
import { Decimator } from '../../bridge/live/decimate.js';
import type {
  History,
  LiveEvent,
  LiveStatus,
  RecordingEntry,
  RecordingShelf,
  RecordingView,
  WarningStatus,
} from '../../bridge/live/source.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import type { SignalInfo } from '../../runtime/contract.js';
import type { EndBlock, RowsBlock } from '../../runtime/recording/format.js';
import { RecordingError } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { emptyScript, type ScriptSpec } from '../../runtime/script.js';
import { benchFacts } from './bench-facts.js';
import { warningsAt } from './recorded-warnings.js';

/** Intervals of the overview that is held of an open recording. */
const overviewIntervals = 4000;
/** Blocks that are read before others get their turn. */
const blocksAtOnce = 8;

/** The recordings in a folder. A file that is none, or not readable, is left out. */
export function recordingShelf(folder: string, ending = '.osrec'): RecordingShelf {
  return {
    async list() {
      const names = await readdir(folder).catch(() => [] as string[]);
      const entries: RecordingEntry[] = [];
      for (const name of names.filter((candidate) => candidate.endsWith(ending)).sort()) {
        const entry = await describe(join(folder, name), name).catch(() => undefined);
        if (entry !== undefined) entries.push(entry);
      }
      return entries.sort((a, b) => b.startedAt - a.startedAt);
    },
    open: (name) => RecordedRun.open(join(folder, name)),
  };
}

async function describe(file: string, name: string): Promise<RecordingEntry> {
  const facts = await stat(file);
  const recording = new Recording(file);
  try {
    const { header } = recording;
    const script = scriptOf(recording);
    const startedAt = Date.parse(header.created);
    return {
      name,
      bench: header.bench.name,
      scenario: script.name,
      startedAt,
      length: Math.max(0, (facts.mtimeMs - startedAt) / 1000),
      verdict: '',
    };
  } finally {
    recording.close();
  }
}

function scriptOf(recording: Recording): ScriptSpec {
  const text = recording.header.options['script'];
  return typeof text === 'string' ? (JSON.parse(text) as ScriptSpec) : emptyScript;
}

/** A recording that is open for looking back: an overview in memory, details from the file when they are asked for. */
class RecordedRun implements RecordingView {
  readonly bench: RecordingView['bench'];
  readonly signals: readonly SignalInfo[];
  readonly events: RecordingView['events'];
  firstTick = 0;
  lastTick = 0;
  private overview: Decimator;
  private readonly found: LiveEvent[] = [];
  private readonly stamps: { tick: number; wall: number }[] = [];
  /** Where each block of rows stands, to read it again. */
  private readonly index: { at: number; number: number; first: number; last: number }[] = [];
  private readonly spec;
  private readonly script: ScriptSpec;
  private end: EndBlock | undefined;

  private constructor(private readonly recording: Recording) {
    const { header } = recording;
    const texts = Object.fromEntries(header.bench.files.map((one) => [one.path, one.text]));
    this.spec = readBench(header.bench.files[0]!.path, catalogue, memoryFiles(texts));
    this.script = scriptOf(recording);
    this.signals = header.signals as readonly SignalInfo[];
    this.events = header.events;
    this.bench = benchFacts({ spec: this.spec, script: this.script, recorded: this.signals });
    this.overview = new Decimator({ signals: 0, interval: 1, tiers: [{ factor: 1, slots: 1 }] });
  }

  /** Reads through the file once. Throws RecordingError when there is no row in it. */
  static async open(file: string): Promise<RecordedRun> {
    const recording = new Recording(file);
    try {
      const run = new RecordedRun(recording);
      await run.survey();
      return run;
    } catch (error) {
      recording.close();
      throw error;
    }
  }

  private async survey(): Promise<void> {
    const { rows, firstTick, lastTick } = this.recording.examine();
    if (rows === 0) throw new RecordingError(`${this.recording.file}: there is no tick in it`);
    this.firstTick = Math.max(0, firstTick);
    this.lastTick = lastTick;
    const interval = Math.max(1, Math.ceil((lastTick + 1) / overviewIntervals));
    const slots = Math.ceil((lastTick + 1) / interval) + 1;
    this.overview = new Decimator({ signals: this.signals.length, interval, tiers: [{ factor: 1, slots }] });
    const all = this.signals.map((_, i) => i);
    let read = 0;
    let at = this.recording.afterHeader;
    for (const block of this.recording.blocks()) {
      if (block.kind === 'rows') {
        feed(this.overview, block, all);
        if (block.count > 0)
          this.index.push({ at, number: read + 1, first: block.ticks[0]!, last: block.ticks[block.count - 1]! });
      } else if (block.kind === 'events') {
        for (let i = 0; i < block.count; i += 1) {
          const [a, b, c] = block.values.subarray(3 * i, 3 * i + 3);
          this.found.push({
            tick: block.ticks[i]!,
            kind: block.codes[i]!,
            subject: block.subjects[i]!,
            a: a!,
            b: b!,
            c: c!,
          });
        }
      } else if (block.kind === 'stamp') this.stamps.push({ tick: block.tick, wall: block.wall });
      else if (block.kind === 'end') this.end = block;
      at = this.recording.position;
      if ((read += 1) % blocksAtOnce === 0) await setImmediate();
    }
  }

  async history(signals: readonly number[], from: number, to: number, bins: number): Promise<History> {
    const last = Math.min(to, this.lastTick);
    const width = Math.max(1, Math.ceil((last - from + 1) / bins));
    if (width >= this.overview.interval) return this.overview.history(signals, from, last, bins);
    const detail = new Decimator({
      signals: signals.length,
      interval: width,
      tiers: [{ factor: 1, slots: Math.ceil((last - from + 1) / width) + 2 }],
    });
    let read = 0;
    for (const entry of this.index) {
      if (entry.first > last || entry.last < from) continue;
      const block = this.recording.again(entry.at, entry.number);
      if (block.kind === 'rows') feed(detail, block, signals, last);
      if ((read += 1) % blocksAtOnce === 0) await setImmediate();
    }
    return detail.history(
      signals.map((_, i) => i),
      from,
      last,
      bins,
    );
  }

  async eventsIn(from: number, to: number, most: number): Promise<readonly LiveEvent[]> {
    return this.found.filter((event) => event.tick >= from && event.tick <= to).slice(-most);
  }

  async statusAt(tick: number): Promise<LiveStatus> {
    const step = this.script.steps.findLastIndex((candidate) => candidate.at <= tick);
    const stamp = this.stamps.findLast((candidate) => candidate.tick <= tick) ?? this.stamps[0];
    const nothing = { edges: [], counts: [], most: 0, budget: 0 };
    return {
      run: {
        phase: 'recorded',
        pace: 'recording',
        tick,
        wallClock: stamp === undefined ? 0 : stamp.wall + (tick - stamp.tick) * this.spec.step * 1000,
        notValid: this.end === undefined ? ['the recording has no end: it was cut off'] : [],
        hands: 0,
        droppedRows: this.end?.dropped ?? 0,
      },
      scenario: {
        state: this.script.ticks > 0 && tick >= this.script.ticks ? 'ended' : 'running',
        step,
        sinceTick: this.script.steps[step]?.at ?? 0,
      },
      warnings: warningsAt(this.found, this.events, this.spec.watched, tick).map((warning) =>
        this.withPeak(warning, tick),
      ),
      messages: [],
      timing: { lateness: nothing, stepTime: nothing, overruns: 0, collections: 0, drift: 0 },
      requirements: [],
    };
  }

  /** The events say what a value was when a level began; how far it went stands in the rows. */
  private withPeak(warning: WarningStatus, tick: number): WarningStatus {
    const at = this.signals.findIndex((info) => info.path === warning.path);
    if (at < 0 || !warning.active) return warning;
    const { least, most } = this.overview.history([at], warning.sinceTick, tick, overviewIntervals);
    const below = warning.level.startsWith('below') || warning.level.endsWith('low');
    const peak = below
      ? least.reduce((a, b) => Math.min(a, b), warning.peak)
      : most.reduce((a, b) => Math.max(a, b), warning.peak);
    return { ...warning, peak };
  }

  async close(): Promise<void> {
    this.recording.close();
  }
}

/** Columns into rows, the given ones only; nothing after `last`. */
function feed(into: Decimator, block: RowsBlock, columns: readonly number[], last = Number.POSITIVE_INFINITY): void {
  const { count, data, ticks } = block;
  const rows = new Float32Array(count * columns.length);
  let taken = 0;
  for (let row = 0; row < count && ticks[row]! <= last; row += 1) {
    for (let c = 0; c < columns.length; c += 1) rows[row * columns.length + c] = data[columns[c]! * count + row]!;
    taken += 1;
  }
  into.rows(ticks, rows, taken);
}
