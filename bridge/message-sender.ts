import type { BlockLayout } from '../runtime/block.js';
import type { MessageSpec } from './message-map.js';
import { changeDistance, dueByCycle } from './schedule.js';
import type { Datagram, UdpCodec } from './udp-codec.js';

/**
 * One message on its way out: decides when it is due and writes it. What it remembers (what it carried last, in units
 * of the map, its sequence, when it went) stands in a block that each call is given; all allocated when it is made.
 */
export class MessageSender {
  readonly message: MessageSpec;
  /** Slots: what the last datagram carried, first of `codec.count`. */
  readonly carried: number;
  /** Slot: datagrams sent since the start or the last clearing. */
  readonly sent: number;
  /** Slot: times that it was due and a value was not finite, so that it was not sent. */
  readonly unsendable: number;
  private readonly sequence: number;
  private readonly lastTick: number;
  private readonly fresh: Float64Array;
  private readonly onCycle: boolean;
  private readonly onChange: boolean;
  private readonly distance: number;

  constructor(
    readonly codec: UdpCodec,
    layout: BlockLayout,
    private readonly firstTick: number,
  ) {
    const message = codec.message;
    this.message = message;
    this.carried = layout.length;
    for (const signal of message.signals) layout.add(`${message.name}.${signal.name}`);
    this.sent = layout.add(`${message.name}.sent`);
    this.unsendable = layout.add(`${message.name}.unsendable`);
    this.sequence = layout.add(`${message.name}.sequence`);
    this.lastTick = layout.add(`${message.name}.lastTick`, Number.NEGATIVE_INFINITY);
    this.fresh = new Float64Array(codec.count);
    this.onCycle = message.trigger !== 'on-change';
    this.onChange = message.trigger !== 'cyclic';
    this.distance = changeDistance(message);
  }

  /** Whether the message could go out in this tick, before its values are looked at. */
  mayBeDue(memory: Float64Array, tick: number): boolean {
    if (this.onCycle && this.dueNow(tick)) return true;
    if (!this.onChange || tick - this.firstTick < this.message.startDelay) return false;
    return tick - memory[this.lastTick] >= this.distance;
  }

  /**
   * Writes the datagram if the message is due with values[from ..] (units of the map); its length, or -1 when it is not
   * due, or -2 when a value was not finite and it was therefore not written. `stamp` is the tick in the header.
   */
  write(
    memory: Float64Array,
    tick: number,
    values: Float64Array,
    from: number,
    datagram: Datagram,
    stamp: number,
  ): number {
    if (!this.mayBeDue(memory, tick)) return -1;
    if (this.codec.quantise(values, from, this.fresh, 0) < 0) {
      memory[this.unsendable] += 1;
      return -2;
    }
    if (!(this.onCycle && this.dueNow(tick)) && memory[this.lastTick] > Number.NEGATIVE_INFINITY && !this.moved(memory))
      return -1;
    for (let i = 0; i < this.codec.count; i += 1) memory[this.carried + i] = this.fresh[i];
    const sequence = memory[this.sequence] | 0;
    memory[this.sequence] = (sequence + 1) | 0;
    memory[this.lastTick] = tick;
    memory[this.sent] += 1;
    return this.codec.write(datagram, sequence, stamp);
  }

  /** Another run begins: what was sent before is no measure for what is due now. The sequence goes on. */
  forget(memory: Float64Array): void {
    memory[this.lastTick] = Number.NEGATIVE_INFINITY;
  }

  clearCounts(memory: Float64Array): void {
    memory[this.sent] = 0;
    memory[this.unsendable] = 0;
  }

  private dueNow(tick: number): boolean {
    return dueByCycle(tick, this.firstTick, this.message.every, this.message.phase, this.message.startDelay);
  }

  private moved(memory: Float64Array): boolean {
    for (let i = 0; i < this.codec.count; i += 1) if (memory[this.carried + i] !== this.fresh[i]) return true;
    return false;
  }
}
