import type { BlockLayout } from './block.js';
import { declareHandEvents, type HandEvents } from './hand-events.js';
import { HAND, handBytes, scenarioActions } from './hand-wire.js';
import type { EventCatalogue, Journal } from './journal.js';

/** Where hands come from: a ring from the host, the inputs of a recording, or nobody. Must not wait or allocate. */
export interface HandSource {
  /** Takes the next hand into `into`; its length in bytes, or -1 when there is none. */
  poll(into: Uint8Array): number;
}
export const noHands: HandSource = { poll: () => -1 };

/** What a hand may take hold of: a command in the block, or what an instrument ahead of the plant says. */
export interface HandTarget {
  readonly path: string;
  readonly unit: string;
  /** -1 for a signal. */
  readonly slot: number;
  /** -1 for a command. */
  readonly signal: number;
}

/** What hands do besides holding targets. */
export interface HandReach {
  /** Slot that is 1 while the scenario is held. */
  readonly heldSlot: number;
  readonly scenario: string;
  /** Acknowledges one warning; how many were open and unseen. */
  acknowledge(block: Float64Array, warning: number, tick: number): number;
  /** Path of a warning by number, '' when there is none. */
  readonly warnings: readonly string[];
}

export interface HandOptions {
  readonly targets: readonly HandTarget[];
  readonly reach: HandReach;
  readonly layout: BlockLayout;
  readonly events: EventCatalogue;
  /** Tick length, s. */
  readonly step: number;
  /** Number under which hands are journaled as inputs: behind those of the links. */
  readonly link: number;
}

/** Hands taken in one tick, and targets held at once. */
const mostPerTick = 8;
const mostGrips = 16;
const GRIP = { target: 0, value: 1, since: 2, deadMan: 3, below: 4, count: 5 } as const;

/**
 * The operator's hands on the loop thread. A hand is journaled as an input before it acts, so that a run with hands can
 * be derived again. What a hand holds goes over messages, instruments and script; what those say goes on underneath and
 * counts again in the tick in which the hand lets go. All that hands remember stands in the block; nothing allocates,
 * and without hands a tick costs three comparisons.
 */
export class HandStage {
  source: HandSource = noHands;
  /** Slot that is not 0 once the run was ended by hand. */
  readonly endedSlot: number;
  /** Slot with the number of targets that are held. */
  readonly countSlot: number;
  private readonly grips: number;
  private readonly bytes = new Uint8Array(handBytes.most);
  private readonly view = new DataView(this.bytes.buffer);
  private readonly slots: Int32Array;
  private readonly signals: Int32Array;
  private readonly warningSubjects: Int32Array;
  private readonly events: HandEvents;
  private readonly reach: HandReach;
  private readonly step: number;
  private readonly link: number;

  constructor({ targets, reach, layout, events, step, link }: HandOptions) {
    this.reach = reach;
    this.step = step;
    this.link = link;
    this.slots = Int32Array.from(targets, (target) => target.slot);
    this.signals = Int32Array.from(targets, (target) => target.signal);
    this.events = declareHandEvents(events, targets, reach.scenario);
    this.warningSubjects = Int32Array.from(reach.warnings, (path) => events.subject(path));
    this.endedSlot = layout.add('hands.ended');
    this.countSlot = layout.add('hands.count');
    this.grips = layout.addMany('hands.grip', mostGrips * GRIP.count);
  }

  /** At the start of a tick: commands that are held get back what the others said last, for those who say no more. */
  lift(block: Float64Array): void {
    if (block[this.countSlot] === 0) return;
    const end = this.grips + mostGrips * GRIP.count;
    for (let at = this.grips; at < end; at += GRIP.count) {
      const target = block[at]! - 1;
      if (target >= 0 && this.slots[target]! >= 0) block[this.slots[target]!] = block[at + GRIP.below]!;
    }
  }

  /** Between `take` and `script`: takes what hands came, and lets go of what nobody renewed. */
  take(block: Float64Array, tick: number, journal: Journal): void {
    for (let i = 0; i < mostPerTick; i += 1) {
      const told = this.source.poll(this.bytes);
      if (told < 0) break;
      const length = Math.min(told, this.bytes.length);
      journal.input(tick, this.link, this.bytes, length);
      if (length >= handBytes.head) this.act(block, tick, journal);
    }
    if (block[this.countSlot] !== 0) this.expire(block, tick, journal);
  }

  /** Behind the instruments ahead of the plant: over what they say. */
  applySignals(block: Float64Array, signals: Float64Array): void {
    if (block[this.countSlot] === 0) return;
    const end = this.grips + mostGrips * GRIP.count;
    for (let at = this.grips; at < end; at += GRIP.count) {
      const target = block[at]! - 1;
      if (target >= 0 && this.signals[target]! >= 0) signals[this.signals[target]!] = block[at + GRIP.value]!;
    }
  }

