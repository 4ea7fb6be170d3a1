import { spawnSync } from 'node:child_process';
import { afterAll, describe, expect, it } from 'vitest';
import { assemble } from '../../../configs/assemble.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { linkBench } from '../../../tools/measure/parts/replies.js';
import { functionsInC } from '../../../tools/measure/twin/plant-in-c.js';
import { copyBench, median, Workshop } from '../../../tools/measure/workshop.js';

const compiler = spawnSync('cc', ['--version']).error === undefined;
if (!compiler) console.log('not run: the twin in C: no C compiler');

describe.skipIf(!compiler)('the twin in C', () => {
  const workshop = new Workshop();
  afterAll(() => workshop.close());

  it('computes what the bench computes: the same states after 500 steps', () => {
    const spec = readBench(copyBench(workshop, 'harbour-truck'), catalogue);
    expect(workshop.buildTwin(spec)).toBe('');
    const run = spawnSync(workshop.file('twin'), ['0', '0', '0', '-1', '500'], { encoding: 'utf8' });
    const states = JSON.parse(run.stdout) as number[];
    const { plant, circuit } = assemble(spec, { seed: 1 });
    const start = plant.y.slice();
    for (let i = 0; i < 500; i += 1) plant.step();
    expect(states.length).toBe(circuit.states.length);
    // exp and tanh of two libraries differ in the last bits
    states.forEach((state, i) => {
      const scale = Math.abs(start[i]!) + Math.abs(plant.y[i]!) + 1e-6;
      expect(Math.abs(state - plant.y[i]!) / scale, circuit.states[i]!.path).toBeLessThan(1e-6);
    });
    expect(states.some((state, i) => Math.abs(state - start[i]!) > 1e-9 * Math.abs(start[i]!))).toBe(true);
  });

  it('compiles the partner', () => {
    expect(workshop.compile('partner.c', 'partner')).toBe('');
  });
});

describe('what measurements are made of', () => {
  it('turns generated functions into C, and refuses what it does not know', () => {
    const code =
      'function f(y, h, d) {\n  const v1 = Math.max(0, y[3] * 2);\n  { const t = v1 === 1 ? 1e-7 : Infinity; d[0] = t / 3; }\n}';
    expect(functionsInC(code)).toBe(
      'static void f(double *restrict y, double h, double *restrict d) {\n  const double v1 = maximum(0.0, y[3] * 2.0);\n  { const double t = v1 == 1.0 ? 1e-7 : INFINITY; d[0] = t / 3.0; }\n}',
    );
    expect(() => functionsInC('function f(y) {\n  for (;;) y[0] = 1;\n}')).toThrow(/not known here: for/);
  });

  it('makes benches with as many messages as asked for', () => {
    for (const count of [1, 32]) {
      const spec = readBench('link.yaml', catalogue, { read: () => linkBench(count, '0.5 ms'), list: () => [] });
      expect(spec.map.messages.filter((message) => message.direction === 'sent')).toHaveLength(count);
      expect(
        spec.map.messages.filter((message) => message.direction === 'received' && message.every === 1),
      ).toHaveLength(count);
      expect(spec.step).toBe(0.0005);
    }
  });

  it('medians', () => {
    expect(median([3, 1, 2])).toBe(2);
    expect(median([4, 1, 2, 3])).toBe(2.5);
    expect(median([])).toBeNaN();
  });
});
