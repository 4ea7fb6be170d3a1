import type { BlockLayout } from '../runtime/block.js';
import { uniform } from '../runtime/noise.js';
import type { MessageSpec } from './message-map.js';

/** Faults of one message, as commands that a scenario sets: `message.faultSilent` and so on. */
export const messageFaults = {
  faultSilent: { unit: '1', about: '1: the message does not come at all', rest: 0, least: 0, most: 1 },
  faultFrozen: {
    unit: '1',
    about: '1: it comes on time with the values that it had when this began',
    rest: 0,
    least: 0,
    most: 1,
  },
  faultLost: { unit: '1', about: 'share of the messages that are lost, by chance', rest: 0, least: 0, most: 1 },
  faultCorrupted: {
    unit: '1',
    about: 'share of the messages in which one value is anything in its range, by chance',
    rest: 0,
    least: 0,
    most: 1,
  },
  faultDelay: { unit: 's', about: 'delay, at most 16 cycles', rest: 0, least: 0, most: 10 },
} as const;

/** Further faults of a message that goes by CAN: what a control unit in trouble does to its frame. */
export const frameFaults = {
  faultCounter: { unit: '1', about: 'share of the messages whose counter stands still', rest: 0, least: 0, most: 1 },
  faultChecksum: { unit: '1', about: 'share of the messages with a wrong checksum', rest: 0, least: 0, most: 1 },
  faultLength: { unit: '1', about: 'share of the messages that are too short', rest: 0, least: 0, most: 1 },
} as const;

/** What becomes of a message. */
export const fates = { passes: 0, lost: 1, frozen: 2 } as const;

const deepest = 16;

/**
 * The faults of one message, between the codec and the values that count: on both kinds of links, with the counts of the link as
 * they are without. Chance is a function of seed, message and how many messages went before. All that it remembers stands in
 * the block; allocates nothing.
 */
export class MessageFaults {
  /** Slots by the names of `messageFaults`. */
  readonly slots: Readonly<Record<keyof typeof messageFaults | keyof typeof frameFaults, number>>;
  private readonly drawn: number;
  private readonly chance: number;
  /** Messages that wait, then for each of them ticks to go and its values. */
  private readonly waiting: number;
  private readonly count: number;
  private readonly least: Float64Array;
  private readonly most: Float64Array;
  /** Slots of faults that it shares with other messages. */
  private shared: { readonly silent: number; readonly frozen: number } | undefined;

  constructor(
    message: MessageSpec,
    layout: BlockLayout,
    /** Length of a tick, s. */
    private readonly step: number,
    private readonly seed: number,
    /** A number of its own among all messages. */
    private readonly stream: number,
    /** Whether it goes by CAN. */
    readonly frames = false,
  ) {
    const add = (name: string) => layout.add(`${message.name}.${name}`);
    const addFrame = (name: string) => (frames ? add(name) : -1);
    this.slots = {
      faultSilent: add('faultSilent'),
      faultFrozen: add('faultFrozen'),
      faultLost: add('faultLost'),
      faultCorrupted: add('faultCorrupted'),
      faultDelay: add('faultDelay'),
      faultCounter: addFrame('faultCounter'),
      faultChecksum: addFrame('faultChecksum'),
      faultLength: addFrame('faultLength'),
    };
    this.drawn = add('faultDraws');
    this.chance = add('faultChance');
    this.count = message.signals.length;
    this.waiting = layout.addMany(`${message.name}.waiting`, 1 + deepest * (1 + this.count));
    this.least = Float64Array.from(message.signals, (signal) => signal.least);
    this.most = Float64Array.from(message.signals, (signal) => signal.most);
  }

  /** From now on it is silent or frozen as well while one of these slots is not 0. */
  join(shared: { readonly silent: number; readonly frozen: number }): void {
    this.shared = shared;
  }

  /** Of a message whose values stand in `values[from ..]`: one of `fates`. May change one of the values. */
  judge(memory: Float64Array, values: Float64Array, from: number): number {
    const { slots, chance, shared } = this;
    if (memory[slots.faultSilent] >= 0.5) return fates.lost;
    if (shared !== undefined && memory[shared.silent] >= 0.5) return fates.lost;
    if (memory[slots.faultLost] > 0) {
      this.draw(memory);
      if (memory[chance] < memory[slots.faultLost]) return fates.lost;
    }
    if (memory[slots.faultFrozen] >= 0.5) return fates.frozen;
    if (shared !== undefined && memory[shared.frozen] >= 0.5) return fates.frozen;
    if (memory[slots.faultCorrupted] > 0) {
      this.draw(memory);
      if (memory[chance] < memory[slots.faultCorrupted]) {
        this.draw(memory);
        const which = Math.floor(memory[chance] * this.count);
        this.draw(memory);
        values[from + which] = this.least[which] + memory[chance] * (this.most[which] - this.least[which]);
      }
    }
    return fates.passes;
  }

  /** Whether one of `frameFaults` strikes this message. */
  strikes(memory: Float64Array, fault: number): boolean {
    if (fault < 0 || !(memory[fault] > 0)) return false;
    this.draw(memory);
    return memory[this.chance] < memory[fault];
  }

  /** Whether messages are held back; what waits when the delay ends is dropped. */
  delays(memory: Float64Array): boolean {
    if (memory[this.slots.faultDelay] > 0) return true;
    memory[this.waiting] = 0;
    return false;
  }

  /** Holds a message back; with more than 16 of them waiting the newest is lost. */
  holdBack(memory: Float64Array, values: Float64Array, from: number): void {
    const number = memory[this.waiting];
    if (number >= deepest) return;
    const at = this.waiting + 1 + number * (1 + this.count);
    memory[at] = Math.round(memory[this.slots.faultDelay] / this.step);
    for (let i = 0; i < this.count; i += 1) memory[at + 1 + i] = values[from + i];
    memory[this.waiting] = number + 1;
  }

  /** One tick has passed. True when the oldest is due: its values are then in `into`. */
  due(memory: Float64Array, into: Float64Array): boolean {
    const number = memory[this.waiting];
    const size = 1 + this.count;
    const first = this.waiting + 1;
    for (let k = 0; k < number; k += 1) memory[first + k * size] -= 1;
    if (number === 0 || memory[first] > 0) return false;
    for (let i = 0; i < this.count; i += 1) into[i] = memory[first + 1 + i];
    for (let i = 0; i < (number - 1) * size; i += 1) memory[first + i] = memory[first + size + i];
    memory[this.waiting] = number - 1;
    return true;
  }

  private draw(memory: Float64Array): void {
    memory[this.drawn] += 1;
    uniform(this.seed, this.stream, memory[this.drawn], memory, this.chance);
  }
}
