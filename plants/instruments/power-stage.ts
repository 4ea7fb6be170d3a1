import type { InstrumentKind, InstrumentSetup, InstrumentUpdate } from '../../runtime/instrument.js';

/**
 * The power electronics between a received request and an element's command: range, dead time, limited rate, and what
 * it does when its supply fails (`supply` below one half): falls to `restValue`, or holds.
 */
export const powerStage: InstrumentKind = {
  kind: 'power-stage',
  about: 'power stage: range, dead time, rate limit and behaviour without supply',
  source: 'common practice, no source',
  stage: 'before',
  inputs: {
    request: { unit: '1', about: 'the wanted value', anyUnit: true },
    supply: { unit: '1', about: '1 while it is supplied', optional: true },
  },
  outputs: { value: { unit: '1', about: 'the value that acts', unitOf: 'request' } },
  parameters: {
    least: { unit: 'input', about: 'lower end of its range' },
    most: { unit: 'input', about: 'upper end of its range' },
    deadTime: { unit: 's', about: 'dead time, a whole number of ticks', default: 0, least: 0, most: 2 },
    riseTime: { unit: 's', about: 'time from least to most; 0: at once', default: 0, least: 0 },
    fallTime: { unit: 's', about: 'time from most to least; 0: at once', default: 0, least: 0 },
    restValue: { unit: 'input', about: 'value without supply', default: 0 },
    atSupplyLoss: { unit: '1', about: 'what it does without supply', default: 0, choices: ['rest value', 'hold'] },
  },
  commands: {
    stuck: { unit: '1', about: '1: the value stays as it is', rest: 0, least: 0, most: 1, fault: true },
    dead: { unit: '1', about: '1: no supply whatever the input says', rest: 0, least: 0, most: 1, fault: true },
  },
  memory: {
    started: { unit: '1', about: '1 after the first tick' },
    value: { unit: '1', about: 'the value that acts' },
  },
  extraMemory: (parameter, step) => Math.round(parameter['deadTime']! / step),
  build,
};

function build({ parameter, input, output, memory, extra, command, step }: InstrumentSetup): InstrumentUpdate {
  const least = parameter['least']!;
  const most = parameter['most']!;
  const span = most - least;
  const rise = parameter['riseTime']! > 0 ? (span * step) / parameter['riseTime']! : Number.POSITIVE_INFINITY;
  const fall = parameter['fallTime']! > 0 ? (span * step) / parameter['fallTime']! : Number.POSITIVE_INFINITY;
  const rest = parameter['restValue']!;
  const holds = parameter['atSupplyLoss'] === 1;
  const length = Math.round(parameter['deadTime']! / step);
  const request = input['request']!;
  const supply = input['supply'] ?? -1;
  const out = output['value']!;
  const started = memory['started']!;
  const value = memory['value']!;
  const stuck = command['stuck']!;
  const dead = command['dead']!;
  return (block, signals, tick) => {
    const wanted = Math.min(Math.max(signals[request]!, least), most);
    const first = block[started] === 0;
    let delayed = wanted;
    if (length > 0) {
      const at = extra + (tick % length);
      if (first) for (let i = 0; i < length; i += 1) block[extra + i] = rest;
      delayed = block[at]!;
      block[at] = wanted;
    }
    if (first) block[value] = rest;
    block[started] = 1;
    const supplied = block[dead]! < 0.5 && (supply < 0 || signals[supply]! >= 0.5);
    const before = block[value]!;
    if (!supplied) {
      if (!holds) block[value] = rest;
    } else if (block[stuck]! < 0.5) {
      block[value] = Math.min(Math.max(delayed, before - fall), before + rise);
    }
    signals[out] = block[value]!;
  };
}
