import type { BlockLayout } from '../runtime/block.js';
import { uniform } from '../runtime/noise.js';
import { flexibleLengths, frameSizes, payloadAt, writeFrameHead } from './can-frame.js';

/**
 * What a bus may do to frames on one way, as commands `link.wayName` (way: `received` or `sent`). Shares are of all
 * frames of the way, by chance.
 */
export const busFaults = {
  Drop: { unit: '1', about: 'share of the frames that are dropped', most: 1 },
  Duplicate: { unit: '1', about: 'share of the frames that go twice', most: 1 },
  Reorder: { unit: '1', about: 'share of the frames that go after the next one', most: 1 },
  Corrupt: { unit: '1', about: 'share of the frames in which one bit of the payload is turned', most: 1 },
  Shorten: { unit: '1', about: 'share of the frames that are one length shorter', most: 1 },
  Delay: { unit: 's', about: 'delay of all frames', most: 1 },
  Silence: { unit: '1', about: '1: no frame goes', most: 1 },
  Flood: {
    unit: '1/s',
    about: 'frames of the highest priority with payloads by chance, beside all others',
    most: 20000,
  },
} as const;

/** What was done, as signals `link.wayName`. */
export const busFaultCounts = {
  Dropped: 'frames dropped on purpose',
  Duplicated: 'frames that went twice on purpose',
  Reordered: 'frames that went after the next one on purpose',
  Corrupted: 'frames with a bit turned on purpose',
  Shortened: 'frames shortened on purpose',
  Flooded: 'frames put in on purpose',
} as const;

/** What a link does as a whole, as commands `link.name`. */
export const linkFaults = {
  reportBusOff: {
    unit: '1',
    about: '1: as if the CAN controller were bus-off: it says so, nothing comes and nothing leaves; 0: restarted',
    most: 1,
  },
} as const;

type Fault = keyof typeof busFaults;
type Count = keyof typeof busFaultCounts;

/** Frames that may wait at once; the newest of more is dropped and counted. */
const depth = 16;
const words = frameSizes.flexible / 4;
/** Tick of release, size, then the frame as 32-bit words. */
const place = 2 + words;
/** Frames that a flood puts in within one tick at most. */
const mostInTick = 64;
/** A frame that is to go after the next one goes after this many ticks when no next one comes. */
const longestHold = 200;

/**
 * The adversary on one way of a CAN link, between the bus and the link. Seeded and exact to the tick: what it does is a
 * function of seed, frame count and commands, and all that it remembers, waiting frames included, stands in the block.
 * Frames are recorded as they came from the bus, before it. Allocates nothing in a call.
 */
export class BusAdversary {
  /** Slots of the commands and of the counts, by their names. */
  readonly faults: Readonly<Record<Fault, number>>;
  readonly counts: Readonly<Record<Count, number>>;
  private readonly drawn: number;
  private readonly chance: number;
  /** Frames of a flood that are owed. */
  private readonly owed: number;
  private readonly waiting: number;
  private readonly queue: number;
  /** Release tick (or -Infinity: none is held), size and words of the frame that goes after the next. */
  private readonly held: number;

  constructor(
    link: string,
    readonly way: 'received' | 'sent',
    layout: BlockLayout,
    /** Length of a tick, s. */
    private readonly step: number,
    private readonly seed: number,
    private readonly stream: number,
  ) {
    const path = (name: string): string => `${link}.${way}${name}`;
    const slots = <T extends string>(names: readonly T[]): Record<T, number> =>
      Object.fromEntries(names.map((name) => [name, layout.add(path(name))])) as Record<T, number>;
    this.faults = slots(Object.keys(busFaults) as Fault[]);
    this.counts = slots(Object.keys(busFaultCounts) as Count[]);
    this.drawn = layout.add(path('Draws'));
    this.chance = layout.add(path('Chance'));
    this.owed = layout.add(path('Owed'));
    this.waiting = layout.add(path('Waiting'));
    this.queue = layout.addMany(path('Queue'), depth * place);
    this.held = layout.addMany(path('Held'), place);
    layout.setInitial(this.held, Number.NEGATIVE_INFINITY);
  }

  /** Whether frames have to pass through here; otherwise the link may pass them on itself. */
  acts(block: Float64Array): boolean {
    const { faults } = this;
    return (
      block[this.waiting] > 0 ||
      block[this.held] > Number.NEGATIVE_INFINITY ||
      block[faults.Silence] >= 0.5 ||
      block[faults.Drop] > 0 ||
      block[faults.Duplicate] > 0 ||
      block[faults.Reorder] > 0 ||
      block[faults.Corrupt] > 0 ||
      block[faults.Shorten] > 0 ||
      block[faults.Delay] > 0
    );
  }

