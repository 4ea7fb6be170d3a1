import { hashBlock } from './block.js';
import type { Circuit } from './circuit/build.js';
import { places } from './circuit/build.js';
import type { EnergyParts } from './energy-parts.js';
import type { HandStage } from './hand.js';
import type { InstrumentUpdate } from './instrument.js';
import { type Journal, noJournal } from './journal.js';
import type { Life } from './life.js';
import type { Plant } from './plant.js';
import type { Script } from './script.js';

/** Stages of a tick, in order; a StageMeter is told the end of each. */
export const stages = ['take', 'script', 'plant', 'sense', 'watch', 'judge', 'publish', 'record'] as const;
export interface StageMeter {
  begin(): void;
  end(stage: number): void;
}
export const noMeter: StageMeter = { begin() {}, end() {} };

/** Anything that runs in a stage of its own on block and signals. */
export interface Stage {
  run(block: Float64Array, signals: Float64Array, tick: number, journal: Journal): void;
}
export interface MessageStage {
  take(block: Float64Array, signals: Float64Array, tick: number): void;
  publish(block: Float64Array, signals: Float64Array, tick: number): void;
  clearCounts(block: Float64Array): void;
  setSilent(block: Float64Array, silent: boolean): void;
}

export interface TickParts {
  readonly plant: Plant;
  readonly block: Float64Array;
  readonly signals: Float64Array;
  readonly exchange: MessageStage;
  readonly life: Life;
  readonly hands: HandStage;
  readonly script: Script;
  /** Driver and power stages; then what they drive: signal index to block slot. */
  readonly before: readonly InstrumentUpdate[];
  readonly drives: { readonly from: Int32Array; readonly to: Int32Array };
  readonly after: readonly InstrumentUpdate[];
  readonly ledger: LedgerStage;
  readonly energy: EnergyParts;
  readonly watch: Stage;
  readonly judge: Stage;
  /** What of the block is shown as signals after the step: slots and signal indices. */
  readonly shown: { readonly slots: Int32Array; readonly signals: Int32Array };
  /** Ticks between snapshots of the whole block. */
  readonly snapshotEvery: number;
}

/**
 * One tick: take (messages, then hands), script, plant, sense, watch, judge, publish, record. The same function runs live, at fast pace and
 * again from a recording; only what stands behind `exchange` and `journal` differs. Allocates nothing.
 *
 * Ticks below 0 are the pre-roll: messages go both ways and sensors run, the plant stands in its rest state, nothing
 * is watched, judged or scripted. Tick 0 is the first counted one. From `beginAfterRun` on nothing is scripted or judged,
 * and the plant goes on.
 */
export class Tick {
  journal: Journal = noJournal;
  meter: StageMeter = noMeter;
  /** The hash of the block after the last tick. */
  readonly hash = new Int32Array(2);
  private readonly words: Int32Array;

  constructor(readonly parts: TickParts) {
    const { block } = parts;
    this.words = new Int32Array(block.buffer, block.byteOffset, 2 * block.length);
  }

  /** The run is over; the next tick, number `tick`, is the first of the after-run. */
  beginAfterRun(tick: number): void {
    this.parts.life.beginAfterRun(this.parts.block, tick, this.journal);
  }

  run(tick: number): void {
    const { parts, meter, journal } = this;
    const { block, signals, plant, exchange, life, hands, script, before, after, drives, shown } = parts;
    meter.begin();
    life.begin(block, tick, exchange);
    hands.lift(block);
    if (tick === 0) exchange.clearCounts(block);
    exchange.take(block, signals, tick);
    hands.take(block, tick, journal);
    meter.end(0);
    if (life.afterwards(block)) script.rest(signals);
    else script.run(block, signals, tick, journal);
    for (let i = 0; i < before.length; i += 1) before[i]!(block, signals, tick);
    script.applySignals(block, signals, tick);
    hands.applySignals(block, signals);
    for (let i = 0; i < drives.from.length; i += 1) block[drives.to[i]!] = signals[drives.from[i]!]!;
    script.apply(block, tick);
    hands.apply(block);
    life.apply(block, tick);
    meter.end(1);
    if (tick >= 0) plant.step();
    else plant.observe();
    signals.set(plant.observed, 0);
    for (let i = 0; i < shown.slots.length; i += 1) signals[shown.signals[i]!] = block[shown.slots[i]!]!;
    meter.end(2);
    for (let i = 0; i < after.length; i += 1) after[i]!(block, signals, tick);
    meter.end(3);
    if (tick >= 0) {
      parts.ledger.run(block, signals, tick);
      parts.energy.run(signals);
      parts.watch.run(block, signals, tick, journal);
      meter.end(4);
      if (life.counts(block)) parts.judge.run(block, signals, tick, journal);
    } else meter.end(4);
    meter.end(5);
    exchange.publish(block, signals, tick);
    meter.end(6);
    hashBlock(this.words, this.hash);
    journal.row(tick, signals, this.hash);
    if (tick % parts.snapshotEvery === 0) journal.snapshot(tick, block);
    meter.end(7);
  }
}

