import { BlockLayout } from './block.js';
import { type CompiledRequirements, compile } from './judge/compile.js';
import { type Formula, holds } from './judge/formula.js';
import type { SignalTable } from './signals.js';

/**
 * Conditions that steps of a scenario wait for, evaluated once a tick on the signals as the tick before left them (what
 * was received in this tick is seen already). They are formulas of the judge that look at the present and the past; what they
 * remember of the past follows from the signals and stands outside the hashed block.
 */
export class ScriptConditions {
  private readonly compiled: CompiledRequirements;
  private readonly roots: Int32Array;
  private readonly first: Float64Array;
  private readonly firstBlock: Float64Array;
  private readonly windows: Float64Array;
  private readonly block: Float64Array;

  /** Throws BuildError for signals that do not exist. */
  constructor(conditions: readonly Formula[], signals: SignalTable, step: number) {
    const layout = new BlockLayout();
    const windows = new BlockLayout();
    this.compiled = compile(
      conditions.map((of, i) => ({
        id: `condition ${i + 1}`,
        text: '',
        severity: 'observation' as const,
        formula: { is: 'always' as const, from: 0, to: null, of },
      })),
      signals,
      step,
      layout,
      windows,
    );
    this.roots = Int32Array.from(this.compiled.requirements, (one) => one.root);
    this.first = windows.create();
    this.firstBlock = layout.create();
    this.windows = this.first.slice();
    this.block = this.firstBlock.slice();
  }

  reset(): void {
    this.windows.set(this.first);
    this.block.set(this.firstBlock);
  }

  /** Ticks come one after another from 0. */
  run(tick: number, signals: Float64Array): void {
    if (this.roots.length === 0) return;
    const { program, outermost } = this.compiled;
    if (tick === 0) outermost.reset();
    program.run(tick, signals, this.block, this.windows, 0, tick);
    outermost.run(tick, program.registers, this.block, tick);
  }

  /** Whether a condition holds in the tick of the last `run`. */
  holds(condition: number): boolean {
    return holds(this.compiled.outermost.now[this.roots[condition]!]!);
  }
}
