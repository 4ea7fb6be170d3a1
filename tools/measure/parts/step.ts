import { assemble } from '../../../configs/assemble.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { Plant } from '../../../runtime/plant.js';
import { Clock } from '../../../runtime/realtime/clock.js';
import { type Part, us } from '../part.js';
import { copyBench, median } from '../workshop.js';

const WARM = 20_000;
const STEPS = 20_000;
const BATCH = 100;
const TURNS = 3;

/** One step and one evaluation of the reference truck beside C -O2 of the same equations: processor time, warm caches. */
export const step: Part = {
  name: 'step',
  about:
    'one step and one evaluation of the harbour truck beside C -O2 of the same equations (processor time, without waiting)',
  async run({ say, workshop }) {
    const spec = readBench(copyBench(workshop, 'harbour-truck'), catalogue);
    const refused = workshop.buildTwin(spec);
    const { plant, circuit } = assemble(spec, { seed: 1 });
    const clock = new Clock();
    const times = new Float64Array(2);
    const timed = (rounds: number, call: () => void) => {
      const costs: number[] = [];
      for (let i = 0; i < rounds / BATCH; i += 1) {
        clock.threadTime(times, 0);
        for (let k = 0; k < BATCH; k += 1) call();
        clock.threadTime(times, 1);
        costs.push((times[1]! - times[0]!) / BATCH);
      }
      return median(costs);
    };
    // each substep by itself: what the two languages do with the same work
    const plain = Plant.alone(circuit, { step: spec.step, substeps: spec.substeps, longest: 1 });
    circuit.step.s.set(plant.y);
    const evaluate = () => circuit.step.rates();
    timed(WARM, () => plant.step());
    timed(WARM, () => plain.step());
    timed(WARM, evaluate);
    const turns: Record<'own' | 'strides' | 'ownEvaluation' | 'c' | 'cStrides' | 'cEvaluation', number>[] = [];
    for (let turn = 0; turn < TURNS; turn += 1) {
      say(`turn ${turn + 1} of ${TURNS}`);
      const strides = timed(STEPS, () => plant.step());
      const own = timed(STEPS, () => plain.step());
      const ownEvaluation = timed(STEPS, evaluate);
      if (refused !== '') {
        turns.push({ own, strides, ownEvaluation, c: Number.NaN, cStrides: Number.NaN, cEvaluation: Number.NaN });
        continue;
      }
      const twin = async (longest: number) =>
        JSON.parse(
          await workshop.run(workshop.file('twin'), ['0', '0', '0', '-1', String(STEPS), String(longest)]),
        ) as { step: { p50: number }; evaluation: number };
      const c = await twin(1);
      const cStrides = (await twin(spec.substeps)).step.p50;
      turns.push({ own, strides, ownEvaluation, c: c.step.p50, cStrides, cEvaluation: c.evaluation });
    }
    const of = (key: keyof (typeof turns)[number]) => median(turns.map((turn) => turn[key]));
    return {
      rows: [
        {
          what: `one step of 1 ms: oilspring, ${spec.substeps} substeps each by itself; with strides`,
          value: `${us(of('own'))}; ${us(of('strides'))}`,
        },
        { what: 'one evaluation: oilspring', value: us(of('ownEvaluation')) },
        ...(refused === ''
          ? [
              {
                what: 'C: step, with strides, evaluation',
                value: `${us(of('c'))}; ${us(of('cStrides'))}; ${us(of('cEvaluation'))}`,
              },
              {
                what: 'ratio of the step; with strides',
                value: `${median(turns.map((turn) => turn.own / turn.c)).toFixed(2)}; ${median(turns.map((turn) => turn.strides / turn.cStrides)).toFixed(2)}`,
                goal: 'not above 1.5',
              },
              {
                what: 'ratio of the evaluation',
                value: median(turns.map((turn) => turn.ownEvaluation / turn.cEvaluation)).toFixed(2),
              },
            ]
          : [{ what: 'C', value: `not run: ${refused}` }]),
      ],
      numbers: turns,
    };
  },
};
