import path from 'node:path';
import { describe, expect, it } from 'vitest';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { compare } from '../../../tools/determinism/compare.js';
import { chooser, drawScript } from '../../../tools/determinism/draw.js';
import { root } from '../../system/command.js';

const benches = [path.join(root, 'configs', 'hand-bench', 'bench.yaml')];

describe('random scenarios, run twice and derived again in processes of their own', () => {
  it('are the same to the bit, with the compilers off as well', async () => {
    for (const interpreted of [undefined, 'jitless'] as const) {
      const found = await compare([3, 8, 14], { benches, most: 100, interpreted });
      expect(found.map(({ number, same, what }) => ({ number, same, what }))).toEqual(
        [3, 8, 14].map((number) => ({ number, same: true, what: '' })),
      );
      expect(found.reduce((sum, one) => sum + one.steps, 0)).toBeGreaterThan(20);
      expect(found.some((one) => one.hands > 0)).toBe(true);
    }
  });

  it('differ where chance comes in from outside, and are still derived again', async () => {
    const [found] = await compare([3], { benches, most: 100, planted: 'input' });
    expect(found).toMatchObject({ same: false, what: 'two runs of the same scenario differ' });
  });

  it('differ, and are not derived again, where the plant looks at a clock', async () => {
    const [found] = await compare([3], { benches, most: 100, planted: 'tick' });
    expect(found!.what).toBe('two runs of the same scenario differ; derived again it differs from tick 20 on');
  });
});

it('draws every kind of step, and faults where there are some', () => {
  const spec = readBench(path.join(root, 'configs', 'harbour-truck', 'bench.yaml'), catalogue);
  const drawn = Array.from({ length: 40 }, (_, i) => drawScript(spec, chooser(i), 500));
  const steps = drawn.flatMap((script) => script.steps);
  expect(new Set(steps.map((step) => step.action)).size).toBe(7);
  expect(new Set(steps.filter((step) => step.action === 'fault').map((step) => step.target)).size).toBeGreaterThan(20);
  expect(steps.some((step) => step.condition !== undefined) && steps.some((step) => step.wait !== undefined)).toBe(
    true,
  );
  expect(JSON.stringify(drawScript(spec, chooser(7), 500))).toBe(JSON.stringify(drawScript(spec, chooser(7), 500)));
});
