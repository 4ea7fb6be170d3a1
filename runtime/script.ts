import type { BlockLayout } from './block.js';
import type { EventCatalogue, Journal } from './journal.js';
import type { Formula, Requirement } from './judge/formula.js';
import { scenarioSignals } from './own-signals.js';
import { ScriptConditions } from './script-conditions.js';
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
  /** One after another: a step is looked at when the one before it is done. */
  readonly steps: readonly ScriptStep[];
  /** What steps wait for. */
  readonly conditions?: readonly Formula[];
  /** Start values by element, over those of the bench; SI. */
  readonly start?: Readonly<Record<string, Readonly<Record<string, number>>>>;
  /** Control units that the bench does not stand in for in this run. */
  readonly without?: readonly string[];
  /** Parameters of the scenario as they were chosen, and the case. */
  readonly parameters?: Readonly<Record<string, string>>;
  /** Asked beside those of the bench. */
  readonly requirements: readonly Requirement[];
  /** Requirements of the bench that are not asked of this run, with the reason. */
  readonly waived?: Readonly<Record<string, string>>;
}
export interface ScriptTrace {
  readonly target: string;
  readonly points: readonly (readonly [number, number])[];
  readonly between: 'linear' | 'hold';
  /** Signal that the points go over instead of ticks, such as a distance; SI. */
  readonly over?: string;
}
export interface ScriptStep {
  /** Not before this tick. */
  readonly at: number;
  /** Not before so many ticks after the step before. */
  readonly wait?: number;
  /** Number of the condition that it waits for. */
  readonly condition?: number;
  /** Ticks that the condition has to hold without a break. */
  readonly lasting?: number;
  /** Ticks after the step before at which it gives up the condition and is left out; absent: never. */
  readonly timeOut?: number;
  readonly name: string;
  /** `fault` holds a value like `set`, `clear` puts back what is there without a fault. */
  readonly action: 'set' | 'ramp' | 'hold' | 'release' | 'note' | 'fault' | 'clear';
  /** Path of a command or of what an instrument ahead of the plant says; '' for a note. */
  readonly target: string;
  readonly value: number;
  /** Ramp: ticks that it takes. */
  readonly over: number;
}

/** What a run is judged by: the requirements of its bench that the scenario does not waive, and its own. */
export function requirementsOf(ofBench: readonly Requirement[], script: ScriptSpec): Requirement[] {
  const waived = script.waived ?? {};
  return [...ofBench.filter(({ id }) => !Object.hasOwn(waived, id)), ...script.requirements];
}

/**
 * A script as a recording carries it and gives it back: JSON, which knows no minus zero. A run is to use this form, or else
 * it is not the run that is derived again.
 */
export function recordedForm(script: ScriptSpec): ScriptSpec {
  return JSON.parse(JSON.stringify(script)) as ScriptSpec;
}

export const emptyScript: ScriptSpec = {
  name: 'no scenario',
  about: '',
  ticks: 0,
  drive: [],
  preview: 0,
  traces: [],
  steps: [],
  requirements: [],
};

/** What a step does to its target until another step or `release` comes. */
const modes = { free: 0, held: 1, ramping: 2, starting: 3, taking: 4, clearing: 5 } as const;

/** Slots of a target that steps hold, and where it stands: in the block, or among the signals. */
interface Held {
  readonly path: string;
  /** Set when all commands are known; one of the two is -1. */
  slot: number;
  signal: number;
  readonly mode: number;
  readonly value: number;
  readonly from: number;
  readonly start: number;
  readonly over: number;
}

/**
 * Runs the timeline on the loop thread. All that it remembers stands in the block: the next step, and per target the
 * mode, the value and the ramp. A target that a step holds keeps its value against messages and instruments.
 */
export class Script {
  /** Slots: 1 while the timeline is held by hand; ticks that it lags behind the clock for that. */
  readonly heldSlot: number;
  readonly delaySlot: number;
  private readonly next: number;
  /** Slots: time of the timeline at which the next step came up; ticks that its condition has held; steps left out. */
  private readonly since: number;
  private readonly lasted: number;
  private readonly timeOuts: number;
  private readonly hold: Held[] = [];
  private readonly holdOf: Int32Array;
  private readonly tracePointers: number;
  private conditions: ScriptConditions | undefined;
  private readonly traceOver: Int32Array;
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
  private readonly signalTimeOuts: number;
  private readonly kindStep: number;
  private readonly kindFault: number;
  private readonly kindTimeOut: number;
  private readonly subjects: Int32Array;

