import { BlockLayout } from '../block.js';
import type { EventCatalogue, Journal } from '../journal.js';
import type { SignalTable } from '../signals.js';
import type { Stage } from '../tick.js';
import type { Requirement } from './formula.js';
import { compileRequirements, type Judge } from './monitor.js';
import type { RequirementResult } from './result.js';

export interface JudgeStageOptions {
  readonly requirements: readonly Requirement[];
  /** Complete: requirements may name any signal in it. */
  readonly signals: SignalTable;
  readonly layout: BlockLayout;
  readonly events: EventCatalogue;
  /** Tick length, s. */
  readonly step: number;
}

/**
 * The stage `judge`. Results and triggers stand in the block. Windows stand in an array of their own that is not hashed:
 * they follow from the signals of the ticks before, and a window of 8 s is 16 384 slots. Shows each requirement as two
 * signals, `judge.ID.verdict` (0 undecided, 1 pass, 2 fail, 3 not exercised so far) and `judge.ID.margin` (so far).
 */
export class JudgeStage implements Stage {
  readonly judge: Judge;
  private readonly first: Float64Array;
  private readonly windows: Float64Array;
  private readonly slots: Int32Array;
  private readonly shown: Int32Array;

  constructor(options: JudgeStageOptions) {
    const { requirements, signals, layout, events, step } = options;
    const windows = new BlockLayout();
    this.judge = compileRequirements(requirements, signals, { step, layout, windows, catalogue: events });
    this.first = windows.create();
    this.windows = this.first.slice();
    const slots: number[] = [];
    const shown: number[] = [];
    requirements.forEach((requirement, i) => {
      const at = this.judge.slots(i);
      const name = judgeSignal(requirement.id);
      const unit = this.judge.unit(i);
      slots.push(at.verdict, at.margin);
      shown.push(
        signals.add({
          path: `${name}.verdict`,
          unit: '1',
          about: `verdict so far: ${requirement.text}`,
          group: 'run',
          least: 0,
          most: 3,
        }),
        signals.add({
          path: `${name}.margin`,
          unit,
          about: `margin so far: ${requirement.text}`,
          group: 'run',
          difference: true,
        }),
      );
    });
    this.slots = Int32Array.from(slots);
    this.shown = Int32Array.from(shown);
  }

  /** As before tick 0; the block is reset by who owns it. */
  reset(): void {
    this.windows.set(this.first);
  }

  run(block: Float64Array, signals: Float64Array, tick: number, journal: Journal): void {
    if (this.slots.length === 0) return;
    this.judge.tick(tick, signals, block, this.windows, journal);
    for (let i = 0; i < this.slots.length; i += 1) signals[this.shown[i]!] = block[this.slots[i]!]!;
  }

  /** Of a run that ended after `ticks` counted ticks. Not for the tick. */
  results(ticks: number, block: Float64Array): RequirementResult[] {
    return this.judge.finish(ticks, block, this.windows);
  }
}

/** What the signals of a requirement begin with. */
export function judgeSignal(id: string): string {
  return `judge.${id.replaceAll(' ', '_')}`;
}
