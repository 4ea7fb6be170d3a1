import fs from 'node:fs';
import { setImmediate } from 'node:timers/promises';
import { RecordingError } from '../../runtime/recording/format.js';
import { type Ending, Recording } from '../../runtime/recording/reader.js';
import { emptyScript, type ScriptSpec } from '../../runtime/script.js';
import { eventText } from '../terminal/event-text.js';

/** What a recording without its end still holds. */
export interface Remains {
  readonly file: string;
  readonly bytes: number;
  readonly ending: Ending;
  /** Bytes behind the last whole block, of which nothing can be read. */
  readonly unreadable: number;
  readonly bench: string;
  readonly scenario: string;
  readonly pace: 'live' | 'fast';
  readonly seed: number;
  readonly software: string;
  /** Wall-clock time at the start, ISO 8601, and of the last sign of the run, ms since 1970. */
  readonly created: string;
  readonly lastSeen: number | undefined;
  /** Tick length, s. */
  readonly step: number;
  /** Counted ticks up to the last row, and as many as were planned; NaN: unknown. */
  readonly ticks: number;
  readonly planned: number;
  /** Ticks between the first and the last row that have no row. */
  readonly gaps: number;
  readonly rows: number;
  readonly inputs: number;
  readonly events: number;
  readonly snapshots: number;
  /** The last events, in words; time in s. */
  readonly lastEvents: readonly { readonly time: number; readonly severity: string; readonly text: string }[];
}

const mostEvents = 5;
const blocksAtOnce = 64;

/**
 * Reads a recording to its last whole block and says what is in it. Throws RecordingError when it is none or its header
 * is not whole; resolves with undefined when `onProgress` says false.
 */
export async function lookInto(file: string, onProgress: (share: number) => boolean): Promise<Remains | undefined> {
  const recording = new Recording(file);
  try {
    const { header } = recording;
    const kinds = header.events.kinds;
    let rows = 0;
    let firstTick = Number.NaN;
    let lastTick = Number.NaN;
    let inputs = 0;
    let events = 0;
    let snapshots = 0;
    let stamp: { tick: number; wall: number } | undefined;
    const last: Remains['lastEvents'][number][] = [];
    const walk = recording.blocks();
    let ending: Ending;
    for (let read = 1; ; read += 1) {
      const step = walk.next();
      if (step.done) {
        ending = step.value;
        break;
      }
      const block = step.value;
      if (block.kind === 'rows' && block.count > 0) {
        if (rows === 0) firstTick = block.ticks[0]!;
        rows += block.count;
        lastTick = block.ticks[block.count - 1]!;
      } else if (block.kind === 'inputs') inputs += block.count;
      else if (block.kind === 'snapshot') snapshots += 1;
      else if (block.kind === 'stamp') stamp = { tick: block.tick, wall: block.wall };
      else if (block.kind === 'events') {
        events += block.count;
        for (let i = Math.max(0, block.count - mostEvents); i < block.count; i += 1) {
          const kind = kinds[block.codes[i]!];
          const [a, b, c] = block.values.subarray(3 * i, 3 * i + 3);
          const subject = header.events.subjects[block.subjects[i]!] ?? '?';
          last.push({
            time: block.ticks[i]! * header.step,
            severity: kind?.severity ?? 'note',
            text: kind ? eventText(kind, subject, a!, b!, c!) : `event ${block.codes[i]}`,
          });
        }
        last.splice(0, Math.max(0, last.length - mostEvents));
      }
      if (read % blocksAtOnce === 0) {
        await setImmediate();
        if (!onProgress(recording.position / recording.bytes)) return undefined;
      }
    }
    const ticks = header.options['ticks'];
    return {
      file,
      bytes: recording.bytes,
      ending,
      unreadable: recording.bytes - ending.atByte,
      bench: header.bench.name,
      scenario: scriptOf(header.options['script']).name,
      pace: header.pace,
      seed: header.seed,
      software: `oilspring ${header.software.version}, Node ${header.software.node}`,
      created: header.created,
      lastSeen:
        stamp === undefined || header.pace === 'fast'
          ? stamp?.wall
          : stamp.wall + (lastTick - stamp.tick) * header.step * 1000,
      step: header.step,
      ticks: rows === 0 ? 0 : Math.max(0, lastTick + 1),
      planned: typeof ticks === 'number' ? ticks : Number.NaN,
      gaps: rows === 0 ? 0 : lastTick - firstTick + 1 - rows,
      rows,
      inputs,
      events,
      snapshots,
      lastEvents: last,
    };
  } finally {
    recording.close();
  }
}

/** Copies the whole blocks of a recording into a new file, which then ended early and is not damaged. */
export function copyWhole(remains: Remains, to: string): void {
  const from = fs.openSync(remains.file, 'r');
  try {
    let into: number;
    try {
      into = fs.openSync(to, 'wx', 0o644);
    } catch (error) {
      const { code } = error as NodeJS.ErrnoException;
      throw new RecordingError(
        `${to} cannot be created: ${code}${code === 'EEXIST' ? '; it exists already: choose another name' : ''}`,
      );
    }
    try {
      const chunk = Buffer.allocUnsafe(1 << 20);
      for (let at = 0; at < remains.ending.atByte; ) {
        const count = fs.readSync(from, chunk, 0, Math.min(chunk.length, remains.ending.atByte - at), at);
        if (count === 0) throw new RecordingError(`${remains.file} became shorter while it was read`);
        fs.writeSync(into, chunk, 0, count);
        at += count;
      }
      fs.fsyncSync(into);
    } catch (error) {
      fs.rmSync(to, { force: true });
      throw error;
    } finally {
      fs.closeSync(into);
    }
  } finally {
    fs.closeSync(from);
  }
}

function scriptOf(said: unknown): { readonly name: string } {
  try {
    const script = JSON.parse(String(said)) as ScriptSpec | null;
    return typeof script?.name === 'string' ? script : emptyScript;
  } catch {
    return emptyScript;
  }
}
