import { type EventCatalogue, type Journal, noJournal } from './journal.js';
import { declareWatchEvents, type WatchEvents } from './watch-events.js';
import type { WatchLadder } from './watch-ladders.js';
import { describeWarning, WatchLog, type WatchWarning } from './watch-log.js';
import { keeping, SLOT, type WatchSetup, WatchTables } from './watch-tables.js';

export interface WatchOptions extends WatchSetup {
  readonly events: EventCatalogue;
  /** A level stays at least this long after it was last true, s. Default 0.2. */
  readonly hold?: number;
}

/** What `watch.*.timeToRelief` says when the pressure does not approach its relief setting, s. */
export const notApproaching = 1e6;

const usualHold = 0.2;

/**
 * The watch: every tick, true signals against their settings. A signal has up to two ladders of levels, above and below;
 * a ladder has one warning, which climbs, falls, ends, and stays open until it has ended and was acknowledged. All that
 * it remembers stands in the block. `run` allocates nothing.
 *
 * A level begins in the tick in which the value is beyond its setting. It is over when the value has been back by the
 * hysteresis (watch-ladders.ts) for the hold time; its last tick is then the last one before that.
 */
export class Watch {
  journal: Journal = noJournal;
  private readonly step: number;
  private readonly hold: number;
  private readonly tables: WatchTables;
  private readonly events: WatchEvents;
  private readonly log = new WatchLog();

  /** Throws BuildError for paths that are no signals. */
  constructor(options: WatchOptions) {
    this.step = options.step;
    this.hold = Math.max(1, Math.round((options.hold ?? usualHold) / options.step));
    this.tables = new WatchTables(options);
    this.events = declareWatchEvents(options.events, this.tables.ladders);
  }

  get ladders(): readonly WatchLadder[] {
    return this.tables.ladders;
  }

  /** Slot of the command `watch.acknowledge`: acts when it changes; below 0 on all warnings, n > 0 on number n - 1. */
  get acknowledgeSlot(): number {
    return this.tables.acknowledgeSlot;
  }

  /** First slot of the warnings: SLOT.count for each of `ladders`, in their order. */
  get warningSlot(): number {
    return this.tables.slot;
  }

  /** Closed warnings that `warnings` no longer tells. */
  get forgotten(): number {
    return this.log.forgotten;
  }

  /** Puts the signals to what they say before tick 0 and forgets closed warnings. `run` does it at tick 0. */
  begin(block: Float64Array, signals: Float64Array): void {
    const { tables } = this;
    this.log.clear();
    for (let i = 0; i < tables.source.length; i += 1) {
      const value = signals[tables.source[i]];
      block[tables.peakSlot + i] = value;
      signals[tables.peakSignal[i]] = value;
    }
    for (let k = 0; k < tables.sourceOf.length; k += 1) {
      const r = tables.reliefOf[k];
      if (r < 0) continue;
      block[tables.reliefSlot + 2 * r] = Math.max(signals[tables.sourceOf[k]], tables.floor[r]);
      signals[tables.timeSignal[r]] = notApproaching;
    }
  }

  run(block: Float64Array, signals: Float64Array, tick: number): void {
    if (tick === 0) this.begin(block, signals);
    const { source, ladderAt, peakSlot, peakSign, peakSignal, levelSignal, acknowledgeSlot } = this.tables;
    const { slot, sign, least, reliefOf, worstSignal } = this.tables;
    if (block[acknowledgeSlot] !== block[acknowledgeSlot + 1]) this.obey(block, tick);
    let worst = 0;
    for (let i = 0; i < source.length; i += 1) {
      const value = signals[source[i]];
      if (peakSign[i] * value > peakSign[i] * block[peakSlot + i]) block[peakSlot + i] = value;
      signals[peakSignal[i]] = block[peakSlot + i];
      signals[levelSignal[i]] = 0;
      for (let k = ladderAt[i]; k < ladderAt[i + 1]; k += 1) {
        const r = reliefOf[k];
        const near = r >= 0 && this.approaches(block, signals, k, r);
        // The usual case ends here: nothing is beyond its setting, and nothing was.
        if (!near && !(sign[k] * value > least[k]) && block[slot + SLOT.count * k] === 0) continue;
        this.look(block, signals, k, near, tick);
        const level = this.levelOf(block, k);
        if (level > signals[levelSignal[i]]) signals[levelSignal[i]] = level;
        if (level > worst) worst = level;
      }
    }
    signals[worstSignal] = worst;
    this.count(block, signals);
  }

