import fs from 'node:fs';
import path from 'node:path';
import { Recording } from '../../../runtime/recording/reader.js';
import type { RunSummary } from '../../../runtime/run-summary.js';
import { packageRoot } from '../../loop/controller-module.js';
import { type Part, percent, us } from '../part.js';
import { copyBench } from '../workshop.js';

/** A long live run, recorded: memory, drift, collections, blocks. */
export const soak: Part = {
  name: 'soak',
  about: 'a long live run of the harbour truck against its controller process, recorded',
  async run({ seconds, say, workshop }) {
    const bench = copyBench(workshop, 'harbour-truck');
    const file = workshop.file('soak.osrec');
    const child = workshop.start(process.execPath, [
      path.join(packageRoot(), 'dist', 'tools', 'oilspring.js'),
      'run',
      bench,
      '--for',
      `${seconds}s`,
      '--record',
      file,
      '--json',
    ]);
    let text = '';
    child.stdout!.setEncoding('utf8').on('data', (part: string) => {
      text += part;
    });
    let errors = '';
    child.stderr!.setEncoding('utf8').on('data', (part: string) => {
      errors += part;
    });
    const memory: { at: number; resident: number }[] = [];
    const began = performance.now();
    const timer = setInterval(() => {
      const at = (performance.now() - began) / 1000;
      const resident = residentOf(child.pid);
      if (resident > 0) memory.push({ at, resident });
      if (memory.length % 30 === 0) say(`${at.toFixed(0)} s, ${(resident / 1e6).toFixed(0)} MB`);
    }, 1000);
    await new Promise<void>((resolve) => child.once('close', () => resolve()));
    clearInterval(timer);
    if (text === '') throw new Error(`the run ended without a summary: ${errors.slice(-300)}`);
    const run = JSON.parse(text) as RunSummary;
    const recording = new Recording(file);
    const overview = recording.examine();
    const bytes = recording.bytes;
    recording.close();
    const settled = memory.filter((one) => one.at > Math.min(60, seconds / 3));
    const slope = slopeOf(settled.slice(0, -2));
    const wall = run.simulated / run.realTimeFactor;
    // from the start of the first counted tick to the end of the last: all periods but the last one, its step, and what was re-phased
    const unexplained = wall - run.simulated - run.timing.drift;
    return {
      rows: [
        { what: 'simulated, verdict', value: `${run.simulated.toFixed(0)} s, ${run.verdictText}` },
        {
          what: 'collections in the loop thread; growth of its heap',
          value: `${run.timing.collections}; ${run.timing.heapGrowth.toFixed(2)} bytes a tick`,
          goal: 'none',
        },
        {
          what: 'resident memory: after the first minute, at the end, slope',
          value: `${((settled[0]?.resident ?? 0) / 1e6).toFixed(1)} MB, ${((settled.at(-3)?.resident ?? 0) / 1e6).toFixed(1)} MB, ${((slope * 60) / 1e3).toFixed(1)} kB a minute`,
          goal: 'flat',
        },
        {
          what: 'drift; wall time less simulated time less drift',
          value: `${(run.timing.drift * 1e3).toFixed(3)} ms; ${(unexplained * 1e3).toFixed(3)} ms`,
          goal: 'within one step',
        },
        {
          what: 'lateness median / 99 % / 99.9 % / worst',
          value: (['p50', 'p99', 'p999', 'max'] as const).map((key) => us(run.timing.lateness[key] * 1e3)).join(' / '),
        },
        {
          what: 'tick median / 99 % / 99.9 % / worst',
          value: (['p50', 'p99', 'p999', 'max'] as const).map((key) => us(run.timing.step[key] * 1e3)).join(' / '),
        },
        {
          what: 'overruns; processor share of the loop thread',
          value: `${run.timing.overruns}; ${percent(run.processor.loop / run.simulated)}`,
        },
        {
          what: 'rows lost; recording',
          value: `${run.rowsLost}; ${overview.ending.how}, ${overview.rows} rows, ${(bytes / 1e6).toFixed(0)} MB`,
          goal: 'none, complete',
        },
        { what: 'replies used in the next step', value: percent(run.links[0]?.oneStepShare ?? 0) },
        {
          what: 'code given up, compiled late',
          value: `${run.code?.lost.map((one) => one.name).join(' ') || 'none'}; ${run.code?.late.map((one) => one.name).join(' ') || 'none'}`,
        },
      ],
      numbers: {
        summary: {
          timing: run.timing,
          code: run.code,
          processor: run.processor,
          startUp: run.startUp,
          links: run.links,
          rowsLost: run.rowsLost,
          simulated: run.simulated,
          wall,
        },
        memory,
        slope,
        unexplained,
        ending: overview.ending,
        rows: overview.rows,
      },
    };
  },
};

function residentOf(pid: number | undefined): number {
  try {
    return 1024 * Number(/^VmRSS:\s+(\d+)/m.exec(fs.readFileSync(`/proc/${pid}/status`, 'utf8'))?.[1] ?? 0);
  } catch {
    return 0;
  }
}

/** Least squares, bytes a second. */
function slopeOf(points: readonly { at: number; resident: number }[]): number {
  const n = points.length;
  if (n < 3) return Number.NaN;
  const at = points.reduce((sum, one) => sum + one.at, 0) / n;
  const resident = points.reduce((sum, one) => sum + one.resident, 0) / n;
  const above = points.reduce((sum, one) => sum + (one.at - at) * (one.resident - resident), 0);
  return above / points.reduce((sum, one) => sum + (one.at - at) ** 2, 0);
}
