import { readdir, stat } from 'node:fs/promises';
import { join, resolve } from 'node:path';
import { setImmediate } from 'node:timers/promises';
import { Decimator } from '../../bridge/live/decimate.js';
import type {
  EventNames,
  History,
  LiveEvent,
  LiveStatus,
  RecordingEntry,
  RecordingShelf,
  RecordingView,
  RequirementStatus,
  WarningStatus,
} from '../../bridge/live/source.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import type { SignalInfo } from '../../runtime/contract.js';
import { handEventNames, isHandAct, quietHandEvents } from '../../runtime/hand-events.js';
import { HAND, readHand } from '../../runtime/hand-wire.js';
import type { Requirement } from '../../runtime/judge/formula.js';
import type { EndBlock, InputsBlock, RowsBlock } from '../../runtime/recording/format.js';
import { RecordingError } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { emptyScript, type ScriptSpec } from '../../runtime/script.js';
import { benchFacts } from './bench-facts.js';
import { judgedPaths, judgedStatus, requirementFacts } from './judged.js';
import { warningsAt } from './recorded-warnings.js';

/** Intervals of the overview that is held of an open recording. */
const overviewIntervals = 4000;
/** Blocks that are read before others get their turn. */
const blocksAtOnce = 8;

/**
 * The recordings in a folder. A file that is none, or not readable, is left out. `writing`: the file that this process is
 * still writing, which has no end yet and is not cut off for that.
 */
export function recordingShelf(
  folder: string,
  { ending = '.osrec', writing }: { readonly ending?: string; readonly writing?: string | undefined } = {},
): RecordingShelf {
  const current = writing === undefined ? undefined : resolve(writing);
  return {
    async list() {
      const names = await readdir(folder).catch(() => [] as string[]);
      const entries: RecordingEntry[] = [];
      for (const name of names.filter((candidate) => candidate.endsWith(ending)).sort()) {
        const file = join(folder, name);
        const entry = await describe(file, name, resolve(file) === current).catch(() => undefined);
        if (entry !== undefined) entries.push(entry);
      }
      return entries.sort((a, b) => b.startedAt - a.startedAt);
    },
    open: (name) => RecordedRun.open(join(folder, name)),
  };
}

async function describe(file: string, name: string, goesOn: boolean): Promise<RecordingEntry> {
  const facts = await stat(file);
  const recording = new Recording(file);
  try {
    const { header } = recording;
    const script = scriptOf(recording);
    const startedAt = Date.parse(header.created);
    const summary = recording.endBlock()?.summary;
    return {
      name,
      bench: header.bench.name,
      scenario: script.name,
      startedAt,
      length:
        typeof summary?.['simulated'] === 'number'
          ? summary['simulated']
          : Math.max(0, (facts.mtimeMs - startedAt) / 1000),
      verdict:
        summary !== undefined ? String(summary['verdict'] ?? '') : goesOn ? 'still running' : 'not valid: cut off',
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
  readonly events: EventNames & { readonly subjects: string[] };
  firstTick = 0;
  lastTick = 0;
  private overview: Decimator;
  private readonly found: LiveEvent[] = [];
  private readonly stamps: { tick: number; wall: number }[] = [];
  /** Where each block of rows stands, to read it again. */
  private readonly index: { at: number; number: number; first: number; last: number }[] = [];
  private readonly spec;
  private readonly script: ScriptSpec;
  private readonly asked: readonly Requirement[];
  /** Number of the link that carries hands. */
  private readonly handLink: number;
  /** What was written with notes, by request, and ticks of hands that acted. */
  private readonly notes = new Map<number, string>();
  private readonly handTicks: number[] = [];
  private end: EndBlock | undefined;

  private constructor(private readonly recording: Recording) {
    const { header } = recording;
    const texts = Object.fromEntries(header.bench.files.map((one) => [one.path, one.text]));
    this.spec = readBench(header.bench.files[0]!.path, catalogue, memoryFiles(texts));
    this.script = scriptOf(recording);
    this.signals = header.signals as readonly SignalInfo[];
    this.events = { kinds: header.events.kinds, subjects: [...header.events.subjects] };
    this.handLink = this.spec.map.links.length;
    this.asked = [...this.spec.requirements, ...(this.script.requirements ?? [])];
    this.bench = benchFacts({
      spec: this.spec,
      script: this.script,
      recorded: this.signals,
      requirements: requirementFacts(this.asked, this.signals),
    });
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
    const { rows, firstTick, lastTick } = await this.extent();
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
          this.takeEvent({
            tick: block.ticks[i]!,
            kind: block.codes[i]!,
            subject: block.subjects[i]!,
            a: a!,
            b: b!,
            c: c!,
          });
        }
      } else if (block.kind === 'inputs') {
        this.takeHands(block);
      } else if (block.kind === 'stamp') this.stamps.push({ tick: block.tick, wall: block.wall });
      else if (block.kind === 'end') this.end = block;
      at = this.recording.position;
      if ((read += 1) % blocksAtOnce === 0) await setImmediate();
    }
  }

  /** Rows, first and last tick; others get their turn in between, as a run that goes on may need this thread. */
  private async extent(): Promise<{ rows: number; firstTick: number; lastTick: number }> {
    let rows = 0;
    let firstTick = Number.NaN;
    let lastTick = Number.NaN;
    let read = 0;
    for (const block of this.recording.blocks()) {
      if (block.kind === 'rows' && block.count > 0) {
        if (rows === 0) firstTick = block.ticks[0]!;
        rows += block.count;
        lastTick = block.ticks[block.count - 1]!;
      }
      if ((read += 1) % blocksAtOnce === 0) await setImmediate();
    }
    return { rows, firstTick, lastTick };
  }

  private takeEvent(event: LiveEvent): void {
    const name = this.events.kinds[event.kind]?.name ?? '';
    if (isHandAct(name)) this.handTicks.push(event.tick);
    if (quietHandEvents.includes(name)) return;
    const note = name === handEventNames.notes ? this.notes.get(event.c) : undefined;
    if (note === undefined) this.found.push(event);
    else this.found.push({ ...event, subject: this.events.subjects.push(note) - 1 });
  }

  /** Inputs stand ahead of the events of their ticks. */
  private takeHands(block: InputsBlock): void {
    for (let i = 0; i < block.count; i += 1) {
      if (block.links[i] !== this.handLink) continue;
      const hand = readHand(block.bytes.subarray(block.offsets[i], block.offsets[i + 1]));
      if (hand?.kind === HAND.note) this.notes.set(hand.request, `${hand.text.said} (${hand.text.who})`);
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
        hands: this.handTicks.filter((at) => at <= tick).length,
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
      requirements: await this.judgedAt(tick),
    };
  }

  private async judgedAt(tick: number): Promise<RequirementStatus[]> {
    const signals = this.asked.flatMap(judgedPaths).map((path) => this.signals.findIndex((info) => info.path === path));
    const known = signals.filter((at) => at >= 0);
    if (known.length === 0) return [];
    const { most, ticks } = await this.history(known, tick, tick, 1);
    const value = (at: number | undefined) =>
      at === undefined || at < 0 ? undefined : most[known.indexOf(at) * ticks.length];
    return this.asked.map((_, i) => judgedStatus(value(signals[2 * i]), value(signals[2 * i + 1]), tick));
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
