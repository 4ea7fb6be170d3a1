import type { BlockLayout } from '../runtime/block.js';
import { fates, MessageFaults } from './message-faults.js';
import type { MessageSpec } from './message-map.js';
import { changeDistance, dueByCycle, goesByChange, goesByCycle } from './schedule.js';

/** The part of a codec that the schedule needs. */
export interface Quantiser {
  readonly message: MessageSpec;
  readonly count: number;
  /** Values onto the wire's steps: how many were brought into range, or -1 when one is not finite. */
  quantise(values: Float64Array, from: number, carried: Float64Array, to: number): number;
}

/** What `prepare` says. */
export const preparations = { ready: 0, notDue: -1, unsendable: -2 } as const;

/**
 * One message on its way out, whatever carries it: decides when it is due. What it remembers (what it carried last, in
 * units of the map, when it went) stands in a block that each call is given; all allocated when it is made.
 */
export class SentMessage {
  readonly message: MessageSpec;
  readonly count: number;
  /** Slots: what the last one carried, first of `count`. */
  readonly carried: number;
  /** Slots by the names of link-counts.ts. */
  readonly slots: Readonly<Record<string, number>>;
  /** Slot: sent since the start or the last clearing. */
  readonly sent: number;
  /** Slot: times that it was due and a value was not finite, or outside its range in a message that refuses that. */
  readonly unsendable: number;
  /** On the bench's side only. */
  faults: MessageFaults | undefined;
  /** Slot: 1 while the message is kept from going. */
  readonly muted: number;
  /** Slot: 1 when somebody asked for it and it has not gone since. */
  private readonly requested: number;
  private readonly lastTick: number;
  /** Slot: the tick from which the start delay counts. */
  private readonly since: number;
  private readonly fresh: Float64Array;
  private readonly held: Float64Array;
  private readonly onCycle: boolean;
  private readonly onChange: boolean;
  private readonly distance: number;

  constructor(
    private readonly quantiser: Quantiser,
    layout: BlockLayout,
    firstTick: number,
    /** A value outside its range keeps the message from being sent, instead of being brought into it. */
    private readonly refuses = false,
  ) {
    const message = quantiser.message;
    this.message = message;
    this.count = quantiser.count;
    this.carried = layout.length;
    for (const signal of message.signals) layout.add(`${message.name}.${signal.name}`);
    this.sent = layout.add(`${message.name}.sent`);
    this.unsendable = layout.add(`${message.name}.unsendable`);
    this.muted = layout.add(`${message.name}.muted`);
    this.since = layout.add(`${message.name}.since`, firstTick);
    this.requested = layout.add(`${message.name}.requested`);
    this.slots = { sent: this.sent, unsendable: this.unsendable, muted: this.muted };
    this.lastTick = layout.add(`${message.name}.lastTick`, Number.NEGATIVE_INFINITY);
    this.fresh = new Float64Array(this.count);
    this.held = new Float64Array(this.count);
    this.onCycle = goesByCycle(message);
    this.onChange = goesByChange(message);
    this.distance = changeDistance(message);
  }

  /** Whether the message could go out in this tick, before its values are looked at. */
  mayBeDue(memory: Float64Array, tick: number): boolean {
    if (memory[this.muted] === 1) return false;
    if (memory[this.requested] === 1 || (this.onCycle && this.dueNow(memory, tick))) return true;
    if (!this.onChange || tick - memory[this.since] < this.message.startDelay) return false;
    return tick - memory[this.lastTick] >= this.distance;
  }

  /** Somebody asks for it: it goes in the next tick in which it may. */
  request(memory: Float64Array): void {
    memory[this.requested] = 1;
  }

  /** Keeps the message from going, or lets it go: then its start delay counts from this tick on. */
  mute(memory: Float64Array, tick: number, muted: boolean): void {
    if (muted) memory[this.muted] = 1;
    else if (memory[this.muted] === 1) {
      memory[this.muted] = 0;
      memory[this.since] = tick;
      memory[this.lastTick] = Number.NEGATIVE_INFINITY;
    }
  }

  addFaults(layout: BlockLayout, step: number, seed: number, stream: number, frames: boolean): void {
    this.faults = new MessageFaults(this.message, layout, step, seed, stream, frames);
  }

  /** Another run begins: what was sent before is no measure for what is due now. The sequence goes on. */
  forget(memory: Float64Array): void {
    memory[this.lastTick] = Number.NEGATIVE_INFINITY;
  }

  clearCounts(memory: Float64Array): void {
    memory[this.sent] = 0;
    memory[this.unsendable] = 0;
  }

  /**
   * `ready`: due with values[from ..] (units of the map), quantised and counted as sent, to be written now by the codec.
   * `notDue`, or `unsendable`: a value was not finite or not allowed, and it is not to be written.
   */
  protected prepare(memory: Float64Array, tick: number, values: Float64Array, from: number): number {
    const { faults } = this;
    if (faults === undefined) return this.ready(memory, tick, values, from);
    const late = faults.delays(memory) && faults.due(memory, this.fresh);
    if (late) {
      // Held back on its way: what is due by itself in this tick waits like the others.
      for (let i = 0; i < this.count; i += 1) this.held[i] = this.fresh[i];
    }
    let state: number = this.mayBeDue(memory, tick) ? preparations.ready : preparations.notDue;
    if (state === preparations.ready) {
      const fate = faults.judge(memory, values, from);
      if (fate === fates.lost) state = preparations.notDue;
      else if (fate === fates.frozen) {
        if (memory[this.lastTick] > Number.NEGATIVE_INFINITY) return this.ready(memory, tick, memory, this.carried);
      } else if (faults.delays(memory)) {
        faults.holdBack(memory, values, from);
        state = preparations.notDue;
      }
    }
    if (late) return this.force(memory, tick, this.held, 0);
    return state === preparations.ready ? this.ready(memory, tick, values, from) : state;
  }

  /** Out now, whatever the schedule says. */
  private force(memory: Float64Array, tick: number, values: Float64Array, from: number): number {
    if (this.quantiser.quantise(values, from, this.fresh, 0) < 0) return preparations.unsendable;
    for (let i = 0; i < this.count; i += 1) memory[this.carried + i] = this.fresh[i];
    memory[this.lastTick] = tick;
    memory[this.sent] += 1;
    return preparations.ready;
  }

  private ready(memory: Float64Array, tick: number, values: Float64Array, from: number): number {
    if (!this.mayBeDue(memory, tick)) return preparations.notDue;
    const saturated = this.quantiser.quantise(values, from, this.fresh, 0);
    if (saturated < 0 || (saturated > 0 && this.refuses)) {
      memory[this.unsendable] += 1;
      return preparations.unsendable;
    }
    const asked = memory[this.requested] === 1;
    memory[this.requested] = 0;
    if (
      !asked &&
      !(this.onCycle && this.dueNow(memory, tick)) &&
      memory[this.lastTick] > Number.NEGATIVE_INFINITY &&
      !this.moved(memory)
    )
      return preparations.notDue;
    for (let i = 0; i < this.count; i += 1) memory[this.carried + i] = this.fresh[i];
    memory[this.lastTick] = tick;
    memory[this.sent] += 1;
    return preparations.ready;
  }

  private dueNow(memory: Float64Array, tick: number): boolean {
    return dueByCycle(tick, memory[this.since], this.message.every, this.message.phase, this.message.startDelay);
  }

  private moved(memory: Float64Array): boolean {
    for (let i = 0; i < this.count; i += 1) if (memory[this.carried + i] !== this.fresh[i]) return true;
    return false;
  }
}
