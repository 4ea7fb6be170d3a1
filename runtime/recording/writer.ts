import fs from 'node:fs';
import path from 'node:path';
import { Packr } from 'msgpackr';
import { crc32 } from './crc32.js';
import { FRAME, headerSchema, LARGEST_BLOCK, MAGIC, RecordingError, type RecordingHeader } from './format.js';

export interface WriterOptions {
  /** How often what was written is forced to the disk, ms. Default 1000; 0: never before the end. */
  readonly syncEvery?: number;
  /** Replace a file that exists. Default: refuse. */
  readonly replace?: boolean;
}

/**
 * Appends blocks to a recording, on the host thread. Writing is asynchronous, one write at a time: a slow disk makes
 * `backlog` grow and delays nobody.
 *
 * What survives what: a block that was written (at most a fraction of a second after it was added) survives the death of
 * the process, kill -9 included, because the kernel has it. A power cut costs what was written since the last fdatasync,
 * `syncEvery` ago, and a torn block. After an error of the disk nothing more is written and `failure` says why: a run
 * with one is not valid.
 */
export class RecordingWriter {
  /** The first error of the disk. */
  failure: Error | undefined;
  private readonly packr = new Packr({ useRecords: false, variableMapSize: true });
  private readonly syncEvery: number;
  private readonly descriptor: number;
  private queue: Uint8Array[] = [];
  private queued = 0;
  private inFlight = 0;
  private blockNumber = 0;
  private position = 0;
  private lastSync = Date.now();
  private unsynced = false;
  private working: Promise<void> | undefined;
  private closed = false;

  /** Creates the file with its header. Throws `RecordingError` when it cannot. */
  constructor(
    readonly file: string,
    header: RecordingHeader,
    options: WriterOptions = {},
  ) {
    this.syncEvery = options.syncEvery ?? 1000;
    const checked = headerSchema.parse(header);
    try {
      fs.mkdirSync(path.dirname(file), { recursive: true });
      this.descriptor = fs.openSync(file, options.replace ? 'w' : 'wx', 0o644);
    } catch (error) {
      const code = (error as NodeJS.ErrnoException).code;
      throw new RecordingError(
        `recording ${file} cannot be created: ${code}${code === 'EEXIST' ? '; it exists already: choose another name' : ''}`,
      );
    }
    this.enqueue(MAGIC);
    this.add('header', checked);
    this.write();
  }

  /** Bytes added and not yet handed to the kernel. */
  get backlog(): number {
    return this.queued + this.inFlight;
  }

  /** Bytes of the file once everything is written. */
  get length(): number {
    return this.position + this.backlog;
  }

  /** Adds a block. It reaches the file with the next `write`. */
  add(kind: string, fields: Readonly<Record<string, unknown>>): void {
    if (this.closed) throw new RecordingError('the recording is closed');
    const payload = this.packr.pack({ n: this.blockNumber, k: kind, ...fields });
    if (payload.length > LARGEST_BLOCK)
      throw new RecordingError(`a block of ${payload.length} bytes; at most ${LARGEST_BLOCK}`);
    this.blockNumber += 1;
    const frame = new Uint8Array(FRAME);
    const view = new DataView(frame.buffer);
    view.setUint32(0, payload.length, true);
    view.setUint32(4, crc32(payload, crc32(frame.subarray(0, 4))), true);
    this.enqueue(frame);
    this.enqueue(payload);
  }

  /** Starts writing what was added, unless a write is under way already: that one goes on with it. */
  write(): void {
    this.working ??= this.work().finally(() => {
      this.working = undefined;
      if (this.queued > 0 && this.failure === undefined) this.write();
    });
  }

  /** Resolves when everything that was added is written, or has failed. */
  async drained(): Promise<void> {
    while (this.failure === undefined && (this.queued > 0 || this.working !== undefined)) {
      this.write();
      await this.working;
    }
  }

  /** Writes the rest, forces it to the disk and closes. Rejects with the error of the disk if there was one. */
  async close(): Promise<void> {
    if (this.closed) return;
    this.closed = true;
    await this.drained();
    try {
      if (this.failure === undefined) fs.fsyncSync(this.descriptor);
    } catch (error) {
      this.failure = error as Error;
    }
    fs.closeSync(this.descriptor);
    if (this.failure !== undefined) throw this.failureError();
  }

  failureError(): RecordingError {
    const code = (this.failure as NodeJS.ErrnoException | undefined)?.code ?? String(this.failure?.message);
    return new RecordingError(
      `recording ${this.file} ends at byte ${this.position}: ${code}${code === 'ENOSPC' ? ', the disk is full: make room or record fewer signals' : ''}`,
    );
  }

  private enqueue(bytes: Uint8Array): void {
    this.queue.push(bytes);
    this.queued += bytes.length;
  }

  private async work(): Promise<void> {
    try {
      while (this.queued > 0 && this.failure === undefined) {
        const chunk = Buffer.concat(this.queue);
        this.queue = [];
        this.queued = 0;
        this.inFlight = chunk.length;
        let done = 0;
        while (done < chunk.length) {
          const count = await writeAt(this.descriptor, chunk, done, this.position);
          done += count;
          this.position += count;
          this.inFlight -= count;
        }
        this.unsynced = true;
        if (this.syncEvery > 0 && this.unsynced && Date.now() - this.lastSync >= this.syncEvery) {
          await sync(this.descriptor);
          this.unsynced = false;
          this.lastSync = Date.now();
        }
      }
    } catch (error) {
      this.failure ??= error as Error;
      this.queue = [];
      this.queued = 0;
      this.inFlight = 0;
    }
  }
}

function writeAt(descriptor: number, bytes: Uint8Array, from: number, position: number): Promise<number> {
  return new Promise((resolve, reject) =>
    fs.write(descriptor, bytes, from, bytes.length - from, position, (error, count) =>
      error ? reject(error) : resolve(count),
    ),
  );
}

function sync(descriptor: number): Promise<void> {
  return new Promise((resolve, reject) => fs.fdatasync(descriptor, (error) => (error ? reject(error) : resolve())));
}
