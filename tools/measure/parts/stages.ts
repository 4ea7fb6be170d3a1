import { type Part, percent, us } from '../part.js';
import { copyBench } from '../workshop.js';

/** Each part of the tick: live against the demo controller, and at fast pace. */
export const stages: Part = {
  name: 'stages',
  about: 'each part of the tick of the harbour truck: live, and at fast pace (caches stay warm there)',
  async run({ seconds, say, workshop }) {
    const bench = copyBench(workshop, 'harbour-truck');
    say('live');
    const live = await workshop.oilspring([
      'run',
      bench,
      '--for',
      `${Math.min(60, seconds)}s`,
      '--no-record',
      '--profile',
      '--json',
    ]);
    say('fast');
    const quick = await workshop.oilspring(['run', bench, '--pace', 'fast', '--no-record', '--profile', '--json']);
    const fastOf = (stage: string) => quick.stages.find((one) => one.stage === stage)?.p50 ?? Number.NaN;
    const { startUp } = live;
    return {
      rows: [
        ...live.stages.map((one) => ({
          what: `${one.stage}: live median / 99 %; fast median`,
          value: `${us(one.p50 * 1e3)} / ${us(one.p99 * 1e3)}; ${us(fastOf(one.stage) * 1e3)}`,
        })),
        { what: 'processor share of the loop thread, live', value: percent(live.processor.loop / live.simulated) },
        {
          what: 'start-up: load / build / dry run / links and rights / pre-roll',
          value: `${[startUp.load, startUp.build, startUp.warmUp, startUp.attach, startUp.preRoll].map((one) => (one ?? 0).toFixed(2)).join(' / ')} s, ${startUp.dryTicks} dry ticks`,
        },
        {
          what: 'code given up, code compiled after the first counted tick',
          value: `${live.code?.lost.length}, ${live.code?.late.length} of ${live.code?.functions} functions`,
        },
        {
          what: 'collections; growth of the heap',
          value: `${live.timing.collections}; ${live.timing.heapGrowth.toFixed(1)} bytes a tick`,
        },
      ],
      numbers: {
        live: {
          stages: live.stages,
          timing: live.timing,
          startUp,
          code: live.code,
          processor: live.processor,
          simulated: live.simulated,
        },
        fast: { stages: quick.stages, processor: quick.processor },
      },
    };
  },
};