/**
 * The ledger: energy stored now, less stored at the start, less what came in, plus what left. `ledger.turnover` is the
 * largest energy that passed through any one branch; the residual is given as a share of it.
 */
export class LedgerStage implements Stage {
  private readonly at: ReturnType<typeof places>;
  private readonly turnover: number;
  private readonly startEnergy: number;
  private readonly startHoldings: number;
  private readonly through: Int32Array;

  constructor(
    private readonly circuit: Circuit,
    private readonly plant: Plant,
    private readonly step: number,
    slots: { readonly turnover: number; readonly start: number },
    private readonly signal: { readonly residual: number; readonly turnover: number; readonly stuffs: number },
    /** Signals of power, W, whose positive part is integrated: slot and signal of each integral. */
    private readonly meters: readonly {
      readonly power: number;
      readonly sign: 1 | -1;
      readonly slot: number;
      readonly signal: number;
    }[] = [],
  ) {
    this.at = places(circuit);
    this.through = Int32Array.from(throughputs(circuit));
    this.turnover = slots.turnover;
    this.startEnergy = slots.start;
    this.startHoldings = slots.start + 1;
  }

  /** Notes what is stored at the start; once, when the block has its start values and the plant is observed. */
  begin(block: Float64Array): void {
    const { plant, at, circuit } = this;
    block[this.startEnergy] = plant.observed[at.energy]!;
    for (let i = 0; i < circuit.stuffs.length; i += 1) block[this.startHoldings + i] = plant.observed[at.holdings + i]!;
  }

  run(block: Float64Array, signals: Float64Array, _tick: number): void {
    const { plant, at, through, circuit } = this;
    const { observed, ledger } = plant;
    let most = 0;
    for (let i = 0; i < through.length; i += 1) {
      const sum = block[this.turnover + i]! + observed[through[i]!]! * this.step;
      block[this.turnover + i] = sum;
      if (sum > most) most = sum;
    }
    for (let i = 0; i < this.meters.length; i += 1) {
      const meter = this.meters[i]!;
      const power = meter.sign * signals[meter.power]!;
      if (power > 0) block[meter.slot] = block[meter.slot]! + power * this.step;
      signals[meter.signal] = block[meter.slot]!;
    }
    signals[this.signal.residual] = observed[at.energy]! - block[this.startEnergy]! - ledger[0]! + ledger[1]!;
    signals[this.signal.turnover] = most;
    for (let i = 0; i < circuit.stuffs.length; i += 1) {
      signals[this.signal.stuffs + i] = observed[at.holdings + i]! - block[this.startHoldings + i]! - ledger[2 + i]!;
    }
  }

  /** Residuals as shares: of the turnover, and of what was held at the start. Not for the tick. */
  shares(block: Float64Array, signals: Float64Array): { energy: number; stuffs: Record<string, number> } {
    const stuffs: Record<string, number> = {};
    this.circuit.stuffs.forEach((stuff, i) => {
      const held = Math.abs(block[this.startHoldings + i]!);
      stuffs[stuff] = held > 0 ? Math.abs(signals[this.signal.stuffs + i]!) / held : 0;
    });
    const turnover = signals[this.signal.turnover]!;
    return { energy: turnover > 0 ? Math.abs(signals[this.signal.residual]!) / turnover : 0, stuffs };
  }
}

/** Places of the branches' throughput among the readings. */
export function throughputs(circuit: Circuit): number[] {
  return circuit.readings.flatMap((reading, i) =>
    reading.group === 'ledger' && reading.name === 'throughput' ? [i] : [],
  );
}
