import { beforeAll, describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { z } from 'zod';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { formulaText } from '../../configs/requirement-text.js';
import { readScenario, scenarioCases } from '../../configs/scenario.js';
import type { ScenarioChoice } from '../../configs/scenario-parameters.js';
import { scenarioSchema } from '../../configs/schema-scenario.js';
import { BuildError, problemText } from '../../runtime/contract.js';

let bench: BenchSpec;
beforeAll(() => {
  bench = readBench(new URL('../../configs/harbour-truck/bench.yaml', import.meta.url).pathname, catalogue);
});
const read = (text: string, choice: ScenarioChoice = {}, more: Record<string, string> = {}) =>
  readScenario('test.yaml', bench, memoryFiles({ 'test.yaml': text, ...more }), choice).script;
function complaints(text: string, choice: ScenarioChoice = {}, more: Record<string, string> = {}): string[] {
  try {
    read(text, choice, more);
  } catch (error) {
    if (!(error instanceof BuildError)) throw error;
    return error.problems.map(problemText);
  }
  return ['accepted'];
}

describe('steps', () => {
  it('come one after another once one of them waits for something', () => {
    const { steps, conditions } = read(`scenario: s
lasts: 60 s
steps:
  - { when: body.velocity > 40 km/h and highLine.pressure > 200 bar(g), for: 500 ms, within: 20 s, fault: highPressureSensor.stuck }
  - { wait: 2 s, clear: highPressureSensor.stuck }
  - { atDistance: 300 m, note: the gate }
  - { repeat: 2, steps: [ { wait: 1 s, set: driver.brake, to: 40 % }, { wait: 500 ms, release: driver.brake } ] }
  - { at: 50 s, ramp: isolationValve.leakArea, to: 2 mm2, over: 1 s }
`);
    expect(
      steps.map(({ name, action, target, value, at, wait, condition, lasting, timeOut, over }) => ({
        name,
        action,
        target,
        value,
        at,
        wait,
        condition,
        lasting,
        timeOut,
        over,
      })),
    ).toMatchObject([
      { action: 'fault', target: 'highPressureSensor.stuck', value: 1, condition: 0, lasting: 500, timeOut: 20_000 },
      { action: 'clear', target: 'highPressureSensor.stuck', value: 0, wait: 2000 },
      { action: 'note', name: 'the gate', condition: 1 },
      { action: 'set', target: 'driver.brake', value: 0.4, wait: 1000, name: 'set driver.brake to 40 % (1 of 2)' },
      { action: 'release', wait: 500 },
      { action: 'set', wait: 1000, name: 'set driver.brake to 40 % (2 of 2)' },
      { action: 'release', wait: 500 },
      { action: 'ramp', at: 50_000, value: 2e-6, over: 1000 },
    ]);
    expect(conditions!.map((one) => formulaText(one, 1e-3))).toEqual([
      '(body.velocity > 40 km/h and highLine.pressure > 200 bar(g)) happens',
      'body.distance >= 300 m happens',
    ]);
  });

  it.each([
    [
      '{ when: body.velocty > 1 m/s, note: x }',
      'test.yaml:4:13 steps[0].when: no such signal, body.velocty, did you mean body.velocity or body.energy or body.loss?',
    ],
    [
      '{ when: body.velocity > 1 m, note: x }',
      'test.yaml:4:29 steps[0].when: a length where a speed belongs, write it as in 60 km/h',
    ],
    [
      '{ when: body.velocity > 1 m/s for 2 s, note: x }',
      'test.yaml:4:13 steps[0].when: a condition that looks ahead, say how long it has to hold with for:',
    ],
    [
      '{ at: 1 s, fault: body.payload, to: 3 kg }',
      'test.yaml:4:23 steps[0].fault: body.payload is no fault, see `oilspring list faults BENCH`, or write set:',
    ],
    [
      '{ at: 1 s, wait: 1 s, note: x }',
      'test.yaml:4:16 steps[0].wait: a step that comes at and wait, keep one of them',
    ],
    [
      '{ note: x }',
      'test.yaml:4:5 steps[0].at: missing, add at: 12 s, wait: 2 s, atDistance: 300 m or when: and a condition',
    ],
    [
      '{ at: 1 s, within: 2 s, note: x }',
      'test.yaml:4:16 steps[0].within: only a step that waits for something has it, leave it away',
    ],
    [
      '{ at: 1 s, set: driver.speedErr, to: 3 m/s }',
      'test.yaml:4:21 steps[0].set: unknown command, driver.speedErr, did you mean driver.speedError or driver.accelerator?',
    ],
  ])('%s', (step, complaint) => {
    expect(complaints(`scenario: s\nlasts: 9 s\nsteps:\n  - ${step}\n`)).toEqual([complaint]);
  });

  it('inside a repetition have no time of their own', () => {
    expect(complaints('scenario: s\nlasts: 9 s\nsteps:\n  - { repeat: 2, steps: [ { at: 1 s, note: x } ] }\n')).toEqual(
      ['test.yaml:4:25 steps[0].steps: a time of its own inside a repetition, write wait: or when: instead of at:'],
    );
  });
});

describe('the schema for editors', () => {
  const validator = z.fromJSONSchema(scenarioSchema() as Parameters<typeof z.fromJSONSchema>[0]);
  const accepts = (text: string) => validator.safeParse(parse(text)).success;
  const good = `scenario: s
lasts: $length
parameters: { length: 20 s }
start: { speed: 36 km/h, highAccumulator: { charge: 40 % } }
drive: { file: a.csv }
steps:
  - { when: body.velocity > 1 m/s, for: 1 s, set: body.payload, to: 900 kg }
  - { repeat: 2, steps: [ { wait: 1 s, clear: highPressureSensor.stuck } ] }
requirements: { R-1: always body.velocity < 90 km/h }
`;
  it('accepts what reading accepts, and refuses unknown keys', () => {
    expect(accepts(good)).toBe(true);
    expect(complaints(good, {}, { 'a.csv': 'time [s],speed [m/s]\n0,0\n' })).toEqual(['accepted']);
    expect(accepts(good.replace('for: 1 s', 'four: 1 s'))).toBe(false);
    expect(accepts(good.replace('lasts: $length', 'lasts: 20'))).toBe(false);
  });
});

describe('parameters and cases', () => {
  const text = `scenario: loaded
lasts: $length
parameters: { length: 20 s, load: 900 kg, limit: 350 bar(g) }
cases:
  light: { load: 300 kg }
  heavy: { load: 2 t, length: 30 s }
steps:
  - { at: 1 s, set: body.payload, to: $load, note: 'payload \${load}' }
requirements:
  R-1: always highLine.pressure < $limit
`;
  it('stand where they are named', () => {
    const usual = read(text);
    expect([usual.ticks, usual.steps[0]!.value, usual.steps[0]!.name, usual.name]).toEqual([
      20_000,
      900,
      'payload 900 kg',
      'loaded',
    ]);
    const heavy = read(text, { case: 'heavy', set: { limit: '300 bar(g)' } });
    expect([heavy.ticks, heavy.steps[0]!.value, heavy.name]).toEqual([30_000, 2000, 'loaded, heavy']);
    expect(heavy.parameters).toEqual({ length: '30 s', load: '2 t', limit: '300 bar(g)' });
    expect(formulaText(heavy.requirements[0]!.formula, 1e-3)).toContain('300 bar(g)');
    expect(scenarioCases('t.yaml', memoryFiles({ 't.yaml': text }))).toEqual(['light', 'heavy']);
  });

  it('say what is wrong where it is used', () => {
    expect(complaints(text, { set: { lod: '1 kg' } })).toEqual([
      'test.yaml:1:1 --set lod: no such parameter, 1 kg, did you mean load?',
    ]);
    expect(complaints(text, { case: 'hevy' })).toEqual([
      'test.yaml:1:1 cases: no such case, hevy, did you mean heavy?',
    ]);
    expect(complaints(text, { set: { load: '3 m' } })[0]).toContain('test.yaml:8:39 steps[0].to: ');
    expect(complaints(text.replace('$limit', '$limt')).join()).toContain(
      'test.yaml:10:8 requirements.R-1: no such parameter, $limt',
    );
    expect(complaints(text.replace('{ load: 300 kg }', '{ laod: 300 kg }'))).toEqual([
      'test.yaml:5:12 cases.light.laod: no such parameter, did you mean load?',
    ]);
  });
});

describe('traces from CSV', () => {
  const csv = '# measured\ntime [s],speed [km/h],slope [%]\n0,0,0\n1.5,18,2\n3,36,2\n';
  it('are read with their units', () => {
    const script = read(
      'scenario: s\ndrive: { file: a.csv, column: speed }\ntraces: { body.grade: { file: a.csv, column: slope } }\n',
      {},
      { 'a.csv': csv },
    );
    expect(script.drive).toEqual([
      [0, 0],
      [1500, 5],
      [3000, 10],
    ]);
    expect(script.traces[0]).toMatchObject({
      target: 'body.grade',
      points: [
        [0, 0],
        [1500, 0.02],
        [3000, 0.02],
      ],
    });
    expect(script.ticks).toBe(3000);
  });

  it('may go over the distance', () => {
    const script = read(
      'scenario: s\nlasts: 9 s\ntraces: { body.grade: { over: distance, points: [[0 m, 0 %], [1 km, 5 %]] } }\n',
    );
    expect(script.traces[0]).toMatchObject({
      over: 'body.distance',
      points: [
        [0, 0],
        [1000, 0.05],
      ],
    });
  });

  it.each([
    ['time [s],speed\n0,0\n', 'a.csv:1:1 drive.file: column speed says no unit, write it in brackets: speed [m/s]'],
    [
      'time [s],speed [bar]\n0,0\n',
      'a.csv:1:1 drive.file: column speed in bar where m/s belongs, give it a unit of that kind',
    ],
    [
      'time [s],speed [m/s]\n0,0\n0,1\n',
      'a.csv:3:1 drive.file: time does not rise, 0,1, sort the lines by time, one line for each time',
    ],
    ['time [s],speed [m/s]\n0,fast\n', 'a.csv:2:1 drive.file: no number in column speed, 0,fast, write plain numbers'],
  ])('say the line that is wrong: %j', (text, complaint) => {
    expect(complaints('scenario: s\nlasts: 3 s\ndrive: { file: a.csv }\n', {}, { 'a.csv': text })).toEqual([complaint]);
  });
});

describe('the start state', () => {
  it('turns along what is geared to the wheels, and starts at rest with itself', () => {
    const script = read(
      'scenario: s\nlasts: 2 s\nstart: { speed: 36 km/h, gear: 4, temperature: -10 degC, highAccumulator: { pressure: 300 bar(g) } }\n',
    );
    expect(script.start!['body']).toEqual({ velocity: 10 });
    expect(script.start!['frontWheels']!['speed']).toBeCloseTo(25, 9);
    expect(script.start!['propShaft']!['speed']).toBeCloseTo(25 * 3.9, 9);
    expect(script.start!['gearboxInput']!['speed']).toBeCloseTo(25 * 3.9 * 1.4, 9);
    expect(script.start!['highLine']!['pressure']).toBeCloseTo(300e5 + 101325, 3);
    const assembly = assemble(bench, { seed: 1, script });
    const value = (path: string) => assembly.signals[assembly.table.find(path)]!;
    for (let tick = assembly.firstTick; tick < 300; tick += 1) assembly.tick.run(tick);
    expect(value('tank.temperature')).toBeLessThan(265);
    expect(value('highAccumulator.pressure')).toBeCloseTo(300e5 + 101325, -6);
    // substitutes count without a controller: brakes at 35 %, no jolt beyond that
    expect(value('body.velocity')).toBeGreaterThan(8);
    expect(value('body.velocity')).toBeLessThan(10.01);
    expect(Math.abs(value('halfShafts.torque'))).toBeLessThan(4000);
  });

  it('says which element it does not know', () => {
    expect(complaints('scenario: s\nlasts: 2 s\nstart: { highAcumulator: { pressure: 3 bar(g) } }\n')).toEqual([
      'test.yaml:3:10 start.highAcumulator: no such element, highAcumulator, did you mean highAccumulator?',
    ]);
  });
});
