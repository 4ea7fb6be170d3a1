import { z } from 'zod';

/**
 * The recording, a file of append-only blocks. It begins with eight bytes, `OSPRING` and the version of the format; then
 * block after block:
 *
 *     length   u32, little endian: bytes of the payload
 *     checksum u32, little endian: CRC-32 (IEEE 802.3) over the four bytes of the length and the payload
 *     payload  one MessagePack map; `n` is the block's number from 0 on, `k` its kind
 *
 * Numbers by the thousand stand in binary fields, little endian. The first block is the header, the last one the end; a
 * file without an end ended early and holds up to its last whole block. A block of rows never precedes the inputs of its
 * ticks, so that whatever rows can be read can be derived again.
 */
export const MAGIC = Uint8Array.from([...'OSPRING'].map((letter) => letter.charCodeAt(0)).concat(1));
export const FORMAT = 1;
/** Length and checksum. */
export const FRAME = 8;
/** A block that says it is longer is not one. */
export const LARGEST_BLOCK = 64 << 20;

const signalSchema = z.object({
  // Begins with a letter: a spreadsheet takes a heading that begins with = or + for a formula.
  path: z
    .string()
    .max(500)
    .regex(/^[\p{L}_][^\p{C}\s,"=]*$/u),
  unit: z.string().max(50),
  about: z.string().max(2000),
  group: z.string().max(50),
});

const fileSchema = z.object({ path: z.string(), text: z.string() });

export const headerSchema = z.object({
  format: z.literal(FORMAT),
  /** A name for the run that no other has. */
  run: z.string().min(1),
  /** Wall-clock time at the start, ISO 8601. */
  created: z.string(),
  software: z.object({ version: z.string(), node: z.string(), v8: z.string() }),
  /** Facts about the computer: processor, kernel, scheduling, what was refused. */
  machine: z.record(z.string(), z.union([z.string(), z.number(), z.boolean()])),
  /** The bench file and all that it includes, the bench file first. */
  bench: z.object({ name: z.string(), files: z.array(fileSchema) }),
  scenario: fileSchema.nullable(),
  seed: z.number(),
  /** Length of a tick, s. */
  step: z.number().positive(),
  pace: z.enum(['live', 'fast']),
  /** What else the run depends on: command line options, controller. */
  options: z.record(z.string(), z.union([z.string(), z.number(), z.boolean(), z.null()])),
  /** Columns of the rows. */
  signals: z.array(signalSchema).max(100_000),
  events: z.object({
    kinds: z.array(
      z.object({ name: z.string(), severity: z.enum(['note', 'warning', 'alarm', 'error']), text: z.string() }),
    ),
    subjects: z.array(z.string()),
  }),
  /** Names of the links that inputs come from, by number. */
  links: z.array(z.string()),
  /** Names of the block's slots, to say which one differs. */
  block: z.array(z.string()),
});
export type RecordingHeader = z.infer<typeof headerSchema>;

/** Rows in a row; column c of row r is data[c * count + r]. */
export interface RowsBlock {
  readonly kind: 'rows';
  readonly count: number;
  readonly ticks: Float64Array;
  /** Hash of the block after the tick, two words a row. */
  readonly hashes: Int32Array;
  readonly data: Float32Array;
}

/** Datagrams and frames as taken; datagram i is bytes[offsets[i] .. offsets[i + 1]). */
export interface InputsBlock {
  readonly kind: 'inputs';
  readonly count: number;
  readonly ticks: Float64Array;
  readonly links: Uint16Array;
  readonly offsets: Uint32Array;
  readonly bytes: Uint8Array;
}

/** Coded events; values are a, b, c of each. */
export interface EventsBlock {
  readonly kind: 'events';
  readonly count: number;
  readonly ticks: Float64Array;
  readonly codes: Int32Array;
  readonly subjects: Int32Array;
  readonly values: Float64Array;
}

export interface SnapshotBlock {
  readonly kind: 'snapshot';
  readonly tick: number;
  readonly block: Float64Array;
}

/** A tick paired with the wall clock (ms since 1970) when the host had read it: tens of milliseconds late at most. */
export interface StampBlock {
  readonly kind: 'stamp';
  readonly tick: number;
  readonly wall: number;
}

export interface EndBlock {
  readonly kind: 'end';
  readonly rows: number;
  readonly inputs: number;
  readonly events: number;
  /** Rows lost to a full ring, and records that must not be lost and were. */
  readonly dropped: number;
  readonly overflows: number;
  /** The run's summary as the command prints it. */
  readonly summary: Readonly<Record<string, unknown>>;
}

export type RecordingBlock = RowsBlock | InputsBlock | EventsBlock | SnapshotBlock | StampBlock | EndBlock;

/** Something is wrong with a recording; the message says where and what to do. */
export class RecordingError extends Error {
  override readonly name = 'RecordingError';
}
