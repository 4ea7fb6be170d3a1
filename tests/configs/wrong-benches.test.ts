import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { memoryFiles } from '../../configs/files.js';
import { BuildError, problemText } from '../../runtime/contract.js';
import { catalogue } from './catalogue.js';
import { smallBench } from './small-bench.js';

/** Error texts of a bench file, all of them. */
function complaints(text: string, more: Record<string, string> = {}): string[] {
  try {
    readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text, ...more }));
  } catch (error) {
    if (!(error instanceof BuildError)) throw error;
    return error.problems.map(problemText);
  }
  return ['accepted'];
}

/** The small bench with one text replaced by another. */
function changed(from: string, to: string): string {
  expect(smallBench.split(from)).toHaveLength(2);
  return smallBench.replace(from, to);
}

const cases: readonly (readonly [string, string, string, readonly string[]])[] = [
  [
    'no unit',
    'volume: 50 L',
    'volume: 50',
    [
      'bench.yaml:10:47 stores.highAccumulator.volume: no unit, 50, write a volume with its unit, for example 50 L or 110 cm3',
    ],
  ],
  [
    'no reference',
    'precharge: 150 bar(g) at 20 degC',
    'precharge: 150 bar at 20 degC',
    [
      'bench.yaml:10:64 stores.highAccumulator.precharge: pressure without (a) or (g), 150 bar, write 150 bar(a) for absolute or 150 bar(g) for gauge pressure',
    ],
  ],
  [
    'wrong dimension',
    'inertia: 0.9 kg m2',
    'inertia: 0.9 kg',
    [
      'bench.yaml:18:36 stores.propShaft.inertia: a mass where a moment of inertia belongs, 0.9 kg, write it as in 0.9 kg m2',
    ],
  ],
  [
    'wrong condition',
    '150 bar(g) at 20 degC',
    '150 bar(g) at 20 L',
    [
      'bench.yaml:10:64 stores.highAccumulator.precharge: a volume where a temperature belongs, 20 L, write it as in 20 degC',
    ],
  ],
  [
    'condition not taken',
    'inertia: 0.9 kg m2',
    'inertia: 0.9 kg m2 at 20 degC',
    [
      'bench.yaml:18:36 stores.propShaft.inertia: a condition that this parameter does not take, 0.9 kg m2 at 20 degC, leave away: at 20 degC',
    ],
  ],
  [
    'unknown key',
    'maximumAllowable: 350',
    'maximumAllowabel: 350',
    ['bench.yaml:15:5 stores.highLine.maximumAllowabel: unknown key, did you mean maximumAllowable?'],
  ],
  [
    'unknown kind',
    'is: shaft',
    'is: shaftt',
    ['bench.yaml:18:20 stores.propShaft.is: unknown kind of store, shaftt, did you mean shaft?'],
  ],
  [
    'branch among stores',
    'is: shaft',
    'is: valve',
    ['bench.yaml:18:20 stores.propShaft.is: valve is a branch, move it to branches:'],
  ],
  [
    'missing parameter',
    ', opens: 30 ms',
    '',
    ['bench.yaml:20:3 branches.isolation.opens: missing, add opens: a number in s (opening time)'],
  ],
  [
    'no kind',
    'is: shaft, ',
    '',
    [
      'bench.yaml:18:3 stores.propShaft.is: missing, add is: and a kind of store, such as volume, accumulator, shaft, joint',
    ],
  ],
  [
    'unknown fluid',
    'fluid: oil',
    'fluid: water',
    ['bench.yaml:13:12 stores.highLine.fluid: unknown fluid, water, use one of oil'],
  ],
  [
    'unconnected',
    'from: highAccumulator, to: highLine, opens',
    'to: highLine, opens',
    [
      'bench.yaml:20:3 branches.isolation.from: port not connected (oil), add from: and one of highAccumulator, highLine, lowLine',
    ],
  ],
  [
    'unknown store',
    'low: lowLine.oil',
    'low: lowLin',
    ['bench.yaml:22:50 branches.pumpMotor.low: unknown store, lowLin, did you mean lowLine?'],
  ],
  [
    'unknown port',
    'low: lowLine.oil',
    'low: lowLine.gas',
    ['bench.yaml:22:50 branches.pumpMotor.low: lowLine has no port gas, lowLine.gas, use one of oil'],
  ],
  [
    'kind mismatch',
    'low: lowLine.oil',
    'low: propShaft',
    [
      'bench.yaml:22:50 branches.pumpMotor.low: an oil port tied to a store without one, propShaft, tie it to one of highAccumulator, highLine, lowLine',
    ],
  ],
  [
    'kind mismatch port',
    'low: lowLine.oil',
    'low: highAccumulator.wall',
    [
      'bench.yaml:22:50 branches.pumpMotor.low: an oil port tied to a heat port, highAccumulator.wall, use highAccumulator.oil',
    ],
  ],
  [
    'ratio on oil',
    'low: lowLine.oil',
    'low: { to: lowLine, ratio: 2 }',
    [
      'bench.yaml:22:72 branches.pumpMotor.low.ratio: a ratio on an oil port, leave it away: only shafts turn at a ratio',
    ],
  ],
  [
    'ratio zero',
    'ratio: 1.4',
    'ratio: 0',
    [
      'bench.yaml:22:94 branches.pumpMotor.shaft.ratio: ratio is zero, write how many turns the branch makes per turn of the store',
    ],
  ],
  [
    'connection odd',
    'low: lowLine.oil',
    'low: [lowLine]',
    ['bench.yaml:22:50 branches.pumpMotor.low: not the name of a store, write low: store or low: store.port'],
  ],
  [
    'name',
    'propShaft: {',
    'prop_shaft: {',
    [
      'bench.yaml:18:3 stores.prop_shaft: not a name, prop_shaft, use letters and digits, such as propShaft',
      'bench.yaml:22:70 branches.pumpMotor.shaft: unknown store, propShaft, did you mean prop_shaft?',
      'bench.yaml:36:27 messages.sensors.signals.shaftSpeed.from: unknown signal, propShaft.speed, did you mean prop_shaft.speed?',
    ],
  ],
  [
    'name twice',
    'isolation: {',
    'highLine: {',
    [
      'bench.yaml:20:3 branches.highLine: name is taken, rename one of the two (the other is at bench.yaml:11)',
      'bench.yaml:25:61 instruments.valveStage.drives: unknown command, isolation.opening, did you mean highLine.opening?',
    ],
  ],
  [
    'name reserved',
    'valveStage: {',
    'timing: {',
    ['bench.yaml:25:3 instruments.timing: name is reserved for the runtime, choose another name'],
  ],
  [
    'relief',
    'cracking: 330 bar(g)',
    'cracking: 355 bar(g)',
    [
      'bench.yaml:21:58 branches.mainRelief.cracking: relief setting above the maximum allowable pressure, 355 bar(g), PS of highLine is 350 bar(g), set it to 350 bar(g) or below',
    ],
  ],
  [
    'separator',
    'precharge: 150 bar(g)',
    'precharge: 0.5 bar(g)',
    ['bench.yaml:10:53 stores.highAccumulator.precharge: precharge below what a bladder bears, use at least 2 bar(a)'],
  ],
  [
    'choice',
    'separator: bladder',
    'separator: blader',
    ['bench.yaml:10:98 stores.highAccumulator.separator: unknown choice, blader, did you mean bladder?'],
  ],
  [
    'too small',
    'volume: 0.8 L',
    'volume: 0.8 mL',
    ['bench.yaml:14:13 stores.highLine.volume: too small, 0.8 mL, at least 10 mL, use a larger value'],
  ],
  [
    'sensor unknown',
    'of: highLine.pressure',
    'of: highLine.presure',
    [
      'bench.yaml:24:41 instruments.highPressureSensor.of: unknown signal, highLine.presure, did you mean highLine.pressure or highLine.mass?',
    ],
  ],
  [
    'sensor range',
    'range: 0 .. 400 bar(g)',
    'range: 0 .. 400 degC',
    [
      'bench.yaml:24:67 instruments.highPressureSensor.range: a temperature where a pressure belongs, 400 degC, write it as in 150 bar(g) or 16 MPa(a)',
    ],
  ],
  [
    'drives unknown',
    'drives: isolation.opening',
    'drives: isolation.open',
    [
      'bench.yaml:25:61 instruments.valveStage.drives: unknown command, isolation.open, did you mean isolation.opening?',
    ],
  ],
  [
    'drives not command',
    'drives: isolation.opening',
    'drives: isolation.flow',
    ['bench.yaml:25:61 instruments.valveStage.drives: isolation.flow is a reading, isolation.flow, name a command'],
  ],
  [
    'driven twice',
    'drives: isolation.opening }',
    'drives: isolation.opening }\n  otherStage: { is: stage, request: requests.valve, drives: isolation.opening }',
    [
      'bench.yaml:26:61 instruments.otherStage.drives: isolation.opening is driven twice, let one of the two drive it (the other is instruments.valveStage.drives at bench.yaml:25)',
    ],
  ],
  [
    'driven by message',
    'valve: { unit',
    'valve: { to: isolation.opening, unit',
    [
      'bench.yaml:44:20 messages.requests.signals.valve.to: isolation.opening is driven twice, let one of the two drive it (the other is instruments.valveStage.drives at bench.yaml:25)',
    ],
  ],
  [
    'cycle',
    'every: 10 ms\n    phase',
    'every: 10.5 ms\n    phase',
    ['bench.yaml:32:12 messages.sensors.every: not a multiple of the step, 10.5 ms, step 1 ms, use 10 ms or 11 ms'],
  ],
  [
    'phase',
    'phase: 2 ms',
    'phase: 12 ms',
    [
      'bench.yaml:29:3 messages.sensors: the phase lies outside the cycle, 12 ticks, 0 to 9 ticks, reduce it by the cycle',
    ],
  ],
  [
    'sent unit',
    'unit: bar(g), range: 0 .. 400,',
    'unit: bar, range: 0 .. 400,',
    [
      'bench.yaml:35:61 messages.sensors.signals.highPressure.unit: pressure without (a) or (g), bar, write bar(a) for absolute or bar(g) for gauge pressure',
    ],
  ],
  [
    'sent unit dim',
    'unit: rpm, range: -4000 .. 4000 rpm',
    'unit: km/h, range: 0 .. 4',
    [
      'bench.yaml:36:50 messages.sensors.signals.shaftSpeed.unit: km/h is a speed, wanted is an angular speed, km/h, use a unit as in 1450 rpm',
    ],
  ],
  [
    'range type',
    'type: u16, scale: 0.01',
    'type: u8',
    [
      'bench.yaml:35:7 messages.sensors.highPressure: the range does not fit u8, 400 bar(g), 0 .. 255 bar(g), take a wider type or another scale',
    ],
  ],
  [
    'substitute',
    'range: -600 .. 600, substitute: 0',
    'range: -600 .. 600, substitute: 700',
    [
      'bench.yaml:43:7 messages.requests.torque: the substitute lies outside the range, 700 N m, -600 .. 600 N m, choose one inside',
    ],
  ],
  ['no timeout', '    timeout: 50 ms\n', '', ['bench.yaml:37:3 messages.requests.timeout: missing, add timeout: 5 ms']],
  [
    'link unknown',
    '    id: 1\n',
    '    id: 1\n    link: power\n',
    ['bench.yaml:32:11 messages.sensors.link: unknown link, power, use one of powertrain'],
  ],
  [
    'id twice',
    'id: 2',
    'id: 1',
    [
      'bench.yaml:37:3 messages.requests: the number is taken on this link, 1, by sensors, number the messages of a link apart',
    ],
  ],
  [
    'direction',
    'direction: received',
    'direction: in',
    ['bench.yaml:38:16 messages.requests.direction: unknown choice, in, use one of sent, received'],
  ],
  [
    'watch signal',
    'lowLine.pressure: {',
    'lowLine.presure: {',
    [
      'bench.yaml:47:3 watch.lowLine.presure: unknown signal, lowLine.presure, did you mean lowLine.pressure or lowLine.mass?',
    ],
  ],
  [
    'watch level',
    'level: below least inlet',
    'level: below',
    [
      'bench.yaml:47:47 watch.lowLine.pressure.level: unknown choice, below, use one of near relief, relief passing, above maximum, above 1.1 maximum, below precharge, below least inlet, over speed, over temperature, end of travel, level low, case pressure, not following, locked',
    ],
  ],
  [
    'record',
    "'*.speed'",
    'propShaft.sped',
    ['bench.yaml:58:30 record.signals: no such signal, propShaft.sped, did you mean propShaft.speed?'],
  ],
  [
    'frames',
    'preRoll: silence',
    'preRoll: quiet',
    ['bench.yaml:53:22 life.frames.preRoll: unknown choice, quiet, use one of plant, silence'],
  ],
  [
    'after-run frames',
    'afterRun: plant',
    'warmUp: plant',
    ['bench.yaml:53:31 life.frames.warmUp: unknown key, use one of preRoll, afterRun'],
  ],
  [
    'reset too late',
    'at: 50 ms',
    'at: 250 ms',
    [
      'bench.yaml:55:60 life.reset.before[1].at: behind the end of preRoll, 0.25 s, 0.2 s, make life.preRoll longer, or do it earlier',
    ],
  ],
  [
    'reset of nothing',
    'at: 100 ms, set: life.supply',
    'at: 100 ms, set: highLine.pressure',
    [
      'bench.yaml:56:32 life.reset.after[0].set: highLine.pressure is a reading, highLine.pressure, name a command or run',
    ],
  ],
  ['step', 'step: 1 ms', 'step: 1 s', ['bench.yaml:3:7 step: too large, 1 s, at most 0.02 s, use a smaller value']],
  [
    'duty',
    'duty: round.yaml',
    'duty: ../round.yaml',
    ['bench.yaml:59:7 duty: outside the folder of the bench, ../round.yaml, move the file into the folder'],
  ],
  ['top key', 'duty: round', 'dutty: round', ['bench.yaml:59:1 dutty: unknown key, did you mean duty?']],
  [
    'alias',
    'fluid: oil',
    'fluid: *oil',
    ['bench.yaml:13:12 stores.highLine.fluid: aliases are not used here, *oil, write the value out'],
  ],
  [
    'anchor',
    'fluid: oil',
    'fluid: &x oil',
    ['bench.yaml:13:15 stores.highLine.fluid: anchors are not used here, &x, leave it away'],
  ],
  [
    'merge',
    'fluid: oil',
    '<<: { fluid: oil }',
    ['bench.yaml:13:5 stores.highLine.<<: merge keys are not used here, write the values out'],
  ],
  [
    'duplicate',
    'fluid: oil\n',
    'fluid: oil\n    fluid: oil\n',
    ['bench.yaml:14:5 stores.highLine.fluid: said twice, keep one of them (the other is at line 13)'],
  ],
  [
    'tag',
    'fluid: oil',
    'fluid: !!binary oil',
    [
      'bench.yaml:13:21 stores.highLine.fluid: a value of a kind that is not used here, write a text, a number, a list or a mapping',
    ],
  ],
  [
    'tab',
    '    fluid: oil',
    '\tfluid: oil',
    ['bench.yaml:13:1 yaml: tabs are not allowed as indentation, indent with spaces'],
  ],
  [
    'colon',
    '    fluid: oil',
    '    fluid oil',
    ['bench.yaml:13:5 yaml: a line that is no `key: value`, check the colon and the space behind it'],
  ],
  [
    'section is a list',
    'ambient: { temperature: 25 degC }',
    'ambient: [25 degC]',
    ['bench.yaml:5:10 ambient: a list where keys belong, write `key: value` pairs below it'],
  ],
  [
    'budget',
    'lateness: 150 us',
    'lateness: -150 us',
    ['bench.yaml:6:22 budgets.lateness: too small, -150 us, at least 0 us, use a larger value'],
  ],
  [
    'address',
    '127.0.0.1:47111',
    'localhost',
    [
      'bench.yaml:27:58 links.powertrain.remote: not an IPv4 address with a port, localhost, write it as in 127.0.0.1:47111',
    ],
  ],
  [
    'include outside',
    'duty: round.yaml',
    'include: ../other.yaml',
    ['bench.yaml:59:10 include: outside the folder of the bench, ../other.yaml, move the file into the folder'],
  ],
  [
    'include absent',
    'duty: round.yaml',
    'include: other.yaml',
    ['bench.yaml:59:10 include: no such file, other.yaml, check the name'],
  ],
  [
    'include self',
    'duty: round.yaml',
    'include: bench.yaml',
    ['bench.yaml:59:10 include: file included twice, bench.yaml, include each file once'],
  ],
  [
    'two docs',
    'duty: round.yaml',
    '---\nduty: round.yaml',
    ['bench.yaml:59:1 yaml: more than one document in the file, put it into a file of its own and include that'],
  ],
  [
    'start key',
    'temperature: 40 degC',
    'temprature: 40 degC',
    ['bench.yaml:16:36 stores.highLine.start.temprature: unknown key, did you mean temperature?'],
  ],
  [
    'controller',
    'command: node controller.js,',
    'module: a.js, command: b,',
    ['bench.yaml:57:38 controller.command: a module and a command, keep one of the two: --controller takes the other'],
  ],
  [
    'store as branch',
    'to: highLine, opens',
    'to: mainRelief, opens',
    [
      'bench.yaml:20:54 branches.isolation.to: unknown store, mainRelief, use one of highAccumulator, highLine, lowLine, propShaft',
    ],
  ],
  [
    'a signal of another unit',
    'request: requests.valve',
    'request: highLine.pressure',
    [
      'bench.yaml:25:37 instruments.valveStage.request: signal in Pa where one in 1 belongs, highLine.pressure, name a signal in 1',
    ],
  ],
];

