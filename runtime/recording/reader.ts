import fs from 'node:fs';
import { crc32 } from './crc32.js';
import { decodeBlock } from './decode-block.js';
import {
  type EndBlock,
  FRAME,
  headerSchema,
  LARGEST_BLOCK,
  MAGIC,
  type RecordingBlock,
  RecordingError,
  type RecordingHeader,
} from './format.js';
import { type Packed, unpack } from './unpack.js';

/**
 * How a recording ends:
 * - `complete`: with its end block, and nothing behind it;
 * - `ended early`: with its last whole block; a torn one may follow;
 * - `damaged`: a block before the end does not check, so what stands behind it cannot be relied upon.
 */
export interface Ending {
  readonly how: 'complete' | 'ended early' | 'damaged';
  /** Where the last good block ends. */
  readonly atByte: number;
  /** In words, with what is wrong where. */
  readonly what: string;
  readonly end?: EndBlock;
}

/** Tries to find a good block behind a bad one. */
const MOST_TRIES = 64;

export interface RecordingOverview {
  readonly ending: Ending;
  readonly blocks: number;
  readonly rows: number;
  readonly inputs: number;
  readonly events: number;
  readonly snapshots: number;
  /** Of the rows; NaN when there are none. Ticks of the pre-roll are negative. */
  readonly firstTick: number;
  readonly lastTick: number;
  /** Pairs of tick and wall clock, ms since 1970. */
  readonly stamps: readonly { readonly tick: number; readonly wall: number }[];
}

/**
 * A recording on disk, read block by block: nothing is held but the block at hand. Everything in the file is taken for
 * the work of a stranger until its checksum, its numbers and its types have been seen to fit.
 */
export class Recording {
  readonly header: RecordingHeader;
  readonly bytes: number;
  /** Byte up to which the blocks were last read, for progress. */
  position = 0;
  private readonly descriptor: number;
  private readonly firstBlock: number;

  /** Opens and reads the header. Throws `RecordingError` when it is none or its header is not whole. */
  constructor(readonly file: string) {
    try {
      this.descriptor = fs.openSync(file, 'r');
    } catch (error) {
      const code = (error as NodeJS.ErrnoException).code;
      throw new RecordingError(
        `recording ${file} cannot be opened: ${code}${code === 'ENOENT' ? ', there is no such file' : ''}`,
      );
    }
    try {
      const stat = fs.fstatSync(this.descriptor);
      if (!stat.isFile()) throw new RecordingError(`${file} is not a file`);
      this.bytes = stat.size;
      const magic = this.readAt(0, Math.min(MAGIC.length, this.bytes));
      if (magic.length < MAGIC.length || !MAGIC.subarray(0, 7).every((byte, i) => magic[i] === byte)) {
        throw new RecordingError(`${file} is not a recording of oilspring`);
      }
      if (magic[7] !== MAGIC[7])
        throw new RecordingError(`${file} has format ${magic[7]}; this version reads format ${MAGIC[7]}`);
      const found = this.blockAt(MAGIC.length, 0);
      if (typeof found === 'string')
        throw new RecordingError(`${file}: the header is not whole (${found}); nothing in it can be read`);
      const { k, n: _, ...fields } = found.fields;
      if (k !== 'header')
        throw new RecordingError(`${file}: begins with a block ${JSON.stringify(k)} instead of its header`);
      const parsed = headerSchema.safeParse(fields);
      if (!parsed.success) {
        const issue = parsed.error.issues[0]!;
        throw new RecordingError(`${file}: header field ${issue.path.join('.')}: ${issue.message}`);
      }
      this.header = parsed.data;
      this.firstBlock = found.next;
    } catch (error) {
      fs.closeSync(this.descriptor);
      throw error;
    }
  }

  /** The blocks behind the header, up to the last good one; returns how the file ends. */
  *blocks(): Generator<RecordingBlock, Ending> {
    let at = this.firstBlock;
    let number = 1;
    while (at < this.bytes) {
      const found = this.blockAt(at, number);
      if (typeof found === 'string') return this.broken(at, number, found);
      let block: RecordingBlock;
      try {
        block = decodeBlock(found.fields, this.header.signals.length);
      } catch (error) {
        if (!(error instanceof RecordingError)) throw error;
        return { how: 'damaged', atByte: at, what: `block ${number} at byte ${at}: ${error.message}` };
      }
      this.position = found.next;
      yield block;
      at = found.next;
      number += 1;
      if (block.kind === 'end') {
        if (at === this.bytes) return { how: 'complete', atByte: at, what: 'complete', end: block };
        return {
          how: 'damaged',
          atByte: at,
          what: `${this.bytes - at} bytes behind the end, at byte ${at}`,
          end: block,
        };
      }
    }
    return { how: 'ended early', atByte: at, what: `no end block: the run was cut off after block ${number - 1}` };
  }

  /**
   * Reads one block again: `at` is its first byte (`position` before it was read), `number` its place among all blocks,
   * the header being 0. Throws RecordingError when there is none.
   */
  again(at: number, number: number): RecordingBlock {
    const found = this.blockAt(at, number);
    if (typeof found === 'string') throw new RecordingError(`${this.file}: block ${number} at byte ${at}: ${found}`);
    return decodeBlock(found.fields, this.header.signals.length);
  }

  /** Where the blocks behind the header begin. */
  get afterHeader(): number {
    return this.firstBlock;
  }

