import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { type Part, percent, us } from '../part.js';
import { copyBench, median } from '../workshop.js';

interface Spread {
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
}
interface TwinReport {
  readonly fifo: number;
  readonly share: number;
  readonly overruns: number;
  readonly replies: number;
  readonly oneStepShare: number;
  readonly refused: number;
  readonly lateness: Spread;
  readonly take: Spread;
  readonly plant: Spread;
  readonly publish: Spread;
  readonly record: Spread;
  readonly tick: Spread;
}

/** Stages that both have. */
const SHARED = ['take', 'plant', 'publish', 'record'] as const;

/** The whole tick, live, beside the same loop in C with the same plant, messages and partner; in turns, cores swapped. */
export const twin: Part = {
  name: 'twin',
  about:
    'the whole live tick of the harbour truck beside its twin in C (-O2), same plant, messages, partner and waiting',
  async run({ seconds, cores, say, workshop }) {
    const bench = copyBench(workshop, 'harbour-truck');
    const spec = readBench(bench, catalogue);
    const refused = workshop.compile('partner.c', 'partner') || workshop.buildTwin(spec);
    if (refused !== '')
      return { rows: [{ what: 'twin', value: `not run: ${refused}` }], numbers: `not run: ${refused}` };
    const rounds: {
      readonly core: number;
      readonly own: Awaited<ReturnType<typeof workshop.oilspring>>;
      readonly c: TwinReport;
      readonly again: TwinReport;
    }[] = [];
    const ticks = Math.round(seconds / spec.step);
    for (const core of cores) {
      const other = cores.find((one) => one !== core) ?? core;
      const inC = async () => {
        const partner = workshop.startPartner(spec.map, other);
        const report = JSON.parse(
          await workshop.run(workshop.file('twin'), ['47710', '47711', String(ticks), String(core)]),
        ) as TwinReport;
        partner.child.kill('SIGTERM');
        await partner.done;
        return report;
      };
      say(`core ${core}: twin`);
      const c = await inC();
      say(`core ${core}: oilspring`);
      const partner = workshop.startPartner(spec.map, other);
      const own = await workshop.oilspring([
        'run',
        bench,
        '--for',
        `${seconds}s`,
        '--controller',
        'external',
        '--no-record',
        '--profile',
        '--json',
        '--core',
        String(core),
      ]);
      partner.child.kill('SIGTERM');
      await partner.done;
      say(`core ${core}: twin again`);
      rounds.push({ core, own, c, again: await inC() });
    }
    const ownStage = (stage: string, of: 'p50' | 'p99') =>
      median(rounds.map(({ own }) => own.stages.find((one) => one.stage === stage)?.[of] ?? Number.NaN)) * 1e3;
    const cStage = (stage: (typeof SHARED)[number] | 'tick' | 'lateness', of: 'p50' | 'p99') =>
      median(rounds.flatMap(({ c, again }) => [c[stage][of], again[stage][of]]));
    const sum = (of: 'p50' | 'p99', side: (stage: (typeof SHARED)[number], of: 'p50' | 'p99') => number) =>
      SHARED.reduce((total, stage) => total + side(stage, of), 0);
    const whole = { own: ownStage('whole tick', 'p50'), c: cStage('tick', 'p50') };
    const shared = { own: sum('p50', ownStage), c: sum('p50', cStage) };
    const control = median(rounds.map(({ c, again }) => again.tick.p50 / c.tick.p50));
    const share = median(rounds.map(({ own }) => own.processor.loop / own.simulated));
    const oneStep = {
      own: median(rounds.map(({ own }) => own.links[0]?.oneStepShare ?? Number.NaN)),
      c: median(rounds.flatMap(({ c, again }) => [c.oneStepShare, again.oneStepShare])),
    };
    return {
      rows: [
        {
          what: 'whole tick, median: oilspring / twin (twin without script, sensors, watch, requirements)',
          value: `${us(whole.own)} / ${us(whole.c)}`,
        },
        { what: 'ratio of the whole tick', value: (whole.own / whole.c).toFixed(2), goal: 'not above 1.5' },
        {
          what: `ratio of the stages that both have (${SHARED.join(', ')})`,
          value: (shared.own / shared.c).toFixed(2),
        },
        { what: 'ratio of the plant alone', value: (ownStage('plant', 'p50') / cStage('plant', 'p50')).toFixed(2) },
        { what: 'null control: twin again / twin', value: control.toFixed(2) },
        {
          what: 'replies used in the next step: oilspring / twin',
          value: `${percent(oneStep.own)} / ${percent(oneStep.c)}`,
          goal: 'not below the twin less one point',
        },
        {
          what: 'processor share: oilspring / twin',
          value: `${percent(share)} / ${percent(median(rounds.flatMap(({ c, again }) => [c.share, again.share])))}`,
        },
      ],
      numbers: rounds.map(({ core, own, c, again }) => ({
        core,
        oilspring: {
          stages: own.stages,
          timing: own.timing,
          processor: own.processor,
          code: own.code,
          links: own.links,
          scheduling: own.scheduling,
        },
        twin: c,
        twinAgain: again,
      })),
    };
  },
};
