import type { RowsBlock } from '../../runtime/recording/format.js';
import type { Recording } from '../../runtime/recording/reader.js';

/** A signal that is not the same in two recordings. */
export interface SignalDifference {
  readonly path: string;
  readonly unit: string;
  /** Largest difference, SI, and its tick. */
  readonly most: number;
  readonly at: number;
  /** The same as a share of the signal's span in the first recording. */
  readonly share: number;
  /** First tick at which it is beyond the tolerance. */
  readonly first: number;
}

export interface RecordingComparison {
  /** Ticks of which both have a row. */
  readonly compared: number;
  /** First tick after which the whole states differ; undefined when they never do or the benches are not laid out alike. */
  readonly firstState: number | undefined;
  readonly sameLayout: boolean;
  /** Beyond the tolerance, the one that left first at the top. */
  readonly signals: readonly SignalDifference[];
  /** Signals that only one of them has. */
  readonly onlyBefore: readonly string[];
  readonly onlyAfter: readonly string[];
}

/**
 * Compares the rows of two recordings tick by tick. `tolerance`: share of a signal's span; a signal that does not move in the
 * first recording has its size as span, or 1.
 */
export function compareRecordings(
  before: Recording,
  after: Recording,
  tolerance: number,
  onProgress?: (share: number) => boolean,
): RecordingComparison {
  const names = after.header.signals.map((one) => one.path);
  const pairs = before.header.signals.flatMap(({ path, unit }, a) => {
    const b = names.indexOf(path);
    return b < 0 || path.startsWith('timing.') ? [] : [{ path, unit, a, b }];
  });
  const span = spans(before);
  const bound = pairs.map(({ a }) => tolerance * span[a]!);
  const most = new Float64Array(pairs.length);
  const at = new Float64Array(pairs.length).fill(-1);
  const first = new Float64Array(pairs.length).fill(-1);
  const sameLayout = before.header.block.join('\n') === after.header.block.join('\n');
  let firstState: number | undefined;
  let compared = 0;
  const right = rows(after);
  let other = right.next();
  for (const { block, row, tick } of rows(before)) {
    while (!other.done && other.value.tick < tick) other = right.next();
    if (other.done) break;
    if (other.value.tick !== tick) continue;
    const there = other.value;
    compared += 1;
    const same =
      block.hashes[2 * row] === there.block.hashes[2 * there.row] &&
      block.hashes[2 * row + 1] === there.block.hashes[2 * there.row + 1];
    if (!same && sameLayout) firstState ??= tick;
    if (same && sameLayout) continue;
    for (let i = 0; i < pairs.length; i += 1) {
      const x = block.data[pairs[i]!.a * block.count + row]!;
      const y = there.block.data[pairs[i]!.b * there.block.count + there.row]!;
      if (x === y || (Number.isNaN(x) && Number.isNaN(y))) continue;
      const difference = Math.abs(x - y);
      if (!(difference <= most[i]!)) {
        most[i] = Number.isNaN(difference) ? Number.POSITIVE_INFINITY : difference;
        at[i] = tick;
      }
      if (first[i]! < 0 && !(difference <= bound[i]!)) first[i] = tick;
    }
    if (compared % 4096 === 0 && onProgress?.(before.position / before.bytes) === false) break;
  }
  const signals = pairs
    .flatMap(({ path, unit, a }, i) =>
      first[i]! < 0 ? [] : [{ path, unit, most: most[i]!, at: at[i]!, share: most[i]! / span[a]!, first: first[i]! }],
    )
    .sort((x, y) => x.first - y.first || y.share - x.share);
  const own = before.header.signals.map((one) => one.path);
  return {
    compared,
    firstState,
    sameLayout,
    signals,
    onlyBefore: own.filter((path) => !names.includes(path)),
    onlyAfter: names.filter((path) => !own.includes(path)),
  };
}

function* rows(recording: Recording): Generator<{ block: RowsBlock; row: number; tick: number }> {
  for (const block of recording.blocks()) {
    if (block.kind !== 'rows') continue;
    for (let row = 0; row < block.count; row += 1) yield { block, row, tick: block.ticks[row]! };
  }
}

function spans(recording: Recording): Float64Array {
  const count = recording.header.signals.length;
  const low = new Float64Array(count).fill(Number.POSITIVE_INFINITY);
  const high = new Float64Array(count).fill(Number.NEGATIVE_INFINITY);
  for (const block of recording.blocks()) {
    if (block.kind !== 'rows') continue;
    for (let i = 0; i < count; i += 1) {
      for (let row = 0; row < block.count; row += 1) {
        const value = block.data[i * block.count + row]!;
        if (value < low[i]!) low[i] = value;
        if (value > high[i]! && value !== Number.POSITIVE_INFINITY) high[i] = value;
      }
    }
  }
  return Float64Array.from({ length: count }, (_, i) => {
    const wide = high[i]! - low[i]!;
    if (wide > 0 && Number.isFinite(wide)) return wide;
    return Number.isFinite(high[i]!) && high[i] !== 0 ? Math.abs(high[i]!) : 1;
  });
}
