import { existsSync, readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import type { LockstepTransport } from '../../bridge/lockstep.js';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { loadController, moduleTransport } from '../../tools/loop/controller-module.js';

/** Each ready bench along its duty, or part of it, closed loop with its demo controller. */
const benches = [
  { name: 'refuse-collector', seconds: 9, moves: 'body.velocity', least: 5 },
  { name: 'shuttle-bus', seconds: 9, moves: 'body.velocity', least: 4 },
  { name: 'flywheel-stand', seconds: 12, moves: 'flywheel.speed', least: 80 },
  { name: 'flywheel-stand', scenario: 'scenarios/relief.yaml', seconds: 10, moves: 'flywheel.speed', least: 80 },
  { name: 'hand-bench', scenario: 'scenarios/exercise.yaml', seconds: 16, moves: 'flywheel.speed', least: 80 },
] as const;

const root = new URL('../../configs/', import.meta.url).pathname;

describe.each(benches)('$name, $seconds s', (one) => {
  const folder = `${root}${one.name}/`;
  const spec = readBench(`${folder}bench.yaml`, catalogue);

  it('reads without a remark and says on a page that its numbers are invented', () => {
    expect(spec.remarks).toEqual([]);
    expect(readFileSync(`${folder}README.md`, 'utf8')).toMatch(/numbers are invented/);
  });

  it('drives, keeps its requirements, its energy and its oil', async () => {
    const duty = 'scenario' in one ? one.scenario : spec.duty!;
    const whole = readScenario(`${folder}${duty}`, spec).script;
    const assembly = assemble(spec, { seed: 1, script: whole });
    let barrier: LockstepTransport | undefined;
    if (spec.controller?.module !== undefined) {
      expect(existsSync(`${folder}controller.ts`)).toBe(true);
      barrier = moduleTransport(
        spec.map,
        assembly.exchange.checksum,
        await loadController(folder, spec.controller.module),
        spec.step,
        spec.controller.period,
      );
      assembly.exchange.attach(spec.map.links[0]!.name, barrier);
    }
    const value = (path: string) => assembly.signals[assembly.table.find(path)]!;
    const last = Math.min(whole.ticks, Math.round(one.seconds / spec.step));
    let fastest = 0;
    for (let tick = assembly.firstTick; tick < last; tick += 1) {
      assembly.tick.run(tick);
      barrier?.end(tick);
      fastest = Math.max(fastest, Math.abs(value(one.moves)));
    }
    expect(fastest).toBeGreaterThan(one.least);
    expect(Math.abs(value('ledger.residual'))).toBeLessThan(1e-5 * value('ledger.turnover'));
    const results = assembly.judge.results(last, assembly.block);
    expect(results.length).toBeGreaterThan(1);
    expect(results.filter((one) => one.verdict === 'fail').map((one) => one.requirement.id)).toEqual([]);
  });
});
