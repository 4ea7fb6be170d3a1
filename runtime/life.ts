import type { BlockLayout } from './block.js';
import type { EventCatalogue, Journal } from './journal.js';
import { lifeSignals, lifeSwitches } from './own-signals.js';
import type { SignalTable } from './signals.js';

/** A step of the reset procedure: at so many ticks from the beginning of pre-roll or after-run. */
export interface ResetStep {
  readonly at: number;
  /** Path of a command or of a switch of the bench's life. */
  readonly target: string;
  readonly value: number;
}

/** What the controller sees: what the sensors say of the plant, or nothing. */
export type Frames = 'plant' | 'silence';

export interface LifeOptions {
  readonly supply: boolean;
  readonly key: boolean;
  readonly frames: { readonly preRoll: Frames; readonly afterRun: Frames };
  readonly reset: { readonly before: readonly ResetStep[]; readonly after: readonly ResetStep[] };
  readonly firstTick: number;
  readonly layout: BlockLayout;
  readonly signals: SignalTable;
  readonly events: EventCatalogue;
  /** Number under which the beginning of the after-run is journaled as an input: behind that of the hands. */
  readonly link: number;
}

/** What the life of the bench asks of the exchange. */
export interface Silenceable {
  setSilent(block: Float64Array, silent: boolean): void;
}

const phases = { preRoll: 0, running: 1, afterRun: 2 } as const;

/**
 * The life of the bench on the loop thread: pre-roll (ticks below zero, the plant stands), run, and after-run, in which the key is
 * off, the driver is to stop, nothing is judged and the plant goes on. The reset procedure runs from the beginning of the
 * pre-roll and of the after-run. When the after-run begins is not known beforehand (a run can be stopped): it is journaled as
 * an input, so that it can be derived again. All that is remembered stands in the block.
 */
export class Life {
  /** Slots of the switches by path, for scripts, hands and messages. */
  readonly targets: readonly (readonly [string, number])[];
  readonly shown: readonly { readonly slot: number; readonly signal: number }[];
  readonly phaseSlot: number;
  private readonly since: number;
  private readonly key: number;
  private readonly wakeUp: number;
  private before: Procedure = noProcedure;
  private after: Procedure = noProcedure;
  private readonly kind: number;
  private readonly subject: number;
  private readonly word = new Uint8Array(1).fill(1);

  constructor(private readonly options: LifeOptions) {
    const { layout, signals, events, supply, key } = options;
    const initial = { supply: supply ? 1 : 0, key: key ? 1 : 0, wakeUp: key ? 1 : 0, relay: 0, clear: 0 };
    const switches = Object.entries(lifeSwitches).map(([name, info]) => ({
      path: info.path,
      slot: layout.add(info.path, initial[name as keyof typeof initial]),
      signal: signals.add(info),
    }));
    this.targets = switches.map(({ path, slot }) => [path, slot] as const);
    this.key = switches[1]!.slot;
    this.wakeUp = switches[2]!.slot;
    // no phase yet: the first tick sees it change
    this.phaseSlot = layout.add(lifeSignals.phase.path, -1);
    this.since = layout.add('life.since', options.firstTick);
    this.shown = [...switches, { slot: this.phaseSlot, signal: signals.add(lifeSignals.phase) }];
    this.kind = events.kind({ name: 'after-run', severity: 'note', text: 'after-run: {subject}' });
    this.subject = events.subject('the run is over, the key is off');
  }

  /** Ties the reset procedure to its commands, when all of them are known. Paths were checked by who read them. */
  bind(find: (path: string) => number): void {
    this.before = procedure(this.options.reset.before, find);
    this.after = procedure(this.options.reset.after, find);
  }

  /** The run is over: what follows is after-run. Ahead of the tick that is to be the first of it. */
  beginAfterRun(block: Float64Array, tick: number, journal: Journal): void {
    journal.input(tick, this.options.link, this.word, 1);
    block[this.phaseSlot] = phases.afterRun;
    block[this.since] = tick;
    journal.event(tick, this.kind, this.subject, 0, 0, 0);
  }

  /** At the start of a tick: what it is part of. */
  begin(block: Float64Array, tick: number, exchange: Silenceable): void {
    if (block[this.phaseSlot] === phases.afterRun) {
      if (block[this.since] === tick) exchange.setSilent(block, this.options.frames.afterRun === 'silence');
      return;
    }
    const phase = tick < 0 ? phases.preRoll : phases.running;
    if (block[this.phaseSlot] === phase) return;
    block[this.phaseSlot] = phase;
    exchange.setSilent(block, phase === phases.preRoll && this.options.frames.preRoll === 'silence');
  }

  /** Whether the tick is one of the run: scripted and judged. */
  counts(block: Float64Array): boolean {
    return block[this.phaseSlot] === phases.running;
  }

  afterwards(block: Float64Array): boolean {
    return block[this.phaseSlot] === phases.afterRun;
  }

  /** What the procedure says, over what script and hands say: just before the plant's step. */
  apply(block: Float64Array, tick: number): void {
    const phase = block[this.phaseSlot];
    if (phase === phases.running) return;
    const since = tick - block[this.since]!;
    if (phase === phases.afterRun) {
      block[this.key] = 0;
      block[this.wakeUp] = 0;
      run(this.after, block, since);
    } else run(this.before, block, since);
  }
}

interface Procedure {
  readonly at: Int32Array;
  readonly slots: Int32Array;
  readonly values: Float64Array;
}

const noProcedure: Procedure = { at: new Int32Array(0), slots: new Int32Array(0), values: new Float64Array(0) };

function procedure(steps: readonly ResetStep[], find: (path: string) => number): Procedure {
  const sorted = [...steps].sort((a, b) => a.at - b.at);
  return {
    at: Int32Array.from(sorted, (step) => step.at),
    slots: Int32Array.from(sorted, (step) => find(step.target)),
    values: Float64Array.from(sorted, (step) => step.value),
  };
}

/** A step that came stays in force; a later one of the same target goes over it. */
function run({ at, slots, values }: Procedure, block: Float64Array, since: number): void {
  for (let i = 0; i < at.length && at[i]! <= since; i += 1) block[slots[i]!] = values[i]!;
}
