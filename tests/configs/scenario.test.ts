import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { stringify } from 'yaml';
import { memoryFiles } from '../../configs/files.js';
import { readScenario, type ScenarioBench } from '../../configs/scenario.js';
import { BuildError, problemText } from '../../runtime/contract.js';

const bench: ScenarioBench = {
  step: 1e-3,
  signals: [
    { path: 'truck.grade', unit: '1', about: 'slope', group: 'command', least: -0.5, most: 0.5 },
    { path: 'truck.payload', unit: 'kg', about: 'payload', group: 'command', least: 0 },
    { path: 'truck.velocity', unit: 'm/s', about: 'velocity', group: 'state' },
    { path: 'isolation.open', unit: '1', about: 'wanted position', group: 'command', least: 0, most: 1 },
    { path: 'line.pressure', unit: 'Pa', about: 'prescribed pressure', group: 'command' },
    { path: 'life.key', unit: '1', about: 'key', group: 'run', least: 0, most: 1 },
  ],
};
const read = (text: string) => readScenario('round.yaml', bench, memoryFiles({ 'round.yaml': text }));
function complaints(text: string): string[] {
  try {
    read(text);
  } catch (error) {
    if (!(error instanceof BuildError)) throw error;
    return error.problems.map(problemText);
  }
  return ['accepted'];
}

const round = `scenario: short round
about: invented
lasts: 60 s
preview: 0.4 s
drive:
  - [0 s, 0 km/h]
  - [12 s, 36 km/h]
  - [1 min, 0 m/s]
grade: [[0 s, 0], [20 s, 2 %]]
traces:
  truck.payload: { between: hold, points: [[0 s, 0 kg], [30 s, 0.5 t]] }
steps:
  - { at: 20 s, release: isolation.open }
  - { at: 12 s, set: isolation.open, to: on }
  - { at: 13 s, ramp: line.pressure, to: 200 bar(g), over: 500 ms, note: charge }
  - { at: 13 s, hold: truck.payload }
  - { at: 1 s, note: pulling out }
  - { at: 50 s, set: life.key, to: off }
`;