describe('one wrong statement, one message', () => {
  it.each(cases)('%s', (_title, from, to, messages) => {
    expect(complaints(changed(from, to))).toEqual(messages);
  });
});

describe('several wrong statements', () => {
  it('are all reported at once, in the order of the file', () => {
    const text = smallBench
      .replace('volume: 50 L', 'volume: 50')
      .replace('inertia: 0.9 kg m2', 'inertia: 0.9 kg')
      .replace('cracking: 330 bar(g)', 'cracking: 330 bar')
      .replace('of: highLine.pressure', 'of: highLine.presure')
      .replace('every: 10 ms\n    phase', 'every: 10.5 ms\n    phase')
      .replace('duty: round', 'dutty: round');
    expect(complaints(text).map((line) => line.slice(0, line.indexOf(',')))).toEqual([
      'bench.yaml:10:47 stores.highAccumulator.volume: no unit',
      'bench.yaml:18:36 stores.propShaft.inertia: a mass where a moment of inertia belongs',
      'bench.yaml:21:68 branches.mainRelief.cracking: pressure without (a) or (g)',
      'bench.yaml:24:41 instruments.highPressureSensor.of: unknown signal',
      'bench.yaml:32:12 messages.sensors.every: not a multiple of the step',
      'bench.yaml:59:1 dutty: unknown key',
    ]);
  });

  it('name their own file', () => {
    const text = smallBench.replace('volume: 50 L', 'volume: 50').replace('duty: round.yaml', 'include: extra.yaml');
    expect(
      complaints(text, {
        'extra.yaml': 'stores:\n  spare: { is: volume, volume: 1 kg }\n  lowLine: { is: volume }\nstep: 2 ms\n',
      }),
    ).toEqual([
      'bench.yaml:10:47 stores.highAccumulator.volume: no unit, 50, write a volume with its unit, for example 50 L or 110 cm3',
      'extra.yaml:2:32 stores.spare.volume: a mass where a volume belongs, 1 kg, write it as in 50 L or 110 cm3',
      'extra.yaml:3:3 stores.lowLine: said twice, keep one of them (the other is at bench.yaml:17)',
      'extra.yaml:4:1 step: said twice, keep one of them (the other is at bench.yaml:3)',
    ]);
  });
});

