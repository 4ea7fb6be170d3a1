import type { BlockLayout } from './block.js';
import type { Requirement } from './judge/formula.js';
import type { EventCatalogue, Journal } from './journal.js';
import type { SignalTable } from './signals.js';

/** A scenario as plain data: SI, times in ticks from tick 0. Read from a file by configs/scenario.ts. */
export interface ScriptSpec {
  readonly name: string;
  readonly about: string;
  /** Length of the run, ticks. */
  readonly ticks: number;
  /** What the driver is to follow: speed, m/s, over ticks; linear between points. */
  readonly drive: readonly (readonly [number, number])[];
  /** How far ahead `scenario.targetSpeedAhead` looks, ticks. */
  readonly preview: number;
  /** Commands over time: linear between points, or held until the next point. */
  readonly traces: readonly ScriptTrace[];
  /** In order of time. */
  readonly steps: readonly ScriptStep[];
  /** Asked beside those of the bench. */
  readonly requirements: readonly Requirement[];
}
export interface ScriptTrace {
  readonly target: string;
  readonly points: readonly (readonly [number, number])[];
  readonly between: 'linear' | 'hold';
}
export interface ScriptStep {
  readonly at: number;
  readonly name: string;
  readonly action: 'set' | 'ramp' | 'hold' | 'release' | 'note';
  /** Path of a command; '' for a note. */
  readonly target: string;
  readonly value: number;
  /** Ramp: ticks that it takes. */
  readonly over: number;
}

export const emptyScript: ScriptSpec = { name: 'no scenario', about: '', ticks: 0, drive: [], preview: 0, traces: [], steps: [], requirements: [] };

/** What a step does to its target until another step or `release` comes. */
const modes = { free: 0, held: 1, ramping: 2 } as const;

/**
 * Runs the timeline on the loop thread. All that it remembers stands in the block: the next step, and per target the
 * mode, the value and the ramp. A target that a step holds keeps its value against messages and instruments.
 */
export class Script {
  /** Slots: 1 while the timeline is held by hand; ticks that it lags behind the clock for that. */
  readonly heldSlot: number;
  readonly delaySlot: number;
  private readonly next: number;
  private readonly hold: { slot: number; mode: number; value: number; from: number; start: number; over: number }[] = [];
  private readonly holdOf: Int32Array;
  private readonly tracePointers: number;
  private readonly traceSlots: Int32Array;
  private readonly traceTicks: Float64Array[];
  private readonly traceValues: Float64Array[];
  private readonly driveTicks: Float64Array;
  private readonly driveValues: Float64Array;
  private readonly signalTime: number;
  private readonly signalStep: number;
  private readonly signalTarget: number;
  private readonly signalAhead: number;
  private readonly signalRemaining: number;
  private readonly kindStep: number;
  private readonly subjects: Int32Array;

  constructor(
    readonly spec: ScriptSpec,
    private readonly step: number,
    layout: BlockLayout,
    signals: SignalTable,
    events: EventCatalogue,
    targets: { find(path: string): number },
  ) {
    this.next = layout.add('scenario.next');
    this.heldSlot = layout.add('scenario.held');
    this.delaySlot = layout.add('scenario.delay');
    const slots: number[] = [];
    this.holdOf = Int32Array.from(spec.steps, (one) => {
      if (one.target === '') return -1;
      const slot = targets.find(one.target);
      let at = slots.indexOf(slot);
      if (at < 0) {
        at = slots.length;
        slots.push(slot);
        this.hold.push({
          slot,
          mode: layout.add(`scenario.${one.target}.mode`),
          value: layout.add(`scenario.${one.target}.value`),
          from: layout.add(`scenario.${one.target}.from`),
          start: layout.add(`scenario.${one.target}.start`),
          over: layout.add(`scenario.${one.target}.over`),
        });
      }
      return at;
    });
    this.tracePointers = layout.addMany('scenario.trace', spec.traces.length + 2);
    this.traceSlots = Int32Array.from(spec.traces, (trace) => targets.find(trace.target));
    this.traceTicks = spec.traces.map((trace) => Float64Array.from(trace.points, (point) => point[0]));
    this.traceValues = spec.traces.map((trace) => Float64Array.from(trace.points, (point) => point[1]));
    this.driveTicks = Float64Array.from(spec.drive, (point) => point[0]);
    this.driveValues = Float64Array.from(spec.drive, (point) => point[1]);
    const signal = (name: string, unit: string, about: string) => signals.add({ path: `scenario.${name}`, unit, about, group: 'run' });
    this.signalTime = signal('time', 's', 'time of the timeline: since tick 0, less what it was held');
    this.signalStep = signal('step', '1', 'steps of the timeline done');
    this.signalTarget = signal('targetSpeed', 'm/s', 'speed that the driver is to follow');
    this.signalAhead = signal('targetSpeedAhead', 'm/s', 'the same, a preview time ahead');
    this.signalRemaining = signal('remaining', 's', 'time to the end of the scenario');
    this.kindStep = events.kind({ name: 'scenario step', severity: 'note', text: 'scenario: {subject}' });
    this.subjects = Int32Array.from(spec.steps, (one) => events.subject(one.name));
  }

