import type { BlockLayout } from '../runtime/block.js';
import { fates, MessageFaults } from './message-faults.js';
import type { MessageSpec } from './message-map.js';

/** What became of a datagram or frame of a message. */
export const receptions = { used: 0, saturated: 1, refused: 2, duplicate: 3, late: 4 } as const;

/** Ticks over which the rate of a message is counted. */
const rateWindow = 1000;

/**
 * One message on its way in, whatever carries it: age, time-out and the values that count. What it remembers stands in
 * a block that each call is given. The values that count are the substitutes until the first good message has come and
 * again after a time-out. Values are in units of the map.
 */
export class ReceivedMessage {
  /** Slots: the values that count, first of as many as the message has signals. */
  readonly values: number;
  /** Slots by the names of link-counts.ts. */
  readonly slots: Record<string, number>;
  /** Slot: ticks since the newest message that was used was taken (since the start while none came). */
  readonly age: number;
  /** Slot: ticks between the newest message that was used and the one before it. */
  readonly gap: number;
  /** Slot: largest difference of that from the cycle, ticks. */
  readonly jitter: number;
  /** Slot: 1 while a time-out that counts lasts. */
  readonly timedOut: number;
  /** Slots of counts, since the start or the last clearing. */
  readonly received: number;
  readonly lost: number;
  readonly duplicate: number;
  readonly late: number;
  readonly outOfRange: number;
  readonly timeOuts: number;
  readonly restarts: number;
  /** Slots: messages used per tick over the last whole window; used in this window, and how many ticks of it are over. */
  readonly rate: number;
  private readonly heard: number;
  private readonly heardFor: number;
  /** Slot: 1 once a message has come and no time-out has put the substitutes in place since. */
  protected readonly alive: number;
  /** On the bench's side only. */
  faults: MessageFaults | undefined;
  protected readonly count: number;
  protected readonly fresh: Float64Array;
  private readonly substitutes: Float64Array;

  constructor(
    readonly message: MessageSpec,
    layout: BlockLayout,
  ) {
    const add = (name: string, initial = 0): number => layout.add(`${message.name}.${name}`, initial);
    this.values = layout.length;
    for (const signal of message.signals) add(signal.name, signal.substitute);
    this.age = add('age', -1);
    this.gap = add('period');
    this.jitter = add('jitter');
    this.timedOut = add('timedOut');
    this.received = add('received');
    this.lost = add('lost');
    this.duplicate = add('duplicate');
    this.late = add('late');
    this.outOfRange = add('outOfRange');
    this.timeOuts = add('timeOuts');
    this.restarts = add('restarts');
    this.rate = add('rate');
    this.heard = add('heard');
    this.heardFor = add('heardFor');
    this.alive = add('alive');
    this.count = message.signals.length;
    this.fresh = new Float64Array(this.count);
    this.substitutes = Float64Array.from(message.signals, (signal) => signal.substitute);
    this.slots = {
      age: this.age,
      timedOut: this.timedOut,
      received: this.received,
      outOfRange: this.outOfRange,
      timeOuts: this.timeOuts,
      period: this.gap,
      jitter: this.jitter,
      lost: this.lost,
      duplicate: this.duplicate,
      late: this.late,
      restarts: this.restarts,
      rate: this.rate,
    };
  }

  /** True while the substitutes count. */
  silent(memory: Float64Array): boolean {
    return memory[this.alive] === 0;
  }

  /** One tick has passed: before what came in a tick is looked at. */
  grow(memory: Float64Array): void {
    memory[this.age] += 1;
    memory[this.heardFor] += 1;
    if (memory[this.heardFor] === rateWindow) {
      memory[this.rate] = memory[this.heard] / rateWindow;
      memory[this.heard] = 0;
      memory[this.heardFor] = 0;
    }
    if (this.faults?.delays(memory) && this.faults.due(memory, this.fresh)) this.use(memory, false);
  }

  addFaults(layout: BlockLayout, step: number, seed: number, stream: number, frames: boolean): void {
    this.faults = new MessageFaults(this.message, layout, step, seed, stream, frames);
  }

  /**
   * After all of a tick was looked at: puts the substitutes in place in the tick in which the age reaches the time-out.
   * With `counts` false (boot window) it is not counted yet; a silence that lasts is counted when that ends.
   * Returns 1 when a time-out that counts begins in this tick, -1 when one ends, 0 otherwise.
   */
  settle(memory: Float64Array, counts: boolean): number {
    const timeout = this.message.timeout;
    if (timeout > 0 && memory[this.age] >= timeout) {
      if (memory[this.alive] === 1) {
        memory[this.alive] = 0;
        for (let i = 0; i < this.count; i += 1) memory[this.values + i] = this.substitutes[i];
      }
      if (counts && memory[this.timedOut] === 0) {
        memory[this.timedOut] = 1;
        memory[this.timeOuts] += 1;
        return 1;
      }
    } else if (memory[this.timedOut] === 1) {
      memory[this.timedOut] = 0;
      return -1;
    }
    return 0;
  }

  clearCounts(memory: Float64Array): void {
    memory[this.received] = 0;
    memory[this.lost] = 0;
    memory[this.duplicate] = 0;
    memory[this.late] = 0;
    memory[this.outOfRange] = 0;
    memory[this.timeOuts] = 0;
    memory[this.restarts] = 0;
    memory[this.jitter] = 0;
  }

  /** The values in `fresh` count from now on. */
  protected hold(memory: Float64Array): void {
    const { faults } = this;
    if (faults === undefined) {
      this.use(memory, false);
      return;
    }
    const fate = faults.judge(memory, this.fresh, 0);
    if (fate === fates.lost) return;
    if (fate !== fates.frozen && faults.delays(memory)) faults.holdBack(memory, this.fresh, 0);
    else this.use(memory, fate === fates.frozen);
  }

  private use(memory: Float64Array, frozen: boolean): void {
    if (!frozen) for (let i = 0; i < this.count; i += 1) memory[this.values + i] = this.fresh[i];
    const age = memory[this.age];
    if (age > 0) {
      const every = this.message.every;
      // The gap that a time-out or the start makes is no jitter.
      if (memory[this.alive] === 1 && memory[this.received] > 0 && every > 0) {
        const off = age > every ? age - every : every - age;
        if (off > memory[this.jitter]) memory[this.jitter] = off;
      }
      memory[this.gap] = age;
    }
    memory[this.received] += 1;
    memory[this.heard] += 1;
    memory[this.age] = 0;
    memory[this.alive] = 1;
  }
}
