import { describe, expect, it } from 'vitest';
import { judgeTrace } from '../../runtime/judge/offline.js';
import { loadTruckController, makeTruck } from './truck.js';

/** The truck's own requirements over the start of its round, judged in the tick and again from the collected signals. */
describe('requirements in the tick', () => {
  it('give what the definition gives on the recorded signals, twice the same', async () => {
    const truck = makeTruck(await loadTruckController());
    const { assembly } = truck;
    const ticks = 3500;
    const rows: Float64Array[] = [];
    truck.run(ticks, (tick) => {
      if (tick >= 0) rows.push(assembly.signals.slice());
    });
    const online = assembly.judge.results(rows.length, assembly.block);
    expect(online.length).toBeGreaterThan(10);
    const trace = {
      ticks: rows.length,
      step: assembly.spec.step,
      values: (path: string) => rows.map((row) => row[assembly.table.find(path)]!),
    };
    for (const result of online) {
      const again = judgeTrace(result.requirement, trace);
      expect([result.requirement.id, again.verdict, again.margin, again.tick, again.triggers]).toEqual([
        result.requirement.id,
        result.verdict,
        result.margin,
        result.tick,
        result.triggers,
      ]);
    }
    const shown = assembly.table.find('judge.HP-1.margin');
    expect(assembly.signals[shown]).toBe(online.find((one) => one.requirement.id === 'HP-1')!.margin);
  });

  it('forget everything when the bench is reset', async () => {
    const truck = makeTruck(await loadTruckController());
    truck.run(800);
    const first = truck.assembly.judge.results(800, truck.assembly.block);
    const hash = [...truck.assembly.tick.hash];
    truck.assembly.reset();
    const fresh = makeTruck(await loadTruckController());
    fresh.run(800);
    expect([...fresh.assembly.tick.hash]).toEqual(hash);
    expect(fresh.assembly.judge.results(800, fresh.assembly.block)).toEqual(first);
  });
});
