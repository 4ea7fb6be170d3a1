import type { BlockLayout } from '../runtime/block.js';
import type { MessageSpec } from './message-map.js';
import { type Datagram, fieldVerdicts, type UdpCodec } from './udp-codec.js';

/** What became of a datagram of this message. */
export const receptions = { used: 0, saturated: 1, refused: 2, duplicate: 3, late: 4 } as const;

/**
 * A step of the sequence larger than this, either way, is a sender that started again and not a gap. At 1 kHz it is a
 * second of silence, longer than any time-out of practice.
 */
const restartStep = 1024;

/**
 * One message on its way in: sequence, age, time-out and the values that count. What it remembers stands in a block
 * that each call is given. The values that count are the substitutes until the first good message has come and again
 * after a time-out. Values are in units of the map.
 *
 * A sequence window of 32 datagrams in the manner of RFC 4303 section 3.4.3 tells a duplicate from one that is late.
 */
export class MessageReceiver {
  readonly message: MessageSpec;
  /** Slots: the values that count, first of `codec.count`. */
  readonly values: number;
  /** Slot: ticks since the newest message that was used was taken (since the start while none came). */
  readonly age: number;
  /** Slot: ticks between the newest message that was used and the one before it. */
  readonly gap: number;
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
  /** Slot: 1 once a message has come and no time-out has put the substitutes in place since. */
  private readonly alive: number;
  private readonly synchronised: number;
  private readonly expected: number;
  private readonly window: number;
  private readonly fresh: Float64Array;
  private readonly substitutes: Float64Array;

  constructor(
    readonly codec: UdpCodec,
    layout: BlockLayout,
  ) {
    const message = codec.message;
    const add = (name: string, initial = 0): number => layout.add(`${message.name}.${name}`, initial);
    this.message = message;
    this.values = layout.length;
    for (const signal of message.signals) add(signal.name, signal.substitute);
    this.age = add('age', -1);
    this.gap = add('gap');
    this.timedOut = add('timedOut');
    this.received = add('received');
    this.lost = add('lost');
    this.duplicate = add('duplicate');
    this.late = add('late');
    this.outOfRange = add('outOfRange');
    this.timeOuts = add('timeOuts');
    this.restarts = add('restarts');
    this.alive = add('alive');
    this.synchronised = add('synchronised');
    this.expected = add('expected');
    this.window = add('window');
    this.fresh = new Float64Array(codec.count);
    this.substitutes = Float64Array.from(message.signals, (signal) => signal.substitute);
  }

  /** True while the substitutes count. */
  silent(memory: Float64Array): boolean {
    return memory[this.alive] === 0;
  }

  /** One tick has passed: before the datagrams of a tick are looked at. */
  grow(memory: Float64Array): void {
    memory[this.age] += 1;
  }

  /** A sound datagram of this message: one of `receptions`. */
  accept(memory: Float64Array, datagram: Datagram, sequence: number): number {
    const place = this.place(memory, sequence);
    if (place !== receptions.used) return place;
    const verdict = this.codec.read(datagram, this.fresh, 0);
    if (verdict !== fieldVerdicts.fine) memory[this.outOfRange] += 1;
    if (verdict === fieldVerdicts.refused) return receptions.refused;
    for (let i = 0; i < this.codec.count; i += 1) memory[this.values + i] = this.fresh[i];
    memory[this.received] += 1;
    if (memory[this.age] > 0) memory[this.gap] = memory[this.age];
    memory[this.age] = 0;
    memory[this.alive] = 1;
    return verdict === fieldVerdicts.saturated ? receptions.saturated : receptions.used;
  }

  /**
   * After the datagrams of a tick: puts the substitutes in place in the tick in which the age reaches the time-out.
   * With `counts` false (boot window) it is not counted yet; a silence that lasts is counted when that ends.
   * Returns 1 when a time-out that counts begins in this tick, -1 when one ends, 0 otherwise.
   */
  settle(memory: Float64Array, counts: boolean): number {
    const timeout = this.message.timeout;
    if (timeout > 0 && memory[this.age] >= timeout) {
      if (memory[this.alive] === 1) {
        memory[this.alive] = 0;
        for (let i = 0; i < this.codec.count; i += 1) memory[this.values + i] = this.substitutes[i];
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

  /** The sender said that it has just started: its next sequence number is taken as it comes. */
  expectRestart(memory: Float64Array): void {
    memory[this.synchronised] = 0;
  }

  clearCounts(memory: Float64Array): void {
    memory[this.received] = 0;
    memory[this.lost] = 0;
    memory[this.duplicate] = 0;
    memory[this.late] = 0;
    memory[this.outOfRange] = 0;
    memory[this.timeOuts] = 0;
    memory[this.restarts] = 0;
  }

  private place(memory: Float64Array, sequence: number): number {
    const next = (sequence + 1) | 0;
    if (memory[this.synchronised] === 0) {
      memory[this.synchronised] = 1;
      memory[this.expected] = next;
      memory[this.window] = 1;
      return receptions.used;
    }
    const ahead = (sequence - memory[this.expected]) | 0;
    if (ahead >= 0 && ahead <= restartStep) {
      memory[this.lost] += ahead;
      memory[this.window] = ahead >= 31 ? 1 : (memory[this.window] << (ahead + 1)) | 1;
      memory[this.expected] = next;
      return receptions.used;
    }
    const back = -1 - ahead;
    if (ahead < 0 && back < 32) {
      const bit = 1 << back;
      if ((memory[this.window] & bit) !== 0) {
        memory[this.duplicate] += 1;
        return receptions.duplicate;
      }
      memory[this.window] = memory[this.window] | bit;
      memory[this.late] += 1;
      if (memory[this.lost] > 0) memory[this.lost] -= 1;
      return receptions.late;
    }
    if (ahead < 0 && back < restartStep && memory[this.alive] === 1) {
      memory[this.late] += 1;
      return receptions.late;
    }
    memory[this.restarts] += 1;
    memory[this.expected] = next;
    memory[this.window] = 1;
    return receptions.used;
  }
}