describe('messages on CAN', () => {
  const from = smallBench.indexOf('links:');
  const can = `${smallBench.slice(0, from)}links:
  bus: { is: can, interface: can0, bitRate: 500 kbit/s }
messages:
  sensors:
    direction: sent
    id: 0x101
    every: 10 ms
    bytes: 4
    signals:
      highPressure: { from: highPressureSensor, unit: bar(g), range: 0 .. 400, can: { start: 0, length: 16, scale: 0.01 } }
      shaftSpeed: { from: propShaft.speed, unit: rpm, range: -4000 .. 4000, can: { start: 23, length: 16, order: big, signed: on } }
  requests:
    direction: received
    id: 0x201
    every: 10 ms
    timeout: 50 ms
    bytes: 8
    protection: { is: counter, start: 60, length: 4 }
    signals:
      valve: { unit: '%', range: 0 .. 100, substitute: 0 %, can: { start: 0, length: 8 } }
`;

  it('are read with their layout', () => {
    const { map } = readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': can }));
    expect(map.links).toEqual([{ name: 'bus', kind: 'can', interface: 'can0', bitRate: 500_000 }]);
    expect(map.messages[0]).toMatchObject({ identifier: 0x101, bytes: 4 });
    expect(map.messages[0]!.signals.map((signal) => signal.can)).toEqual([
      { startBit: 0, length: 16, byteOrder: 'little', signed: false, float: false, scale: 0.01, offset: 0 },
      { startBit: 23, length: 16, byteOrder: 'big', signed: true, float: false, scale: 1, offset: 0 },
    ]);
    expect(map.messages[1]!.protection).toEqual({ kind: 'counter', settings: { start: 60, length: 4 } });
  });

  it.each([
    [
      'start: 23',
      'start: 15',
      'bench.yaml:36:82 messages.sensors.signals.shaftSpeed.can: bits shared with highPressure, bits 8 to 23, bit 15 is taken, move one of the two',
    ],
    [
      'start: 23',
      'start: 31',
      'bench.yaml:36:82 messages.sensors.signals.shaftSpeed.can: signal beyond the payload, bits 24 to 39, 4 bytes, move it or make the message longer',
    ],
    [
      'length: 16, scale: 0.01',
      'length: 12, scale: 0.01',
      'bench.yaml:35:85 messages.sensors.signals.highPressure.can: the range does not fit 12 bits, 0 .. 400 bar(g), 0 .. 40.95 bar(g), take more bits or another scale and offset',
    ],
    [
      'id: 0x101',
      'id: 0x801',
      'bench.yaml:31:9 messages.sensors.id: too large, 0x801, at most 2047, use a smaller number',
    ],
    ['    bytes: 4\n', '', 'bench.yaml:29:3 messages.sensors.bytes: missing, add bytes: 0'],
    [
      'interface: can0',
      'interface: a-name-that-is-too-long',
      'bench.yaml:27:30 links.bus.interface: not the name of an interface, a-name-that-is-too-long, use at most 15 characters, such as can0',
    ],
    [
      ', can: { start: 0, length: 8 }',
      '',
      'bench.yaml:45:7 messages.requests.signals.valve.can: missing, add can: and its keys below it',
    ],
  ])('%s -> %s', (was, becomes, message) => {
    expect(can.split(was)).toHaveLength(2);
    expect(complaints(can.replace(was, becomes))).toEqual([message]);
  });
});