describe('a scenario file', () => {
  it('becomes plain data in SI and ticks, steps in order of time', () => {
    expect(read(round).script).toEqual({
      name: 'short round',
      about: 'invented',
      ticks: 60_000,
      preview: 400,
      drive: [
        [0, 0],
        [12_000, 36 * (1000 / 3600)],
        [60_000, 0],
      ],
      traces: [
        {
          target: 'truck.grade',
          between: 'linear',
          points: [
            [0, 0],
            [20_000, 0.02],
          ],
        },
        {
          target: 'truck.payload',
          between: 'hold',
          points: [
            [0, 0],
            [30_000, 500],
          ],
        },
      ],
      steps: [
        { at: 1000, name: 'pulling out', action: 'note', target: '', value: 0, over: 0 },
        { at: 12_000, name: 'set isolation.open to on', action: 'set', target: 'isolation.open', value: 1, over: 0 },
        { at: 13_000, name: 'charge', action: 'ramp', target: 'line.pressure', value: 20101325, over: 500 },
        { at: 13_000, name: 'hold truck.payload', action: 'hold', target: 'truck.payload', value: 0, over: 0 },
        { at: 20_000, name: 'release isolation.open', action: 'release', target: 'isolation.open', value: 0, over: 0 },
        { at: 50_000, name: 'set life.key to off', action: 'set', target: 'life.key', value: 0, over: 0 },
      ],
      requirements: [],
    });
    expect(read(round).sources).toEqual([{ name: 'round.yaml', text: round }]);
  });

  it('drives a named cycle and lasts as long as it', () => {
    const { script } = read('scenario: city\ndrive: ECE-15\n');
    expect(script.ticks).toBe(195_000);
    expect(script.drive[2]).toEqual([15_000, 15 / 3.6]);
  });

  it.each([
    ['lasts: 60 s', 'lasts: 0 s', ['round.yaml:3:8 lasts: too small, 0 s, at least 0.001 s, use a larger value']],
    ['lasts: 60 s', 'lasts: 2 d', ['round.yaml:3:8 lasts: too large, 2 d, at most 1 d, use a smaller value']],
    [
      '[12 s, 36 km/h]',
      '[12 s, 36]',
      ['round.yaml:7:12 drive[1]: no unit, 36, write a speed with its unit, for example 60 km/h'],
    ],
    ['[12 s, 36 km/h]', '[12 s]', ['round.yaml:7:5 drive[1]: not a point, write [time, value]']],
    [
      '[12 s, 36 km/h]',
      '[12.0005 s, 36 km/h]',
      ['round.yaml:7:5 drive[1]: time is not a multiple of the step, 12.0005 s, use multiples of 1 ms'],
    ],
    [
      '[1 min, 0 m/s]',
      '[1 s, 0 m/s]',
      ['round.yaml:8:5 drive[2]: time does not rise, 1 s, put the points in order of time'],
    ],
    ['[20 s, 2 %]', '[20 s, 60 %]', ['round.yaml:9:26 grade[1]: too large, 60 %, at most 50 %, use a smaller value']],
    [
      'truck.payload: {',
      'truck.paylod: {',
      ['round.yaml:11:3 traces.truck.paylod: unknown command, truck.paylod, did you mean truck.payload?'],
    ],
    [
      'truck.payload: {',
      'truck.grade: {',
      ['round.yaml:11:3 traces.truck.grade: the command follows grade already, keep one of the two'],
    ],
    [
      'release: isolation.open',
      'release: truck.velocity',
      ['round.yaml:13:26 steps[0].release: truck.velocity is a state, truck.velocity, name a command'],
    ],
    ['to: on', 'to: 2', ['round.yaml:14:42 steps[1].to: too large, 2, at most 1, use a smaller value']],
    [
      'to: 200 bar(g)',
      'to: 200 bar',
      [
        'round.yaml:15:42 steps[2].to: pressure without (a) or (g), 200 bar, write 200 bar(a) for absolute or 200 bar(g) for gauge pressure',
      ],
    ],
    [', over: 500 ms', '', ['round.yaml:15:5 steps[2].over: missing, add over: 5 ms']],
    ['hold: truck', 'hod: truck', ['round.yaml:16:5 steps[3]: a step that does nothing, hod, did you mean hold?']],
    [
      'note: pulling out',
      'hold: truck.grade, set: isolation.open, to: 1',
      [
        'round.yaml:17:5 steps[4]: a step that does 2 things, write one of set, ramp, hold, release, fault, clear or note',
      ],
    ],
    ['at: 1 s', 'at: 1', ['round.yaml:17:11 steps[4].at: no unit, 1, write a time with its unit, for example 5 ms']],
    ['steps:\n', 'step: []\nsteps:\n', ['round.yaml:12:1 step: unknown key, did you mean steps?']],
  ])('%s -> %s', (from, to, messages) => {
    expect(round.split(from)).toHaveLength(2);
    expect(complaints(round.replace(from, to))).toEqual(messages);
  });

  it('needs an end and a known cycle', () => {
    expect(complaints('scenario: idle\n')).toEqual(['round.yaml:1:1 lasts: missing, add lasts: 60 s, or a drive']);
    expect(complaints('scenario: city\ndrive: ECE15\n')[0]).toBe(
      'round.yaml:2:8 drive: unknown choice, ECE15, did you mean ECE-15?',
    );
  });

  it('ends in a scenario or in a BuildError, whatever it holds', () => {
    const leaf = fc.oneof(
      fc.constantFrom('1 s', '2 %', 'truck.grade', 'isolation.open', 'on', 'NEDC', '__proto__'),
      fc.string({ maxLength: 8 }),
      fc.double(),
      fc.constant(null),
    );
    const node = fc.letrec((tie) => ({
      node: fc.oneof(
        { maxDepth: 4 },
        leaf,
        fc.array(tie('node'), { maxLength: 3 }),
        fc.dictionary(
          fc.constantFrom('at', 'set', 'to', 'over', 'points', 'of', 'between', 'note', 'truck.grade'),
          tie('node'),
          { maxKeys: 4 },
        ),
      ),
    })).node;
    const file = fc.dictionary(
      fc.constantFrom('scenario', 'about', 'lasts', 'preview', 'drive', 'grade', 'traces', 'steps', 'other'),
      node,
      { maxKeys: 6 },
    );
    fc.assert(
      fc.property(file, (value) => {
        expect(complaints(stringify(value)).length).toBeGreaterThan(0);
      }),
      { numRuns: 500 },
    );
  });
});
