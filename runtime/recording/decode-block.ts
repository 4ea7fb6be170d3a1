import { type RecordingBlock, RecordingError } from './format.js';
import type { Packed } from './unpack.js';

type Fields = { readonly [key: string]: Packed };

/** A block's typed contents from its unpacked fields. Throws `RecordingError` on what does not fit together. */
export function decodeBlock(fields: Fields, signals: number): RecordingBlock {
  const kind = fields['k'];
  switch (kind) {
    case 'rows': {
      const hashes = new Int32Array(copy(fields, 'hashes', 8));
      const count = hashes.length / 2;
      const data = new Float32Array(copy(fields, 'data', 4));
      if (data.length !== count * signals)
        throw new RecordingError(`rows of ${data.length} numbers for ${count} ticks of ${signals} signals`);
      return { kind, count, ticks: ticksOf(fields, count), hashes, data };
    }
    case 'inputs': {
      const lengths = new Uint32Array(copy(fields, 'lengths', 4));
      const count = lengths.length;
      const links = new Uint16Array(copy(fields, 'links', 2));
      const bytes = binary(fields, 'bytes');
      const offsets = new Uint32Array(count + 1);
      let sum = 0;
      for (let i = 0; i < count; i += 1) {
        sum += lengths[i]!;
        if (sum > bytes.length) break;
        offsets[i + 1] = sum;
      }
      if (sum !== bytes.length || links.length !== count)
        throw new RecordingError('inputs whose lengths do not add up');
      return { kind, count, ticks: ticksOf(fields, count), links, offsets, bytes };
    }
    case 'events': {
      const codes = new Int32Array(copy(fields, 'codes', 4));
      const count = codes.length;
      const subjects = new Int32Array(copy(fields, 'subjects', 4));
      const values = new Float64Array(copy(fields, 'values', 8));
      if (subjects.length !== count || values.length !== 3 * count)
        throw new RecordingError('events whose parts differ in number');
      return { kind, count, ticks: ticksOf(fields, count), codes, subjects, values };
    }
    case 'snapshot':
      return { kind, tick: number(fields, 'tick'), block: new Float64Array(copy(fields, 'block', 8)) };
    case 'stamp':
      return { kind, tick: number(fields, 'tick'), wall: number(fields, 'wall') };
    case 'end': {
      const summary = fields['summary'];
      if (summary === null || typeof summary !== 'object' || Array.isArray(summary) || summary instanceof Uint8Array) {
        throw new RecordingError('an end without a summary');
      }
      return {
        kind,
        rows: number(fields, 'rows'),
        inputs: number(fields, 'inputs'),
        events: number(fields, 'events'),
        dropped: number(fields, 'dropped'),
        overflows: number(fields, 'overflows'),
        summary,
      };
    }
    default:
      throw new RecordingError(`unknown kind of block ${JSON.stringify(kind)}`);
  }
}

/** Either all ticks, or the first one of ticks that follow one another. */
function ticksOf(fields: Fields, count: number): Float64Array {
  const ticks = new Float64Array(count);
  if (fields['first'] !== undefined) {
    const first = number(fields, 'first');
    for (let i = 0; i < count; i += 1) ticks[i] = first + i;
  } else {
    ticks.set(new Float64Array(copy(fields, 'ticks', 8)).subarray(0, count));
    if (binary(fields, 'ticks').length !== 8 * count) throw new RecordingError('ticks that do not match their number');
  }
  for (let i = 0; i < count; i += 1) {
    if (!Number.isSafeInteger(ticks[i]!) || (i > 0 && ticks[i]! < ticks[i - 1]!))
      throw new RecordingError(`tick ${ticks[i]} out of order`);
  }
  return ticks;
}

function binary(fields: Fields, name: string): Uint8Array {
  const value = fields[name];
  if (!(value instanceof Uint8Array)) throw new RecordingError(`field ${name} is missing or not binary`);
  return value;
}

/** A copy that starts at a multiple of 8, for typed views. */
function copy(fields: Fields, name: string, unit: number): ArrayBuffer {
  const bytes = binary(fields, name);
  if (bytes.length % unit !== 0)
    throw new RecordingError(`field ${name} of ${bytes.length} bytes is not a multiple of ${unit}`);
  return new Uint8Array(bytes).buffer;
}

function number(fields: Fields, name: string): number {
  const value = fields[name];
  if (typeof value !== 'number') throw new RecordingError(`field ${name} is missing or not a number`);
  return value;
}