  /** One ladder that has something to say, or had in the tick before. */
  private look(block: Float64Array, signals: Float64Array, k: number, predicted: boolean, tick: number): void {
    const { slot, sign, sourceOf, rungAt, begins, reliefOf, near } = this.tables;
    const at = slot + SLOT.count * k;
    const first = rungAt[k];
    const value = sign[k] * signals[sourceOf[k]];
    const low = predicted ? near[reliefOf[k]] : 0;
    let rung = rungAt[k + 1] - first;
    while (rung > low && !(value > begins[first + rung - 1])) rung -= 1;
    const present = block[at + SLOT.present] | 0;
    if (rung > present) this.climb(block, signals, k, rung, tick);
    else if (present > 0) this.stay(block, signals, k, tick);
    if (block[at + SLOT.present] > 0 && value > sign[k] * block[at + SLOT.peak])
      block[at + SLOT.peak] = sign[k] * value;
  }

  /** Number of the present level of a ladder. */
  private levelOf(block: Float64Array, k: number): number {
    const present = block[this.tables.slot + SLOT.count * k + SLOT.present] | 0;
    return present > 0 ? this.tables.number[this.tables.rungAt[k] + present - 1] : 0;
  }

  /** Writes the predicted time to relief; whether it has been near for long enough to say so. */
  private approaches(block: Float64Array, signals: Float64Array, k: number, r: number): boolean {
    const { reliefSlot, sourceOf, gain, lag, floor, relief, lookAhead, confirm, timeSignal } = this.tables;
    const at = reliefSlot + 2 * r;
    const value = signals[sourceOf[k]];
    const fed = Math.max(value, floor[r]);
    const smoothed = block[at] + gain[r] * (fed - block[at]);
    block[at] = smoothed;
    const rate = (fed - smoothed) / lag[r];
    const gap = relief[r] - value;
    const to = timeSignal[r];
    // written in each branch: V8 boxes a choice between a computed number and a constant of the module
    if (gap <= 0) signals[to] = 0;
    else if (rate * notApproaching > gap) signals[to] = gap / rate;
    else signals[to] = notApproaching;
    const ticks = signals[to] < lookAhead[r] ? block[at + 1] + 1 : 0;
    block[at + 1] = ticks;
    return ticks > confirm[r];
  }

  /** A level begins, or a warning that is on goes higher. Tells when that is more than was told or seen before. */
  private climb(block: Float64Array, signals: Float64Array, k: number, rung: number, tick: number): void {
    const at = this.tables.slot + SLOT.count * k;
    // rungs are whole: as integers they pass between functions without a box
    const present = block[at + SLOT.present] | 0;
    const worst = block[at + SLOT.worst] | 0;
    const seen = block[at + SLOT.acknowledged] !== 0;
    if (worst === 0) {
      block[at + SLOT.since] = tick;
      block[at + SLOT.peak] = signals[this.tables.sourceOf[k]];
      block[at + SLOT.times] = 0;
    }
    if (present === 0) {
      block[at + SLOT.times] += 1;
      block[at + SLOT.began] = tick;
    }
    block[at + SLOT.present] = rung;
    block[at + SLOT.worst] = Math.max(worst, rung);
    block[at + SLOT.until] = tick;
    block[at + SLOT.acknowledged] = 0;
    if (present === 0 || rung > worst || seen) this.tell(signals, k, rung, present === 0, tick);
  }

  private tell(signals: Float64Array, k: number, rung: number, begins: boolean, tick: number): void {
    const { events, tables } = this;
    const j = tables.rungAt[k] + rung - 1;
    const value = signals[tables.sourceOf[k]];
    const r = tables.reliefOf[k];
    const early = r >= 0 && rung === tables.near[r] && !(value > tables.begins[j]);
    const kind = early ? events.predicted[k] : begins ? events.begins[j] : events.rises[j];
    const third = early ? signals[tables.timeSignal[r]] : tables.number[j];
    this.journal.event(tick, kind, events.subjects[k], value, tables.setting[j], third);
  }

