import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { memoryFiles } from '../../configs/files.js';
import { readScenario } from '../../configs/scenario.js';
import { BuildError, problemText } from '../../runtime/contract.js';
import { catalogue } from './catalogue.js';
import { smallBench } from './small-bench.js';

const read = (more: string) => readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': smallBench + more }));

function complaints(act: () => unknown): string[] {
  try {
    act();
  } catch (error) {
    if (!(error instanceof BuildError)) throw error;
    return error.problems.map(problemText);
  }
  return ['accepted'];
}

describe('requirements in bench and scenario files', () => {
  it('are read in the order of the file', () => {
    const { requirements } = read(`requirements:
  HP-1: always highLine.pressure < 350 bar(g)
  HP-2:
    text: Falls when the valve shuts.
    holds: whenever isolation.opening falls below 0.5 then highLine.pressure < 300 bar(g) within 2 s
    severity: critical
    exercise: optional
`);
    expect(requirements.map(({ id, severity, exercise }) => [id, severity, exercise])).toEqual([
      ['HP-1', 'major', undefined],
      ['HP-2', 'critical', 'optional'],
    ]);
  });

  it('may name what the watch tells', () => {
    expect(read('requirements: { W-1: never watch.lowLine.pressure.level > 0.5 }\n').requirements).toHaveLength(1);
  });

  it.each([
    [
      'requirements: { HP-1: always highLine.presure < 350 bar(g) }\n',
      'bench.yaml:60:30 requirements.HP-1: no such signal, highLine.presure, did you mean highLine.pressure or lowLine.pressure or highLine.mass?',
    ],
    [
      'requirements: { HP-1: always highLine.pressure < 350 bar }\n',
      'bench.yaml:60:50 requirements.HP-1: pressure without (a) or (g), write bar(a) for absolute or bar(g) for gauge pressure',
    ],
  ])('say where they are wrong: %s', (text, complaint) => {
    expect(complaints(() => read(text))).toEqual([complaint.replace(':57:', `:${smallBench.split('\n').length}:`)]);
  });

  it('of a scenario stand beside those of the bench', () => {
    const spec = read('');
    const files = memoryFiles({
      'round.yaml': 'scenario: round\nlasts: 2 s\nrequirements:\n  RD-1: at the end propShaft.speed < 10 rpm\n',
    });
    const { script } = readScenario('round.yaml', spec, files);
    expect(script.requirements.map(({ id }) => id)).toEqual(['RD-1']);
  });
});