  /** Reads through the whole file and says what is in it. */
  examine(): RecordingOverview {
    const stamps: { tick: number; wall: number }[] = [];
    let blocks = 1;
    let rows = 0;
    let inputs = 0;
    let events = 0;
    let snapshots = 0;
    let firstTick = Number.NaN;
    let lastTick = Number.NaN;
    const walk = this.blocks();
    for (let step = walk.next(); ; step = walk.next()) {
      if (step.done)
        return { ending: step.value, blocks, rows, inputs, events, snapshots, firstTick, lastTick, stamps };
      const block = step.value;
      blocks += 1;
      if (block.kind === 'rows' && block.count > 0) {
        if (rows === 0) firstTick = block.ticks[0]!;
        rows += block.count;
        lastTick = block.ticks[block.count - 1]!;
      } else if (block.kind === 'inputs') inputs += block.count;
      else if (block.kind === 'events') events += block.count;
      else if (block.kind === 'snapshot') snapshots += 1;
      else if (block.kind === 'stamp') stamps.push({ tick: block.tick, wall: block.wall });
    }
  }

  /**
   * The end block, found by hopping from block to block without reading what is in them; undefined when there is none at
   * the end of the file. Only the end block is checked: `examine` checks everything.
   */
  endBlock(): EndBlock | undefined {
    let at = this.firstBlock;
    for (let number = 1; this.bytes - at >= FRAME; number += 1) {
      const length = this.readAt(at, FRAME).readUInt32LE(0);
      const next = at + FRAME + length;
      if (length === 0 || length > LARGEST_BLOCK || next > this.bytes) return undefined;
      if (next === this.bytes) {
        const found = this.blockAt(at, number);
        if (typeof found === 'string' || found.fields['k'] !== 'end') return undefined;
        const block = decodeBlock(found.fields, this.header.signals.length);
        return block.kind === 'end' ? block : undefined;
      }
      at = next;
    }
    return undefined;
  }

  close(): void {
    fs.closeSync(this.descriptor);
  }

  /** The unpacked block at a byte, or why there is none. */
  private blockAt(at: number, number: number): { fields: { [key: string]: Packed }; next: number } | string {
    const left = this.bytes - at;
    if (left < FRAME) return `${left} bytes of a torn block`;
    const frame = this.readAt(at, FRAME);
    const view = new DataView(frame.buffer, frame.byteOffset, FRAME);
    const length = view.getUint32(0, true);
    if (length === 0 || length > LARGEST_BLOCK) return `a length of ${length} bytes is no block's`;
    if (length > left - FRAME) return `a block of ${length} bytes of which ${left - FRAME} are there`;
    const payload = this.readAt(at + FRAME, length);
    if (crc32(payload, crc32(frame.subarray(0, 4))) !== view.getUint32(4, true)) return 'the checksum does not fit';
    try {
      const fields = unpack(payload);
      if (fields === null || typeof fields !== 'object' || Array.isArray(fields) || fields instanceof Uint8Array)
        return 'the contents are not a map';
      if (fields['n'] !== number) return `its number is ${JSON.stringify(fields['n'])} and not ${number}`;
      return { fields, next: at + FRAME + length };
    } catch (error) {
      return `the contents are not well formed: ${(error as Error).message}`;
    }
  }

  /** A torn tail is the trace of a power cut or kill; a good block behind a bad one, or a bad whole one, is damage. */
  private broken(at: number, number: number, what: string): Ending {
    const where = `block ${number} at byte ${at}: ${what}`;
    const later = this.laterBlock(at + 1);
    if (later >= 0) return { how: 'damaged', atByte: at, what: `${where}; a good block follows at byte ${later}` };
    return { how: 'ended early', atByte: at, what: `${where}; the run was cut off here` };
  }

  /** Byte of the next good block at or behind `from`, or -1. Looks for the first bytes of a payload, then checks. */
  private laterBlock(from: number): number {
    const window = 4 << 20;
    // A file made to waste time offers many false beginnings.
    let patience = MOST_TRIES;
    for (let start = from; start < this.bytes; start += window) {
      const bytes = this.readAt(start, Math.min(window + FRAME + 16, this.bytes - start));
      // A map with `n` first: one byte of map, then the one-letter text.
      for (let i = bytes.indexOf('\xa1n', 0, 'latin1'); i >= 0; i = bytes.indexOf('\xa1n', i + 1, 'latin1')) {
        const block = start + i - 1 - FRAME;
        if (block < from || (bytes[i - 1]! & 0xf0) !== 0x80) continue;
        if (this.checks(block)) return block;
        if ((patience -= 1) === 0) return -1;
      }
    }
    return -1;
  }

  private checks(at: number): boolean {
    if (this.bytes - at < FRAME) return false;
    const frame = this.readAt(at, FRAME);
    const length = frame.readUInt32LE(0);
    if (length === 0 || length > LARGEST_BLOCK || length > this.bytes - at - FRAME) return false;
    return crc32(this.readAt(at + FRAME, length), crc32(frame.subarray(0, 4))) === frame.readUInt32LE(4);
  }

  private readAt(position: number, length: number): Buffer {
    const into = Buffer.allocUnsafe(length);
    let done = 0;
    while (done < length) {
      const count = fs.readSync(this.descriptor, into, done, length - done, position + done);
      if (count === 0) throw new RecordingError(`${this.file} became shorter while it was read`);
      done += count;
    }
    return into;
  }
}