  /** A level that is on: it lasts, or goes lower when its time has come. */
  private stay(block: Float64Array, signals: Float64Array, k: number, tick: number): void {
    const at = this.tables.slot + SLOT.count * k;
    let rung = block[at + SLOT.present] | 0;
    if (this.lasts(signals, k, rung)) {
      block[at + SLOT.until] = tick;
      return;
    }
    if (tick - block[at + SLOT.until] < this.hold) return;
    do rung -= 1;
    while (rung > 0 && !this.lasts(signals, k, rung));
    block[at + SLOT.present] = rung;
    if (rung > 0) {
      block[at + SLOT.until] = tick;
      return;
    }
    this.report(block, k, this.events.ends[k], block[at + SLOT.until] - block[at + SLOT.began], tick);
    if (block[at + SLOT.acknowledged] !== 0) this.close(block, k);
  }

  private lasts(signals: Float64Array, k: number, rung: number): boolean {
    const { reliefOf, near, timeSignal, lookAhead, sign, sourceOf, ends, rungAt } = this.tables;
    const r = reliefOf[k];
    if (r >= 0 && rung === near[r] && signals[timeSignal[r]] < keeping * lookAhead[r]) return true;
    return sign[k] * signals[sourceOf[k]] > ends[rungAt[k] + rung - 1];
  }

  /**
   * Acknowledges one open warning by its number among `ladders`, or all with -1. One that is over is closed; one that
   * lasts is closed when it ends, and calls again when it climbs. Unknown numbers and closed ones do nothing. How many
   * it were.
   */
  acknowledge(block: Float64Array, index: number, tick: number): number {
    let count = 0;
    for (let k = 0; k < this.ladders.length; k += 1) {
      const at = this.tables.slot + SLOT.count * k;
      if (index >= 0 && k !== index) continue;
      if (block[at + SLOT.worst] === 0 || block[at + SLOT.acknowledged] !== 0) continue;
      block[at + SLOT.acknowledged] = 1;
      this.report(block, k, this.events.acknowledged[k], tick - block[at + SLOT.since], tick);
      if (block[at + SLOT.present] === 0) this.close(block, k);
      count += 1;
    }
    return count;
  }

  private obey(block: Float64Array, tick: number): void {
    const said = block[this.acknowledgeSlot];
    block[this.acknowledgeSlot + 1] = said;
    if (said < 0) this.acknowledge(block, -1, tick);
    else if (said >= 1) this.acknowledge(block, Math.floor(said) - 1, tick);
  }

  /** Peak, setting of the worst level, and a time in ticks. */
  private report(block: Float64Array, k: number, kind: number, ticks: number, tick: number): void {
    const { events, tables } = this;
    const at = tables.slot + SLOT.count * k;
    const setting = tables.setting[tables.rungAt[k] + block[at + SLOT.worst] - 1];
    this.journal.event(tick, kind, events.subjects[k], block[at + SLOT.peak], setting, ticks * this.step);
  }

  private close(block: Float64Array, k: number): void {
    const at = this.tables.slot + SLOT.count * k;
    this.log.add(block, at, k);
    block[at + SLOT.worst] = 0;
    block[at + SLOT.acknowledged] = 0;
  }

  private count(block: Float64Array, signals: Float64Array): void {
    const { slot, countSignal, unseenSignal } = this.tables;
    const end = slot + SLOT.count * this.ladders.length;
    let open = 0;
    let unseen = 0;
    for (let at = slot; at < end; at += SLOT.count) {
      if (block[at + SLOT.worst] === 0) continue;
      open += 1;
      if (block[at + SLOT.acknowledged] === 0) unseen += 1;
    }
    signals[countSignal] = open;
    signals[unseenSignal] = unseen;
  }

  /** All warnings so far, oldest first. Not for the tick. */
  warnings(block: Float64Array): WatchWarning[] {
    const open = this.ladders.flatMap((ladder, k) => {
      const at = this.tables.slot + SLOT.count * k;
      if (block[at + SLOT.worst] === 0) return [];
      return [{ ...describeWarning(ladder, block.subarray(at, at + SLOT.count), this.step), index: k }];
    });
    return [...this.log.list(this.ladders, this.step), ...open].sort((a, b) => a.since - b.since);
  }
}
