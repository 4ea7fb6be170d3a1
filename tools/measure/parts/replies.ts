import fs from 'node:fs';
import os from 'node:os';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { type Part, percent, us } from '../part.js';
import { PORTS, startLoad, type Workshop } from '../workshop.js';

/** A bench of two volumes with `count` messages each way in every step: what a link costs, with little plant. */
export function linkBench(count: number, step: string): string {
  const sent = Array.from(
    { length: count },
    (_, i) =>
      `  status${i}: { direction: sent, id: ${i + 1}, every: ${step}, signals: { high: { from: high.pressure, unit: bar(g), range: -1 .. 400 }, low: { from: low.pressure, unit: bar(g), range: -1 .. 400 } } }`,
  );
  const received = Array.from(
    { length: count },
    (_, i) =>
      `  request${i}: { direction: received, id: ${i + 101}, every: ${step}, timeout: 100 ms, signals: { first: { unit: '1', range: 0 .. 1, substitute: 0.5 }, second: { unit: '1', range: 0 .. 1, substitute: 0.5 } } }`,
  );
  return `bench: link of ${count} messages
about: two volumes and an orifice, for measurements of a link
step: ${step}
substeps: 2
ambient: { temperature: 20 degC }
fluids:
  oil: { is: mineral-oil, grade: VG 46, air: 0.5 %, bulkModulus: 1450 MPa, at: 50 degC }
stores:
  high: { is: oil-volume, volume: 1 L, reliefSetting: 330 bar(g), start: { pressure: 100 bar(g) } }
  low: { is: oil-volume, volume: 1 L, start: { pressure: 5 bar(g) } }
branches:
  neck: { is: orifice, from: high, to: low, area: 1 mm2 }
links:
  line: { is: udp, local: 127.0.0.1:${PORTS.bench}, remote: 127.0.0.1:${PORTS.partner} }
messages:
${sent.join('\n')}
${received.join('\n')}
life: { supply: on, key: on, preRoll: 500 ms, bootWindow: 500 ms }
record: { signals: ['*.pressure'] }
`;
}

interface Case {
  readonly step: string;
  readonly count: number;
  readonly busy: boolean;
}

async function one(workshop: Workshop, { step, count, busy }: Case, seconds: number, cores: readonly number[]) {
  const file = workshop.file(`link-${count}.yaml`);
  fs.writeFileSync(file, linkBench(count, step));
  const spec = readBench(file, catalogue);
  const core = cores.at(-1)!;
  const partner = workshop.startPartner(spec.map, cores[0]!);
  const stop = busy ? startLoad(workshop, os.cpus().length) : () => undefined;
  try {
    const run = await workshop.oilspring([
      'run',
      file,
      '--for',
      `${seconds}s`,
      '--controller',
      'external',
      '--no-record',
      '--json',
      '--core',
      String(core),
    ]);
    partner.child.kill('SIGTERM');
    const seen = await partner.done;
    return {
      step,
      count,
      busy,
      oneStepShare: run.links[0]!.oneStepShare,
      received: run.links[0]!.received,
      lost: run.links[0]!.lost,
      lateness: run.timing.lateness,
      tick: run.timing.step,
      share: run.processor.loop / run.simulated,
      overruns: run.timing.overruns,
      code: run.code,
      seen,
    };
  } finally {
    stop();
    partner.child.kill('SIGTERM');
  }
}

/** How many replies to step k are used in step k + 1, by messages a step, rate and load; and the arrivals at the other end. */
export const replies: Part = {
  name: 'replies',
  about:
    'replies used in the next step, 1 and 2 kHz, 1 to 32 messages each way, idle and busy computer; a partner in C on another core',
  async run({ seconds, cores, say, workshop }) {
    const refused = workshop.compile('partner.c', 'partner');
    if (refused !== '')
      return { rows: [{ what: 'replies', value: `not run: ${refused}` }], numbers: `not run: ${refused}` };
    const part = Math.max(3, seconds / 6);
    const found: Awaited<ReturnType<typeof one>>[] = [];
    for (const busy of [false, true])
      for (const step of ['1 ms', '0.5 ms'])
        for (const count of [1, 8, 32]) {
          say(`${count} messages each way every ${step}, ${busy ? 'busy' : 'idle'}`);
          found.push(await one(workshop, { step, count, busy }, part, cores));
        }
    return {
      rows: found.map((row) => ({
        what: `${row.count} each way every ${row.step}, ${row.busy ? 'busy' : 'idle'}: used in the next step; tick median; processor share; arrivals outside, 1 % / 99 % interval`,
        value: `${row.oneStepShare === null ? 'none' : percent(row.oneStepShare)}; ${us(row.tick.p50 * 1e3)}; ${percent(row.share)}; ${us(row.seen.interval.p1)} / ${us(row.seen.interval.p99)}`,
      })),
      numbers: found,
    };
  },
};
