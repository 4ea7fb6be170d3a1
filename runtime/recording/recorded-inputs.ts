import { type InputsBlock, RecordingError } from './format.js';
import type { Ending, Recording } from './reader.js';

interface Waiting {
  readonly block: InputsBlock;
  /** Positions in the block of this link's inputs. */
  readonly positions: Uint32Array;
}

/** The inputs of one link, in the order in which they were taken. */
class LinkQueue {
  readonly waiting: Waiting[] = [];
  /** Next position in the first of them. */
  at = 0;
}

/**
 * The inputs of a recording by tick and link, to compute a run again. Blocks are read from the file as ticks reach them;
 * between blocks `next` allocates nothing.
 */
export class RecordedInputs {
  /** Inputs handed out so far. */
  taken = 0;
  /** How the recording ends, once its inputs have been read to the end. */
  ending: Ending | undefined;
  private readonly queues: LinkQueue[];
  private readonly blocks: ReturnType<Recording['blocks']>;
  private loadedThrough = Number.NEGATIVE_INFINITY;
  private exhausted = false;

  constructor(recording: Recording) {
    this.queues = recording.header.links.map(() => new LinkQueue());
    this.blocks = recording.blocks();
  }

  /**
   * Writes the next input of `link` that was taken at `tick` into `into`; its length, or -1 when there are no more of
   * this tick. Ticks must not go back. Throws `RecordingError` when an input of an earlier tick was passed over or `into`
   * is too short.
   */
  next(tick: number, link: number, into: Uint8Array): number {
    while (!this.exhausted && this.loadedThrough <= tick) this.load();
    const queue = this.queues[link];
    if (queue === undefined) throw new RecordingError(`link ${link}: the recording has ${this.queues.length} links`);
    if (queue.waiting.length === 0) return -1;
    const { block, positions } = queue.waiting[0]!;
    const position = positions[queue.at]!;
    const when = block.ticks[position]!;
    if (when > tick) return -1;
    if (when < tick)
      throw new RecordingError(`an input of tick ${when} on link ${link} was passed over at tick ${tick}`);
    const from = block.offsets[position]!;
    const length = block.offsets[position + 1]! - from;
    if (length > into.length)
      throw new RecordingError(`an input of ${length} bytes at tick ${tick} into room for ${into.length}`);
    for (let i = 0; i < length; i += 1) into[i] = block.bytes[from + i]!;
    queue.at += 1;
    if (queue.at === positions.length) {
      queue.waiting.shift();
      queue.at = 0;
    }
    this.taken += 1;
    return length;
  }

  /** Inputs up to and including `tick` that nobody has taken. */
  remaining(tick: number): number {
    while (!this.exhausted && this.loadedThrough <= tick) this.load();
    let count = 0;
    for (const queue of this.queues) {
      queue.waiting.forEach((entry, number) => {
        for (let i = number === 0 ? queue.at : 0; i < entry.positions.length; i += 1)
          if (entry.block.ticks[entry.positions[i]!]! <= tick) count += 1;
      });
    }
    return count;
  }

  private load(): void {
    for (;;) {
      const step = this.blocks.next();
      if (step.done) {
        this.exhausted = true;
        this.ending = step.value;
        return;
      }
      const block = step.value;
      if (block.kind !== 'inputs' || block.count === 0) continue;
      if (block.ticks[0]! < this.loadedThrough)
        throw new RecordingError(`inputs of tick ${block.ticks[0]} behind those of tick ${this.loadedThrough}`);
      this.loadedThrough = block.ticks[block.count - 1]!;
      const byLink: number[][] = this.queues.map(() => []);
      for (let i = 0; i < block.count; i += 1) {
        const list = byLink[block.links[i]!];
        if (list === undefined)
          throw new RecordingError(
            `an input from link ${block.links[i]}: the recording has ${this.queues.length} links`,
          );
        list.push(i);
      }
      byLink.forEach((list, link) => {
        if (list.length > 0) this.queues[link]!.waiting.push({ block, positions: Uint32Array.from(list) });
      });
      return;
    }
  }
}
