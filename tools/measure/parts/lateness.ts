import { type LatenessCounts, runCyclictest } from '../../readiness/cyclictest.js';
import { measureLateness } from '../../readiness/lateness.js';
import { pool, quantiles } from '../../readiness/tail.js';
import { type Part, percent, us } from '../part.js';

/**
 * The loop's waiting beside cyclictest: same policy, same core, in turns, cores swapped, pooled. Each side runs twice:
 * its second row against its first is the null control. The loop spins the last 90 µs before a deadline and cyclictest
 * does not: the processor share is the price of the difference.
 */
export const lateness: Part = {
  name: 'lateness',
  about: 'lateness at 1 kHz beside cyclictest (same policy, same minutes, cores swapped, pooled)',
  async run({ seconds, cores, say }) {
    const slices = 2;
    const rows: LatenessCounts[] = [new Map(), new Map(), new Map(), new Map()];
    const shares: number[] = [];
    let policy = '';
    let floor = true;
    for (const core of cores) {
      for (let slice = 0; slice < slices; slice += 1) {
        const part: number = seconds / slices;
        say(`core ${core}, turn ${slice + 1} of ${slices}`);
        for (const k of [0, 1]) {
          const counts: LatenessCounts | undefined = floor
            ? await runCyclictest({ seconds: part, interval: 1000, core })
            : undefined;
          floor = counts !== undefined;
          if (counts) pool(rows[k]!, counts);
          const own = await measureLateness({ seconds: part, period: 1e6, core });
          pool(rows[2 + k]!, own.counts);
          shares.push(own.share);
          policy = own.policy;
        }
      }
    }
    const [c1, c2, p1, p2] = rows.map(quantiles);
    const all = (a: LatenessCounts, b: LatenessCounts) => {
      const both: LatenessCounts = new Map(a);
      pool(both, b);
      return quantiles(both);
    };
    const c = all(rows[0]!, rows[1]!);
    const p = all(rows[2]!, rows[3]!);
    const share = shares.reduce((sum, one) => sum + one, 0) / shares.length;
    const ratio = (a: number, b: number) => (b > 0 ? String(Number((a / b).toPrecision(2))) : 'not defined');
    const text = (q: typeof p) => `${us(q.p50 * 1e3)} / ${us(q.p99 * 1e3)} / ${us(q.p999 * 1e3)} / ${us(q.max * 1e3)}`;
    return {
      rows: [
        { what: `loop's waiting, median / 99 % / 99.9 % / worst of ${p.count} (${policy})`, value: text(p) },
        ...(floor
          ? [{ what: `cyclictest, the same of ${c.count}`, value: text(c) }]
          : [{ what: 'cyclictest', value: 'not run: not installed (Debian package rt-tests)' }]),
        ...(floor
          ? [
              { what: 'ratio of the 99 % values', value: ratio(p.p99, c.p99), goal: 'not above 1.3' },
              {
                what: 'null control: cyclictest again / cyclictest; waiting again / waiting (99 %)',
                value: `${ratio(c2!.p99, c1!.p99)}; ${ratio(p2!.p99, p1!.p99)}`,
              },
            ]
          : []),
        { what: 'processor share of the waiting', value: percent(share), goal: 'not above 15 %' },
      ],
      numbers: {
        policy,
        share,
        waiting: { first: p1, second: p2, pooled: p },
        cyclictest: floor ? { first: c1, second: c2, pooled: c } : 'not run: not installed',
      },
    };
  },
};
