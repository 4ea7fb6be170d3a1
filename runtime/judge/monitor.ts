import { BlockLayout } from '../block.js';
import { type EventCatalogue, type Journal, noJournal } from '../journal.js';
import type { SignalTable } from '../signals.js';
import { type CompiledRequirements, compile } from './compile.js';
import { holds, type Requirement } from './formula.js';
import { conclude, type RequirementResult } from './result.js';

export interface JudgeOptions {
  /** Tick length, s. */
  readonly step: number;
  /** Results, triggers, extremes: part of the state that is hashed. */
  readonly layout: BlockLayout;
  /** History: windows, delays, sums. May be the same layout; kept apart, since a window of 8 s at 1 kHz is 16 384 slots. */
  readonly windows: BlockLayout;
  readonly journal?: Journal;
  readonly catalogue?: EventCatalogue;
}

const slotsPerRequirement = 5;

/**
 * The judge: all requirements of a run, every tick. `tick` allocates nothing. What it remembers stands in two arrays made
 * from the layouts, so a copied pair of arrays is a copied judge.
 */
export class Judge {
  readonly requirements: readonly Requirement[];
  private readonly results: number;
  private readonly roots: Int32Array;
  private readonly horizons: Int32Array;
  /** For requirement i the slots of its triggers stand from triggerAt[i] to triggerAt[i + 1]. */
  private readonly triggerAt: Int32Array;
  private readonly triggerSlots: Int32Array;
  private readonly journal: Journal;
  private readonly failed: number;
  private readonly subjects: Int32Array;

  constructor(
    private readonly compiled: CompiledRequirements,
    options: JudgeOptions,
  ) {
    const all = compiled.requirements;
    this.requirements = all.map((one) => one.requirement);
    this.results = options.layout.length;
    for (const { requirement } of all) {
      options.layout.add(`judge.${requirement.id}.now`);
      options.layout.add(`judge.${requirement.id}.margin`);
      options.layout.add(`judge.${requirement.id}.tick`, -1);
      options.layout.add(`judge.${requirement.id}.verdict`);
      options.layout.add(`judge.${requirement.id}.triggered`, -1);
    }
    this.roots = Int32Array.from(all, (one) => one.root);
    this.horizons = Int32Array.from(all, (one) => one.horizon);
    this.triggerAt = new Int32Array(all.length + 1);
    all.forEach((one, i) => {
      this.triggerAt[i + 1] = this.triggerAt[i]! + one.triggers.length;
    });
    this.triggerSlots = Int32Array.from(all.flatMap((one) => one.triggers));
    this.journal = options.journal ?? noJournal;
    const catalogue = options.catalogue;
    this.failed =
      catalogue?.kind({
        name: 'requirementFailed',
        severity: 'alarm',
        text: 'requirement {subject} failed: margin {a} at tick {b}',
      }) ?? -1;
    this.subjects = Int32Array.from(all, (one) => catalogue?.subject(one.requirement.id) ?? -1);
  }

  /** Slot of the margin at the last known tick (`now`), of the margin so far, its tick, verdict by number, trigger count. */
  slots(index: number): { now: number; margin: number; tick: number; verdict: number; triggers: number } {
    const at = this.results + index * slotsPerRequirement;
    return { now: at, margin: at + 1, tick: at + 2, verdict: at + 3, triggers: at + 4 };
  }

  unit(index: number): string {
    return this.compiled.requirements[index]!.unit;
  }

  /** Operations a tick, for measurements. */
  get operations(): number {
    return this.compiled.program.length;
  }