  constructor(
    readonly spec: ScriptSpec,
    private readonly step: number,
    layout: BlockLayout,
    signals: SignalTable,
    events: EventCatalogue,
    private readonly targets: { find(path: string): number },
    /** Index of what an instrument ahead of the plant says, by path, or -1. */
    private readonly outputs: { find(path: string): number } = { find: () => -1 },
  ) {
    this.next = layout.add('scenario.next');
    this.heldSlot = layout.add('scenario.held');
    this.delaySlot = layout.add('scenario.delay');
    this.since = layout.add('scenario.since');
    this.lasted = layout.add('scenario.lasted');
    this.timeOuts = layout.add('scenario.timeOuts');
    const paths: string[] = [];
    this.holdOf = Int32Array.from(spec.steps, (one) => {
      if (one.target === '') return -1;
      let at = paths.indexOf(one.target);
      if (at < 0) {
        at = paths.length;
        paths.push(one.target);
        this.hold.push({
          path: one.target,
          slot: -1,
          signal: -1,
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
    this.traceOver = new Int32Array(spec.traces.length).fill(-1);
    this.traceSlots = new Int32Array(spec.traces.length);
    this.traceTicks = spec.traces.map((trace) => Float64Array.from(trace.points, (point) => point[0]));
    this.traceValues = spec.traces.map((trace) => Float64Array.from(trace.points, (point) => point[1]));
    this.driveTicks = Float64Array.from(spec.drive, (point) => point[0]);
    this.driveValues = Float64Array.from(spec.drive, (point) => point[1]);
    this.signalTime = signals.add(scenarioSignals.time);
    this.signalStep = signals.add(scenarioSignals.step);
    this.signalTarget = signals.add(scenarioSignals.targetSpeed);
    this.signalAhead = signals.add(scenarioSignals.targetSpeedAhead);
    this.signalTimeOuts = signals.add(scenarioSignals.timeOuts);
    this.signalRemaining = signals.add(scenarioSignals.remaining);
    this.kindStep = events.kind({ name: 'scenario step', severity: 'note', text: 'scenario: {subject}' });
    this.kindFault = events.kind({ name: 'fault', severity: 'warning', text: 'fault: {subject}, value {a}' });
    this.kindTimeOut = events.kind({
      name: 'scenario step left out',
      severity: 'error',
      text: 'scenario: left out after {a:s}, what it waits for did not come: {subject}',
    });
    this.subjects = Int32Array.from(spec.steps, (one) => events.subject(one.name));
  }

  /** Ties steps, traces and conditions to commands and signals, when all of them are known. Throws BuildError. */
  bind(signals: SignalTable): void {
    for (const held of this.hold) {
      held.slot = this.targets.find(held.path);
      held.signal = held.slot < 0 ? this.outputs.find(held.path) : -1;
    }
    this.traceSlots.set(this.spec.traces.map((trace) => this.targets.find(trace.target)));
    this.traceOver.set(this.spec.traces.map((trace) => (trace.over === undefined ? -1 : signals.find(trace.over))));
    this.conditions = new ScriptConditions(this.spec.conditions ?? [], signals, this.step);
  }

  /** What is remembered outside the block. */
  reset(): void {
    this.conditions?.reset();
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
      signals[this.signalAhead] = this.lookUp(
        block,
        pointers + count + 1,
        this.driveTicks,
        this.driveValues,
        at + spec.preview,
        true,
      );
    }
    for (let i = 0; i < count; i += 1) {
      const over = this.traceOver[i]!;
      block[this.traceSlots[i]!] = this.lookUp(
        block,
        pointers + i,
        this.traceTicks[i]!,
        this.traceValues[i]!,
        over < 0 ? at : signals[over]!,
        spec.traces[i]!.between === 'linear',
      );
    }
    if (tick < 0) return;
    this.conditions!.run(tick, signals);
    while (block[this.next]! < spec.steps.length && block[this.heldSlot] === 0) {
      const number = block[this.next]!;
      const step = spec.steps[number]!;
      const passed = now - block[this.since]!;
      if (step.at > now || (step.wait !== undefined && passed < step.wait)) break;
      let out = false;
      if (step.condition !== undefined) {
        const lasted = this.conditions!.holds(step.condition) ? block[this.lasted]! + 1 : 0;
        block[this.lasted] = lasted;
        if (lasted <= (step.lasting ?? 0)) {
          if (step.timeOut === undefined || passed < step.timeOut) break;
          out = true;
        }
      }
      if (out) {
        block[this.timeOuts] = block[this.timeOuts]! + 1;
        journal.event(tick, this.kindTimeOut, this.subjects[number]!, passed * this.step, 0, 0);
      } else {
        this.begin(block, number, step, now);
        const faulty = step.action === 'fault' || step.action === 'clear';
        journal.event(
          tick,
          faulty ? this.kindFault : this.kindStep,
          this.subjects[number]!,
          step.value,
          step.over * this.step,
          0,
        );
      }
      block[this.next] = number + 1;
      block[this.since] = now;
      block[this.lasted] = 0;
    }
    signals[this.signalStep] = block[this.next]!;
    signals[this.signalTimeOuts] = block[this.timeOuts]!;
  }

  /** In place of `run` behind the end of the run: the timeline stands, and the driver is to stop. */
  rest(signals: Float64Array): void {
    signals[this.signalTarget] = 0;
    signals[this.signalAhead] = 0;
    signals[this.signalRemaining] = 0;
  }

  /** What the steps hold of what instruments say: behind the instruments, ahead of what they drive. */
  applySignals(block: Float64Array, signals: Float64Array, tick: number): void {
    const now = tick - block[this.delaySlot]!;
    for (let i = 0; i < this.hold.length; i += 1) {
      const held = this.hold[i]!;
      if (held.signal >= 0) this.applyOne(block, held, signals, held.signal, now);
    }
  }

  /** What the steps hold, written over what messages and instruments said: just before the plant's step. */
  apply(block: Float64Array, tick: number): void {
    const now = tick - block[this.delaySlot]!;
    for (let i = 0; i < this.hold.length; i += 1) {
      const held = this.hold[i]!;
      if (held.slot >= 0) this.applyOne(block, held, block, held.slot, now);
    }
  }

  /** Into `to[at]`; a ramp and a hold begin at what stands there. */
  private applyOne(block: Float64Array, held: Held, to: Float64Array, at: number, now: number): void {
    const mode = block[held.mode]!;
    if (mode === modes.free) return;
    if (mode === modes.taking) {
      block[held.value] = to[at]!;
      block[held.mode] = modes.held;
    } else if (mode === modes.starting || mode === modes.ramping) {
      if (mode === modes.starting) block[held.from] = to[at]!;
      const passed = now - block[held.start]!;
      const over = block[held.over]!;
      const share = passed >= over ? 1 : passed / over;
      to[at] = block[held.from]! + share * (block[held.value]! - block[held.from]!);
      block[held.mode] = share === 1 ? modes.held : modes.ramping;
    } else {
      to[at] = block[held.value]!;
      if (mode === modes.clearing) block[held.mode] = modes.free;
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
        block[held.mode] = modes.taking;
        break;
      case 'clear':
        block[held.value] = step.value;
        block[held.mode] = modes.clearing;
        break;
      default:
        block[held.value] = step.value;
        block[held.start] = now;
        block[held.over] = step.over;
        block[held.mode] = step.over > 0 ? modes.starting : modes.held;
    }
  }

  private lookUp(
    block: Float64Array,
    pointer: number,
    ticks: Float64Array,
    values: Float64Array,
    tick: number,
    linear: boolean,
  ): number {
    let i = block[pointer]!;
    const last = ticks.length - 1;
    while (i < last && ticks[i + 1]! <= tick) i += 1;
    while (i > 0 && ticks[i]! > tick) i -= 1;
    block[pointer] = i;
    if (i >= last || tick <= ticks[i]! || !linear) return values[i]!;
    return values[i]! + ((values[i + 1]! - values[i]!) * (tick - ticks[i]!)) / (ticks[i + 1]! - ticks[i]!);
  }
}