  /** Stage `script`: advances the timeline; writes the scenario's signals and the traces' commands. */
  run(block: Float64Array, signals: Float64Array, tick: number, journal: Journal): void {
    const { spec } = this;
    if (tick >= 0 && block[this.heldSlot] !== 0) block[this.delaySlot] = block[this.delaySlot]! + 1;
    // the time of the timeline, which stands while it is held
    const now = tick - block[this.delaySlot]!;
    const at = now < 0 ? 0 : now;
    signals[this.signalTime] = at * this.step;
    signals[this.signalRemaining] = (spec.ticks - at) * this.step;
    const pointers = this.tracePointers;
    const count = spec.traces.length;
    if (this.driveTicks.length > 0) {
      signals[this.signalTarget] = this.lookUp(block, pointers + count, this.driveTicks, this.driveValues, at, true);
      signals[this.signalAhead] = this.lookUp(block, pointers + count + 1, this.driveTicks, this.driveValues, at + spec.preview, true);
    }
    for (let i = 0; i < count; i += 1) {
      block[this.traceSlots[i]!] = this.lookUp(block, pointers + i, this.traceTicks[i]!, this.traceValues[i]!, at, spec.traces[i]!.between === 'linear');
    }
    if (tick < 0) return;
    while (block[this.next]! < spec.steps.length) {
      const number = block[this.next]!;
      const step = spec.steps[number]!;
      if (step.at > now) break;
      this.begin(block, number, step, now);
      journal.event(tick, this.kindStep, this.subjects[number]!, step.value, step.over * this.step, 0);
      block[this.next] = number + 1;
    }
    signals[this.signalStep] = block[this.next]!;
  }

  /** What the steps hold, written over what messages and instruments said: just before the plant's step. */
  apply(block: Float64Array, tick: number): void {
    const now = tick - block[this.delaySlot]!;
    for (let i = 0; i < this.hold.length; i += 1) {
      const held = this.hold[i]!;
      const mode = block[held.mode]!;
      if (mode === modes.free) continue;
      if (mode === modes.ramping) {
        const passed = now - block[held.start]!;
        const over = block[held.over]!;
        const share = passed >= over ? 1 : passed / over;
        block[held.slot] = block[held.from]! + share * (block[held.value]! - block[held.from]!);
        if (share === 1) block[held.mode] = modes.held;
      } else block[held.slot] = block[held.value]!;
    }
  }

  private begin(block: Float64Array, number: number, step: ScriptStep, now: number): void {
    const at = this.holdOf[number]!;
    if (at < 0) return;
    const held = this.hold[at]!;
    switch (step.action) {
      case 'release':
        block[held.mode] = modes.free;
        break;
      case 'hold':
        block[held.value] = block[held.slot]!;
        block[held.mode] = modes.held;
        break;
      case 'ramp':
        block[held.from] = block[held.slot]!;
        block[held.value] = step.value;
        block[held.start] = now;
        block[held.over] = step.over;
        block[held.mode] = step.over > 0 ? modes.ramping : modes.held;
        break;
      default:
        block[held.value] = step.value;
        block[held.mode] = modes.held;
    }
  }

  private lookUp(block: Float64Array, pointer: number, ticks: Float64Array, values: Float64Array, tick: number, linear: boolean): number {
    let i = block[pointer]!;
    const last = ticks.length - 1;
    while (i < last && ticks[i + 1]! <= tick) i += 1;
    block[pointer] = i;
    if (i >= last || tick <= ticks[i]! || !linear) return values[i]!;
    return values[i]! + ((values[i + 1]! - values[i]!) * (tick - ticks[i]!)) / (ticks[i + 1]! - ticks[i]!);
  }
}
