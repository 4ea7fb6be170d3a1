import { describe, expect, it } from 'vitest';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { freeze, measureAccuracy } from '../../tools/check/accuracy.js';
import { accuracyLimits, scaleOf, verdictOf } from '../../tools/check/sheet.js';
import { type Barrier, loadController, moduleBarrier } from '../../tools/loop/controller-module.js';

/**
 * `check` accepts every ready bench that has a duty: as the command does it, along the whole duty, but against one
 * reference of three times the substeps, which finds at least two thirds of an error and nearly all where the order is
 * three.
 */
const benches = ['harbour-truck', 'refuse-collector', 'shuttle-bus', 'flywheel-stand'];
const root = new URL('../../configs/', import.meta.url).pathname;

describe.each(benches)('%s', (name) => {
  it('is fit to run live by the accuracy sheet', async () => {
    const folder = `${root}${name}/`;
    const spec = readBench(`${folder}bench.yaml`, catalogue);
    const { script } = readScenario(`${folder}${spec.duty}`, spec);
    const assembly = assemble(spec, { seed: spec.seed, script });
    const barriers: Barrier[] = [];
    if (spec.controller?.module !== undefined) {
      const factory = await loadController(folder, spec.controller.module);
      const { barrier, transports } = moduleBarrier(
        spec.map,
        assembly.exchange.checksum,
        factory,
        spec.step,
        spec.controller.period,
      );
      for (const { link, transport } of transports) assembly.exchange.attach(link, transport);
      barriers.push(barrier);
    }
    const drive = freeze(assembly, barriers, script.ticks, () => true);
    expect(drive.ticks).toBe(script.ticks);
    const sheet = measureAccuracy(assembly, drive, scaleOf(spec), () => true, [3]);
    expect(sheet.pressures.length).toBeGreaterThan(2);
    expect(sheet.speeds.length).toBeGreaterThan(1);
    expect(sheet.events.length).toBeGreaterThan(1);
    // some error is there to be found: the two plants are not the same
    expect(sheet.worstPressure!.share).toBeGreaterThan(1e-7);
    const verdict = verdictOf(sheet, accuracyLimits, spec);
    expect(verdict, verdict.why).toMatchObject({ fit: true });
  });
});
