import type { InstrumentKind, InstrumentSetup, InstrumentUpdate } from '../../runtime/instrument.js';

/**
 * Terminals of an I/O box: what a sensor says as the voltage, current, frequency or duty cycle on its wire, and what
 * stands on a wire as a request. Straight lines between two points, as data sheets of transmitters give them.
 */
interface TerminalSort {
  readonly quantity: string;
  readonly unit: string;
  /** Electrical values at both ends of the range, and on a wire shorted to ground, to supply, or broken. */
  readonly low: number;
  readonly high: number;
  readonly ground: number;
  readonly supply: number;
}

const sorts = {
  // ratiometric 0.5 .. 4.5 V of 5 V, as most pressure transmitters of vehicles have it: common practice, no source
  voltage: { quantity: 'voltage', unit: 'V', low: 0.5, high: 4.5, ground: 0, supply: 5 },
  // IEC 60381-1: 4 .. 20 mA
  current: { quantity: 'current', unit: 'A', low: 0.004, high: 0.02, ground: 0, supply: 0.0225 },
  frequency: { quantity: 'frequency', unit: 'Hz', low: 0, high: 5000, ground: 0, supply: 0 },
  duty: { quantity: 'duty cycle of a pulse-width modulation', unit: '1', low: 0.1, high: 0.9, ground: 0, supply: 1 },
} as const satisfies Record<string, TerminalSort>;

const wire = (unit: string) => (about: string, usual: number) => ({ unit, about, default: usual, least: 0 });

function outputTerminal(name: keyof typeof sorts): InstrumentKind {
  const { quantity, unit, low, high, ground, supply } = sorts[name];
  const on = wire(unit);
  return {
    kind: `${name}-output`,
    about: `terminal of an I/O box: a sensor's value as a ${quantity}`,
    source: name === 'current' ? 'IEC 60381-1 (4 to 20 mA)' : 'common practice, no source',
    stage: 'after',
    inputs: { of: { unit: '1', about: 'what the sensor says', anyUnit: true } },
    outputs: { [name]: { unit, about: `${quantity} on the wire` } },
    parameters: {
      least: { unit: 'input', about: 'value at the lower end' },
      most: { unit: 'input', about: 'value at the upper end' },
      low: on(`${quantity} at the lower end`, low),
      high: on(`${quantity} at the upper end`, high),
      ground: on(`${quantity} with the wire shorted to ground`, ground),
      supply: on(`${quantity} with the wire shorted to supply`, supply),
      open: on(`${quantity} with the wire broken: what the input's resistor pulls it to`, ground),
    },
    commands: {
      shortToGround: { unit: '1', about: '1: the wire is shorted to ground', rest: 0, least: 0, most: 1, fault: true },
      shortToSupply: { unit: '1', about: '1: the wire is shorted to supply', rest: 0, least: 0, most: 1, fault: true },
      broken: { unit: '1', about: '1: the wire is broken', rest: 0, least: 0, most: 1, fault: true },
      series: {
        unit: '1',
        about: 'share of the signal that a bad contact takes away',
        rest: 0,
        least: 0,
        most: 1,
        fault: true,
      },
    },
    memory: {},
    build: ({ parameter, input, output, command }: InstrumentSetup): InstrumentUpdate => {
      const least = parameter['least']!;
      const slope = (parameter['high']! - parameter['low']!) / (parameter['most']! - least);
      const base = parameter['low']!;
      const atGround = parameter['ground']!;
      const atSupply = parameter['supply']!;
      const atOpen = parameter['open']!;
      // What a transmitter can drive: between the two rails, or from zero on where there is no upper one.
      const top = Math.max(atSupply, parameter['high']!, base);
      const from = input['of']!;
      const out = output[name]!;
      const { shortToGround, shortToSupply, broken, series } = command;
      return (block, signals) => {
        const said = (base + slope * (signals[from]! - least)) * (1 - block[series!]!);
        signals[out] = Math.min(Math.max(said, 0), top);
        if (block[broken!]! >= 0.5) signals[out] = atOpen;
        if (block[shortToSupply!]! >= 0.5) signals[out] = atSupply;
        if (block[shortToGround!]! >= 0.5) signals[out] = atGround;
      };
    },
  };
}

function inputTerminal(name: keyof typeof sorts): InstrumentKind {
  const { quantity, unit, low, high } = sorts[name];
  const on = wire(unit);
  return {
    kind: `${name}-input`,
    about: `terminal of an I/O box: a ${quantity} from the controller as a request`,
    source: name === 'current' ? 'IEC 60381-1 (4 to 20 mA)' : 'common practice, no source',
    stage: 'before',
    inputs: { of: { unit, about: `${quantity} on the wire` } },
    outputs: { value: { unit: '1', about: 'the request' } },
    parameters: {
      least: { unit: '1', about: 'request at the lower end', default: 0 },
      most: { unit: '1', about: 'request at the upper end', default: 1 },
      low: on(`${quantity} at the lower end`, low),
      high: on(`${quantity} at the upper end`, high),
      dead: on(`${quantity} below which the request is \`rest\`: the wire is broken`, low / 2),
      rest: { unit: '1', about: 'request with a broken wire', default: 0 },
    },
    memory: {},
    build: ({ parameter, input, output }: InstrumentSetup): InstrumentUpdate => {
      const least = parameter['least']!;
      const most = parameter['most']!;
      const base = parameter['low']!;
      const slope = (most - least) / (parameter['high']! - base);
      const dead = parameter['dead']!;
      const rest = parameter['rest']!;
      const lower = Math.min(least, most);
      const upper = Math.max(least, most);
      const from = input['of']!;
      const out = output['value']!;
      return (_block, signals) => {
        const asked = least + slope * (signals[from]! - base);
        signals[out] = Math.min(Math.max(asked, lower), upper);
        if (signals[from]! < dead) signals[out] = rest;
      };
    },
  };
}

export const voltageOutput = outputTerminal('voltage');
export const currentOutput = outputTerminal('current');
export const frequencyOutput = outputTerminal('frequency');
export const dutyOutput = outputTerminal('duty');
export const voltageInput = inputTerminal('voltage');
export const currentInput = inputTerminal('current');
export const frequencyInput = inputTerminal('frequency');
export const dutyInput = inputTerminal('duty');