  /** Judges the signals of `tick`; ticks come one after another from 0. */
  tick(
    tick: number,
    signals: Float64Array,
    block: Float64Array,
    windows: Float64Array,
    journal: Journal = this.journal,
  ): void {
    const { program, outermost } = this.compiled;
    if (tick === 0) outermost.reset();
    program.run(tick, signals, block, windows, 0, tick);
    outermost.run(tick, program.registers, block, tick);
    for (let i = 0; i < this.roots.length; i += 1) {
      const root = this.roots[i]!;
      const at = this.results + i * slotsPerRequirement;
      this.countTriggers(i, block, at + 4);
      block[at] = outermost.now[root]!;
      block[at + 1] = outermost.value[root]!;
      block[at + 2] = outermost.at[root]!;
      const before = block[at + 3]!;
      let verdict = 0;
      if (!holds(outermost.high[root]!)) verdict = 2;
      else if (block[at + 4] === 0) verdict = 3;
      else if (holds(outermost.low[root]!)) verdict = 1;
      else if (holds(outermost.value[root]!) && !this.awaits(i, tick, block)) verdict = 1;
      block[at + 3] = verdict;
      if (verdict === 2 && before !== 2) {
        journal.event(tick, this.failed, this.subjects[i]!, outermost.value[root]!, outermost.at[root]!, 0);
      }
    }
  }

  /** Into a slot: -1 without triggers, otherwise how often the rarest came. Returns nothing: a real number would be boxed. */
  private countTriggers(index: number, block: Float64Array, to: number): void {
    const first = this.triggerAt[index]!;
    const last = this.triggerAt[index + 1]!;
    block[to] = first === last ? -1 : Infinity;
    for (let i = first; i < last; i += 1) block[to] = Math.min(block[to]!, block[this.triggerSlots[i]!]!);
  }

  /** Whether a trigger has come whose consequence is not known yet. */
  private awaits(index: number, tick: number, block: Float64Array): boolean {
    const decided = tick - this.horizons[index]!;
    for (let i = this.triggerAt[index]!; i < this.triggerAt[index + 1]!; i += 1) {
      if (block[this.triggerSlots[i]! + 2]! > decided) return true;
    }
    return false;
  }

  /**
   * Results of a run that ended after `ticks` ticks; reads the arrays and leaves them alone. See formula.ts for what the end of
   * a run means. Allocates: not for use inside a tick.
   */
  finish(ticks: number, block: Float64Array, windows: Float64Array): RequirementResult[] {
    const weak = this.view(1, ticks, block, windows);
    const strong = this.view(-1, ticks, block, windows);
    return this.compiled.requirements.map(({ requirement, unit, triggers }, i) => {
      const exercised = triggers.length === 0 ? undefined : Math.min(...triggers.map((slot) => weak.block[slot]!));
      return conclude(
        requirement,
        unit,
        { margin: weak.values[i]!, tick: weak.at[i]! },
        { margin: strong.values[i]!, tick: strong.at[i]! },
        exercised,
        ticks,
      );
    });
  }

  private view(view: number, ticks: number, block: Float64Array, windows: Float64Array) {
    const { program, outermost, lookAhead, depth } = this.compiled;
    const copy = block.slice();
    const history = windows.slice();
    const none = new Float64Array(0);
    if (ticks === 0) outermost.reset();
    const unbounded = Math.max(0, ticks - 1) + lookAhead;
    const bounded = Math.min(outermost.farthest, Math.max(ticks + depth, outermost.latestStart) + lookAhead);
    const last = Math.max(unbounded, bounded);
    for (let tick = ticks; tick <= last; tick += 1) {
      program.run(tick, none, copy, history, view, ticks - 1);
      outermost.run(tick, program.registers, copy, ticks - 1);
    }
    // Read out once more, taking nothing in: no tick may have been needed.
    outermost.run(-1, program.registers, copy, -1);
    return {
      block: copy,
      values: Array.from(this.roots, (root) => outermost.value[root]!),
      at: Array.from(this.roots, (root) => outermost.at[root]!),
    };
  }
}

/** Compiles requirements and makes their judge; reserves its slots in the layouts. Throws BuildError. */
export function compileRequirements(
  requirements: readonly Requirement[],
  signals: SignalTable,
  options: JudgeOptions,
): Judge {
  return new Judge(compile(requirements, signals, options.step, options.layout, options.windows), options);
}

/** One requirement with arrays of its own, for tools and tests. */
export function compileRequirement(
  requirement: Requirement,
  signals: SignalTable,
  step: number,
): { judge: Judge; block: Float64Array; windows: Float64Array } {
  const layout = new BlockLayout();
  const windows = new BlockLayout();
  const judge = compileRequirements([requirement], signals, { step, layout, windows });
  return { judge, block: layout.create(), windows: windows.create() };
}