  /** A frame enters, at `tick`; it may be changed. What comes of it is had from `next`. */
  push(block: Float64Array, tick: number, frame: Uint8Array, size: number): void {
    const { faults, counts } = this;
    if (block[faults.Silence] >= 0.5 || this.happens(block, faults.Drop)) {
      block[counts.Dropped] += 1;
      return;
    }
    if (this.happens(block, faults.Corrupt) && frame[4] > 0) {
      this.draw(block);
      const bit = Math.floor(block[this.chance] * frame[4] * 8);
      frame[payloadAt + (bit >> 3)] ^= 1 << (bit & 7);
      block[counts.Corrupted] += 1;
    }
    if (this.happens(block, faults.Shorten) && frame[4] > 0) {
      frame[4] = nextShorter(frame[4]);
      block[counts.Shortened] += 1;
    }
    const release = tick + Math.round(block[faults.Delay] / this.step);
    if (block[this.held] === Number.NEGATIVE_INFINITY && this.happens(block, faults.Reorder)) {
      this.store(block, this.held, release + longestHold, frame, size);
      block[counts.Reordered] += 1;
      return;
    }
    this.append(block, release, frame, size);
    if (this.happens(block, faults.Duplicate)) {
      this.append(block, release, frame, size);
      block[counts.Duplicated] += 1;
    }
    if (block[this.held] > Number.NEGATIVE_INFINITY) this.appendHeld(block, release);
  }

  /** The next frame that leaves at `tick`, into `frame`; its size, or -1. */
  next(block: Float64Array, tick: number, frame: Uint8Array): number {
    if (block[this.held] > Number.NEGATIVE_INFINITY && block[this.held] <= tick) this.appendHeld(block, tick);
    const { queue } = this;
    const waiting = block[this.waiting];
    if (waiting === 0 || block[queue] > tick) return -1;
    const size = block[queue + 1];
    for (let i = 0; i < words; i += 1) {
      const word = block[queue + 2 + i];
      frame[4 * i] = word;
      frame[4 * i + 1] = word >>> 8;
      frame[4 * i + 2] = word >>> 16;
      frame[4 * i + 3] = word >>> 24;
    }
    const left = (waiting - 1) * place;
    for (let i = 0; i < left; i += 1) block[queue + i] = block[queue + place + i];
    block[this.waiting] = waiting - 1;
    return size;
  }

  /** A tick begins: what a flood puts in during it is owed from now on. */
  beginFlood(block: Float64Array): void {
    const rate = block[this.faults.Flood];
    if (!(rate > 0)) {
      block[this.owed] = 0;
      return;
    }
    block[this.owed] = Math.min(mostInTick, block[this.owed] + rate * this.step);
  }

  /** The next frame of a flood, into `frame`; its size, or -1. */
  nextFlood(block: Float64Array, frame: Uint8Array): number {
    // Whole frames only; a rounding of the rate by the step is none.
    if (block[this.owed] < 1 - 1e-9) return -1;
    block[this.owed] -= 1;
    writeFrameHead(frame, 0, 8, 0);
    this.draw(block);
    const low = block[this.chance] * 0x100000000;
    this.draw(block);
    const high = block[this.chance] * 0x100000000;
    for (let i = 0; i < 4; i += 1) {
      frame[payloadAt + i] = low >>> (8 * i);
      frame[payloadAt + 4 + i] = high >>> (8 * i);
    }
    block[this.counts.Flooded] += 1;
    return frameSizes.classic;
  }

  /** A frame is lost for another reason than a fault of this way. */
  lose(block: Float64Array): void {
    block[this.counts.Dropped] += 1;
  }

  clearCounts(block: Float64Array): void {
    const { counts } = this;
    block[counts.Dropped] = 0;
    block[counts.Duplicated] = 0;
    block[counts.Reordered] = 0;
    block[counts.Corrupted] = 0;
    block[counts.Shortened] = 0;
    block[counts.Flooded] = 0;
  }

  private append(block: Float64Array, release: number, frame: Uint8Array, size: number): void {
    const waiting = block[this.waiting];
    if (waiting >= depth) {
      block[this.counts.Dropped] += 1;
      return;
    }
    this.store(block, this.queue + waiting * place, release, frame, size);
    block[this.waiting] = waiting + 1;
  }

  private appendHeld(block: Float64Array, release: number): void {
    const { held } = this;
    const waiting = block[this.waiting];
    if (waiting >= depth) block[this.counts.Dropped] += 1;
    else {
      const at = this.queue + waiting * place;
      for (let i = 0; i < place; i += 1) block[at + i] = block[held + i];
      block[at] = release;
      block[this.waiting] = waiting + 1;
    }
    block[held] = Number.NEGATIVE_INFINITY;
  }

  private store(block: Float64Array, at: number, release: number, frame: Uint8Array, size: number): void {
    block[at] = release;
    block[at + 1] = size;
    for (let i = 0; i < words; i += 1)
      block[at + 2 + i] =
        4 * i < size ? frame[4 * i] | (frame[4 * i + 1] << 8) | (frame[4 * i + 2] << 16) | (frame[4 * i + 3] << 24) : 0;
  }

  private happens(block: Float64Array, fault: number): boolean {
    const share = block[fault];
    if (!(share > 0)) return false;
    this.draw(block);
    return block[this.chance] < share;
  }

  private draw(block: Float64Array): void {
    block[this.drawn] += 1;
    uniform(this.seed, this.stream, block[this.drawn], block, this.chance);
  }
}

/** The longest payload length that a frame can have below this one. */
export function nextShorter(length: number): number {
  let shorter = 0;
  for (let i = 0; i < flexibleLengths.length; i += 1) if (flexibleLengths[i] < length) shorter = flexibleLengths[i];
  return shorter;
}
