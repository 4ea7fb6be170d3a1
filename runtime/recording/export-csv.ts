import fs from 'node:fs';
import { nearest } from '../signals.js';
import { RecordingError } from './format.js';
import type { Ending, Recording } from './reader.js';

export interface ExportOptions {
  /** Paths in the order of the columns. Default: all recorded ones. */
  readonly signals?: readonly string[];
  /** Every so many ticks. Default 1. */
  readonly everyTicks?: number;
  readonly to: string;
  /** Called now and then with the share of the file that was read, 0..1. */
  readonly onProgress?: (share: number) => void;
  readonly abort?: AbortSignal;
}

export interface ExportResult {
  readonly rows: number;
  readonly columns: number;
  readonly ending: Ending;
}

/**
 * Writes recorded signals as CSV (RFC 4180 with line feeds): a heading `time (s),path (unit),...`, then one line a tick,
 * each value as short as its 32 bits allow. Throws `RecordingError` for unknown signals, a damaged file, and a target
 * that cannot be written; a partial target is removed when it fails or is aborted.
 */
export async function exportCsv(recording: Recording, options: ExportOptions): Promise<ExportResult> {
  const { signals, step } = recording.header;
  const columns = (options.signals ?? signals.map((signal) => signal.path)).map((path) => {
    const found = signals.findIndex((signal) => signal.path === path);
    if (found < 0) {
      const near = nearest(
        path,
        signals.map((signal) => signal.path),
        3,
      );
      throw new RecordingError(
        `signal ${path} was not recorded${near.length > 0 ? `; nearest: ${near.join(', ')}` : ''}`,
      );
    }
    return found;
  });
  const every = options.everyTicks ?? 1;
  if (!Number.isInteger(every) || every < 1)
    throw new RecordingError(`every ${every} ticks: a whole number of at least 1`);

  let target: fs.promises.FileHandle;
  try {
    target = await fs.promises.open(options.to, 'w');
  } catch (error) {
    throw new RecordingError(`${options.to} cannot be written: ${(error as NodeJS.ErrnoException).code}`);
  }
  try {
    await target.write(
      `${['time (s)', ...columns.map((c) => quoted(`${signals[c]!.path} (${signals[c]!.unit})`))].join(',')}\n`,
    );
    let rows = 0;
    const walk = recording.blocks();
    for (let next = walk.next(); ; next = walk.next()) {
      if (options.abort?.aborted) throw new RecordingError('export stopped');
      if (next.done) {
        if (next.value.how === 'damaged')
          throw new RecordingError(
            `${recording.file} is damaged: ${next.value.what}; \`oilspring salvage\` copies what stands before`,
          );
        await target.close();
        return { rows, columns: columns.length, ending: next.value };
      }
      const block = next.value;
      if (block.kind !== 'rows') continue;
      const lines: string[] = [];
      for (let row = 0; row < block.count; row += 1) {
        const tick = block.ticks[row]!;
        if (tick % every !== 0) continue;
        let line = timeText(tick, step);
        for (const c of columns) line += `,${shortest(block.data[c * block.count + row]!)}`;
        lines.push(line);
      }
      rows += lines.length;
      if (lines.length > 0) await target.write(`${lines.join('\n')}\n`);
      options.onProgress?.(recording.position / recording.bytes);
    }
  } catch (error) {
    await target.close().catch(() => {});
    await fs.promises.rm(options.to, { force: true });
    const code = (error as NodeJS.ErrnoException).code;
    throw code === undefined ? error : new RecordingError(`${options.to} cannot be written: ${code}`);
  }
}

/** tick * step without the digits that floating point adds. */
function timeText(tick: number, step: number): string {
  return String(Number((tick * step).toPrecision(14)));
}

/** The shortest decimal text that reads back as the same 32-bit number. */
export function shortest(value: number): string {
  if (Number.isInteger(value) && Math.abs(value) < 1e7) return Object.is(value, -0) ? '-0' : String(value);
  for (let digits = 6; digits < 9; digits += 1) {
    const text = Number(value.toPrecision(digits));
    if (Math.fround(text) === value) return String(text);
  }
  return String(Number.isFinite(value) ? Number(value.toPrecision(9)) : value);
}

function quoted(text: string): string {
  return /[",\n\r]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}
