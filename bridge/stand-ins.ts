import type { BlockLayout } from '../runtime/block.js';
import type { SignalTable } from '../runtime/signals.js';
import type { MessageSpec } from './message-map.js';
import type { SentMessage } from './sent-message.js';
import { ValueProgram } from './value-program.js';

/** The command `unit.standIn` of every control unit that the bench stands in for. */
export const standIn = {
  name: 'standIn',
  unit: '1',
  about: '1: the bench sends the messages of this control unit; 0: it does not, the real one is there',
  least: 0,
  most: 1,
} as const;

/** Names of the control units that the messages stand in for, in the order of the map. */
export function unitsStoodFor(messages: readonly MessageSpec[]): string[] {
  return [
    ...new Set(
      messages.flatMap((message) =>
        message.direction === 'sent' && message.standsFor !== undefined ? [message.standsFor] : [],
      ),
    ),
  ];
}

/**
 * What absent control units say: values by expressions, and which messages are kept from going in a tick, because their
 * control unit was taken out or the condition under which they go does not hold. Allocates nothing in a tick.
 */
export class StandIns {
  /** Command slot by control unit. */
  readonly slots: ReadonlyMap<string, number>;
  private readonly program = new ValueProgram();
  /** Per sender: slot of its control unit's command, register of its condition, or -1. */
  private readonly unitSlots: Int32Array;
  private readonly conditions: Int32Array;
  /** Per expression: register, place among the values to send, and its scaling to the unit of the map. */
  private readonly registers: Int32Array;
  private readonly places: Int32Array;
  private readonly scales: Float64Array;
  private readonly offsets: Float64Array;

  constructor(
    private readonly senders: readonly SentMessage[],
    layout: BlockLayout,
    signals: SignalTable,
    without: readonly string[],
  ) {
    const messages = senders.map((sender) => sender.message);
    this.slots = new Map(
      unitsStoodFor(messages).map((unit) => [
        unit,
        layout.add(`${unit}.${standIn.name}`, without.includes(unit) ? 0 : 1),
      ]),
    );
    const find = (path: string): number => signals.find(path);
    this.unitSlots = Int32Array.from(messages, ({ standsFor }) =>
      standsFor === undefined ? -1 : this.slots.get(standsFor)!,
    );
    this.conditions = Int32Array.from(messages, (message) =>
      message.while === undefined ? -1 : this.program.condition(message.while, find),
    );
    const said = messages
      .flatMap((message) => message.signals)
      .flatMap((signal, place) =>
        signal.expression === undefined
          ? []
          : [{ signal, place, register: this.program.expression(signal.expression, find) }],
      );
    this.program.seal();
    this.registers = Int32Array.from(said, (one) => one.register);
    this.places = Int32Array.from(said, (one) => one.place);
    this.scales = Float64Array.from(said, ({ signal }) => 1 / signal.unitScale);
    this.offsets = Float64Array.from(said, ({ signal }) => -signal.unitOffset / signal.unitScale);
  }

  /** Writes the values of expressions among those to send, and mutes what is not to go in this tick. */
  prepare(block: Float64Array, signals: Float64Array, tick: number, units: Float64Array): void {
    const { program, registers, places, scales, offsets, senders, unitSlots, conditions } = this;
    program.run(signals);
    const values = program.registers;
    for (let i = 0; i < registers.length; i += 1) units[places[i]] = values[registers[i]] * scales[i] + offsets[i];
    for (let i = 0; i < senders.length; i += 1) {
      const out = unitSlots[i] >= 0 && block[unitSlots[i]] < 0.5;
      const waits = conditions[i] >= 0 && values[conditions[i]] < 0.5;
      senders[i].mute(block, tick, out || waits);
    }
  }
}
