import { readdirSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { recordedForm } from '../../runtime/script.js';
import { planRun } from '../../tools/run/plan.js';
import { root, scratch } from '../system/command.js';

const folder = scratch();
afterAll(() => folder.remove());

/** Every number in a script, with where it stands. */
function* numbersOf(value: unknown, where = ''): Generator<[string, number]> {
  if (typeof value === 'number') yield [where, value];
  else if (typeof value === 'object' && value !== null)
    for (const [key, one] of Object.entries(value)) yield* numbersOf(one, `${where}.${key}`);
}

describe('the script of a run', () => {
  it('is the one that the recording gives back: no minus zero, which JSON does not know', () => {
    const scenario = folder.file('minus.yaml');
    writeFileSync(scenario, 'scenario: minus\nsteps:\n  - { at: 0.1 s, set: unit.displacementRequest, to: -0 % }\n');
    const { script } = planRun({
      bench: path.join(root, 'configs/hand-bench/bench.yaml'),
      scenario,
      pace: 'fast',
      for: '2s',
      disturb: [],
    });
    expect(script.steps).toHaveLength(1);
    expect(script).toEqual(recordedForm(script));
    const minus = recordedForm({ ...script, preview: -0 });
    expect([...numbersOf({ ...script, preview: -0 })].some(([, value]) => Object.is(value, -0))).toBe(true);
    expect([...numbersOf(minus)].filter(([, value]) => Object.is(value, -0))).toEqual([]);
  });

  it('loses nothing else on its way through the recording', () => {
    let scripts = 0;
    for (const name of ['harbour-truck', 'refuse-collector', 'shuttle-bus', 'flywheel-stand', 'hand-bench']) {
      const place = path.join(root, 'configs', name);
      const spec = readBench(path.join(place, 'bench.yaml'), catalogue);
      for (const file of readdirSync(path.join(place, 'scenarios'))) {
        if (!file.endsWith('.yaml')) continue;
        const { script } = readScenario(path.join(place, 'scenarios', file), spec);
        for (const [where, value] of numbersOf(script)) expect([where, Number.isFinite(value)]).toEqual([where, true]);
        scripts += 1;
      }
    }
    expect(scripts).toBeGreaterThan(5);
  });
});