  /** Just before the plant's step: over messages, instruments and script. */
  apply(block: Float64Array): void {
    if (block[this.countSlot] === 0) return;
    const end = this.grips + mostGrips * GRIP.count;
    for (let at = this.grips; at < end; at += GRIP.count) {
      const target = block[at]! - 1;
      if (target < 0 || this.slots[target]! < 0) continue;
      block[at + GRIP.below] = block[this.slots[target]!]!;
      block[this.slots[target]!] = block[at + GRIP.value]!;
    }
  }

  private act(block: Float64Array, tick: number, journal: Journal): void {
    const { view, events } = this;
    const request = view.getUint32(4, true);
    const target = view.getInt32(8, true);
    switch (view.getUint8(0)) {
      case HAND.set:
        this.set(block, tick, target, request, journal);
        break;
      case HAND.release:
        this.release(block, tick, target, request, journal);
        break;
      case HAND.scenario:
        this.direct(block, tick, target, request, journal);
        break;
      case HAND.acknowledge: {
        const known = target >= 0 && target < this.warningSubjects.length;
        if (!known) this.refuse(tick, events.refusesUnknown, request, journal);
        else if (this.reach.acknowledge(block, target, tick) === 0)
          this.refuse(tick, events.refusesFree, request, journal);
        else journal.event(tick, events.acknowledges, this.warningSubjects[target]!, 0, 0, request);
        break;
      }
      case HAND.note:
        journal.event(tick, events.notes, events.noteSubject, 0, 0, request);
        break;
      default:
        this.refuse(tick, events.refusesUnknown, request, journal);
    }
  }

  private set(block: Float64Array, tick: number, target: number, request: number, journal: Journal): void {
    const { view, events } = this;
    const value = view.getFloat64(16, true);
    // not finite: the difference is NaN
    if (!(target >= 0 && target < this.slots.length && value - value === 0)) {
      this.refuse(tick, events.refusesUnknown, request, journal);
      return;
    }
    let at = this.find(block, target + 1);
    const held = at >= 0;
    if (!held) {
      at = this.find(block, 0);
      if (at < 0) {
        this.refuse(tick, events.refusesFull, request, journal);
        return;
      }
      block[at + GRIP.target] = target + 1;
      block[this.countSlot] = block[this.countSlot]! + 1;
      // until `apply` knows better
      block[at + GRIP.below] = this.slots[target]! >= 0 ? block[this.slots[target]!]! : 0;
    }
    const same = held && block[at + GRIP.value] === value;
    block[at + GRIP.value] = value;
    block[at + GRIP.since] = tick;
    block[at + GRIP.deadMan] = view.getInt32(12, true);
    const kind = same ? events.renews : events.sets[target]!;
    journal.event(tick, kind, events.subjects[target]!, value, 0, request);
  }

  private release(block: Float64Array, tick: number, target: number, request: number, journal: Journal): void {
    const at = target < 0 ? -1 : this.find(block, target + 1);
    if (at < 0) {
      this.refuse(tick, this.events.letGoAlready, request, journal);
      return;
    }
    this.drop(block, at);
    journal.event(tick, this.events.releases, this.events.subjects[target]!, 0, 0, request);
  }

  private direct(block: Float64Array, tick: number, action: number, request: number, journal: Journal): void {
    const { events, reach } = this;
    const held = block[reach.heldSlot]! !== 0;
    if (!(action > 0 && action < scenarioActions.length)) this.refuse(tick, events.refusesUnknown, request, journal);
    else if ((action === 1 && held) || (action === 2 && !held)) this.refuse(tick, events.refusesFree, request, journal);
    else {
      if (action === 3) block[this.endedSlot] = 1;
      else block[reach.heldSlot] = action === 1 ? 1 : 0;
      journal.event(tick, events.scenario[action]!, events.scenarioSubject, 0, 0, request);
    }
  }

  private expire(block: Float64Array, tick: number, journal: Journal): void {
    const end = this.grips + mostGrips * GRIP.count;
    for (let at = this.grips; at < end; at += GRIP.count) {
      const deadMan = block[at + GRIP.deadMan]!;
      if (block[at] === 0 || deadMan <= 0 || tick - block[at + GRIP.since]! <= deadMan) continue;
      const target = block[at]! - 1;
      const time = (tick - block[at + GRIP.since]!) * this.step;
      this.drop(block, at);
      journal.event(tick, this.events.lapses, this.events.subjects[target]!, time, 0, 0);
    }
  }

  private refuse(tick: number, kind: number, request: number, journal: Journal): void {
    journal.event(tick, kind, this.events.noteSubject, 0, 0, request);
  }

  /** Place of the grip on target number `target` - 1; of a free one for 0; -1 when there is none. */
  private find(block: Float64Array, target: number): number {
    const end = this.grips + mostGrips * GRIP.count;
    for (let at = this.grips; at < end; at += GRIP.count) if (block[at] === target) return at;
    return -1;
  }

  private drop(block: Float64Array, at: number): void {
    for (let i = 0; i < GRIP.count; i += 1) block[at + i] = 0;
    block[this.countSlot] = block[this.countSlot]! - 1;
  }
}
