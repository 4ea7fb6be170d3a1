import type { RunSummary } from '../../../runtime/run-summary.js';
import { type Part, percent, us } from '../part.js';
import { copyBench, median } from '../workshop.js';

/** Fast pace: simulated over wall time and over processor time. */
export const fast: Part = {
  name: 'fast',
  about: 'fast pace of the harbour truck against its controller module, not recorded and recorded',
  async run({ say, workshop }) {
    const bench = copyBench(workshop, 'harbour-truck');
    const turns: { plain: RunSummary; recorded: RunSummary }[] = [];
    for (let turn = 0; turn < 3; turn += 1) {
      say(`turn ${turn + 1} of 3`);
      const plain = await workshop.oilspring(['run', bench, '--pace', 'fast', '--no-record', '--json']);
      const recorded = await workshop.oilspring([
        'run',
        bench,
        '--pace',
        'fast',
        '--record',
        workshop.file(`fast-${turn}.osrec`),
        '--json',
      ]);
      turns.push({ plain, recorded });
    }
    const wall = (of: 'plain' | 'recorded') => median(turns.map((turn) => turn[of].realTimeFactor));
    const processor = (of: 'plain' | 'recorded') =>
      median(turns.map((turn) => turn[of].simulated / turn[of].processor.loop));
    return {
      rows: [
        {
          what: 'times real time, wall clock: not recorded, recorded',
          value: `${wall('plain').toFixed(0)}, ${wall('recorded').toFixed(0)}`,
          goal: '100',
        },
        {
          what: 'the same by processor time of the loop thread',
          value: `${processor('plain').toFixed(0)}, ${processor('recorded').toFixed(0)}`,
        },
        {
          what: 'processors used by the whole process, recorded',
          value: percent(
            median(
              turns.map(({ recorded }) => (recorded.processor.all * recorded.realTimeFactor) / recorded.simulated),
            ),
          ),
        },
        {
          what: 'processor time of a tick',
          value: us(median(turns.map(({ plain }) => (plain.processor.loop / plain.simulated) * 1e-3)) * 1e9),
        },
      ],
      numbers: turns.map(({ plain, recorded }) => ({
        plain: { realTimeFactor: plain.realTimeFactor, processor: plain.processor, simulated: plain.simulated },
        recorded: {
          realTimeFactor: recorded.realTimeFactor,
          processor: recorded.processor,
          simulated: recorded.simulated,
        },
      })),
    };
  },
};