describe('files that are no bench', () => {
  it.each([
    ['nothing', '', 'bench.yaml:1:1 file: nothing in it, write a mapping of keys and values'],
    ['a list', '- a\n- b\n', 'bench.yaml:1:1 file: not a mapping, write `key: value` lines'],
    ['words', 'just words', 'bench.yaml:1:1 file: not a mapping, write `key: value` lines'],
    ['anchors', 'a: &a [1]\nb: [*a, *a]\n', 'bench.yaml:1:7 a: anchors are not used here, &a, leave it away'],
    ['aliases', 'a: &a [1]\nb: [*a, *a]\n', 'bench.yaml:2:5 b[0]: aliases are not used here, *a, write the value out'],
    ['deep mappings', '{a: '.repeat(40) + '}'.repeat(40), 'nested too deep, nest at most 24 levels'],
    ['very deep lists', '['.repeat(100_000), 'nested too deep, nest at most 24 levels'],
    ['a huge text', 'x'.repeat(2_000_001), 'bench.yaml:1:1 file: file too large, keep it below 2000000 characters'],
    [
      'an open bracket',
      'bench: [1\n',
      'yaml: flow sequence in block collection must be sufficiently indented and end with a ]',
    ],
  ])('%s', (_title, text, message) => {
    const got = complaints(text);
    expect(
      got.find((line) => line.includes(message)),
      got.join('\n').slice(0, 500),
    ).toBeDefined();
  });

  it('does not take endless includes', () => {
    const more: Record<string, string> = {};
    for (let i = 0; i < 80; i += 1) more[`f${i}.yaml`] = `include: f${i + 1}.yaml\n`;
    expect(complaints('include: f0.yaml\n', more).some((line) => line.includes('too many files, use at most 64'))).toBe(
      true,
    );
  });

  it('does not mistake what every object has for something of the catalogue', () => {
    for (const word of ['constructor', 'toString', '__proto__', 'hasOwnProperty']) {
      expect(complaints(smallBench.replace('is: shaft', `is: ${word}`))[0]).toContain('unknown kind of store');
      expect(complaints(smallBench.replace('inertia: 0.9 kg m2', `inertia: 0.9 kg m2, ${word}: 1`))).toEqual([
        `bench.yaml:18:47 stores.propShaft.${word}: unknown key, use one of is, about, inertia`,
      ]);
      expect(complaints(smallBench.replace('low: lowLine.oil', `low: ${word}`))[0]).toContain('unknown store');
      expect(complaints(smallBench.replace('low: lowLine.oil', `low: lowLine.${word}`))[0]).toContain(
        `lowLine has no port ${word}`,
      );
      expect(complaints(smallBench.replace('fluid: oil', `fluid: ${word}`))[0]).toContain('unknown fluid');
    }
  });
});
