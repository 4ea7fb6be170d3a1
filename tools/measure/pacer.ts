import { spawnSync } from 'node:child_process';
import { isMainThread, parentPort, Worker, workerData } from 'node:worker_threads';
import { Clock } from '../../runtime/realtime/clock.js';
import { CollectionMeter, type CollectionReport, collectNow } from '../../runtime/realtime/collection-meter.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { Pacer } from '../../runtime/realtime/pacer.js';
import { allowedCores, enterScheduling } from '../../runtime/realtime/scheduling.js';
import { TimingRecord, type TimingSummary } from '../../runtime/realtime/timing-record.js';

/**
 * Lateness of the loop's waiting at 1 kHz beside cyclictest (Debian package rt-tests) on the same core, one after the
 * other in slices: cyclictest, the pacer, cyclictest again as the null control of the first. Read the ratios, and read
 * them against what the two cyclictest rows differ among themselves.
 *
 *     node dist/tools/measure/pacer.js [seconds per row, default 30] [core, default the last allowed one]
 */
interface PacerResult {
  readonly timing: TimingSummary;
  readonly words: readonly string[];
  /** Processor time of the loop thread as a share of the wall time. */
  readonly share: number;
  readonly collections: CollectionReport;
}

interface Row {
  readonly name: string;
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
  readonly note: string;
}

/** Slices per row, so that a disturbance of seconds falls on all rows. */
const SLICES = 5;
const WARM_UP = 500;

if (!isMainThread) loop(workerData as { seconds: number; core: number });
else await main();

function loop(wish: { seconds: number; core: number }): void {
  Pacer.warmUp();
  const scheduling = enterScheduling({ core: wish.core });
  const pacer = new Pacer({ period: 1e6 });
  const clock = new Clock();
  const times = new Float64Array(4);
  const meter = new CollectionMeter();
  pacer.begin();
  for (let i = 0; i < WARM_UP; i += 1) pacer.wait();
  collectNow();
  for (let i = 0; i < WARM_UP; i += 1) pacer.wait();
  meter.start();
  pacer.count();
  clock.now(times, 0);
  clock.threadTime(times, 1);
  for (let i = 0; i < wish.seconds * 1000; i += 1) pacer.wait();
  clock.now(times, 2);
  clock.threadTime(times, 3);
  const collections = meter.stop();
  scheduling.restore();
  const result: PacerResult = {
    timing: pacer.record.summary(),
    words: scheduling.words,
    share: (times[3]! - times[1]!) / (times[2]! - times[0]!),
    collections,
  };
  parentPort!.postMessage({ result, memory: pacer.record.memory });
}

async function main(): Promise<void> {
  const why = whyNotLive();
  if (why !== '') {
    console.log(`not run: ${why}`);
    return;
  }
  const seconds = Number(process.argv[2] ?? 30);
  const core = Number(process.argv[3] ?? allowedCores().at(-1));
  if (!(seconds > 0)) throw new Error(`seconds ${process.argv[2]}: a positive number`);
  const slice = seconds / SLICES;
  const reference: Map<number, number>[] = [new Map(), new Map()];
  const own = new Map<number, number>();
  let cyclictest = true;
  let last: PacerResult | undefined;
  let share = 0;
  let overruns = 0;
  let collections = 0;
  for (let i = 0; i < SLICES; i += 1) {
    cyclictest &&= runCyclictest(slice, core, reference[0]!);
    const { result, lateness } = await runPacer(slice, core);
    for (const [value, count] of lateness) own.set(value, (own.get(value) ?? 0) + count);
    last = result;
    share += result.share / SLICES;
    overruns += result.timing.overruns;
    collections += result.collections.collections;
    cyclictest &&= runCyclictest(slice, core, reference[1]!);
  }
  const rows: Row[] = [];
  const [first, second] = [quantiles(reference[0]!), quantiles(reference[1]!)];
  if (cyclictest) rows.push({ name: 'cyclictest', ...first, note: '' });
  rows.push({
    name: 'pacer',
    ...quantiles(own),
    note: `${(share * 100).toFixed(1)} % of a core, ${overruns} overruns, ${collections} collections`,
  });
  if (cyclictest) rows.push({ name: 'cyclictest again', ...second, note: '' });
  console.log(`lateness at 1 kHz, ${seconds} s each in ${SLICES} slices, core ${core}, µs; ${last!.words.join('; ')}`);
  for (const row of rows) print(row);
  if (!cyclictest) console.log('cyclictest: not run: not installed (Debian package rt-tests)');
  else {
    const mean = (name: 'p50' | 'p99' | 'p999' | 'max') => (first[name] + second[name]) / 2;
    const mine = quantiles(own);
    const ratio = (name: 'p50' | 'p99' | 'p999' | 'max') => (mine[name] / mean(name)).toFixed(2);
    const control = (name: 'p50' | 'p99' | 'p999' | 'max') => (second[name] / first[name]).toFixed(2);
    console.log(
      `pacer / cyclictest  p50 ${ratio('p50')}  p99 ${ratio('p99')}  p99.9 ${ratio('p999')}  max ${ratio('max')}`,
    );
    console.log(
      `null control        p50 ${control('p50')}  p99 ${control('p99')}  p99.9 ${control('p999')}  max ${control('max')}`,
    );
  }
}

function print(row: Row): void {
  const number = (value: number) => value.toFixed(1).padStart(9);
  console.log(
    `${row.name.padEnd(18)} p50 ${number(row.p50)}  p99 ${number(row.p99)}  p99.9 ${number(row.p999)}  max ${number(row.max)}  ${row.note}`,
  );
}

/** One slice of the pacer in a worker of its own; counts by lateness in µs (the upper edge of the histogram's bucket). */
function runPacer(seconds: number, core: number): Promise<{ result: PacerResult; lateness: Map<number, number> }> {
  return new Promise((resolve, reject) => {
    const worker = new Worker(new URL(import.meta.url), { workerData: { seconds, core }, execArgv: process.execArgv });
    worker.once('error', reject);
    worker.once('message', ({ result, memory }: { result: PacerResult; memory: SharedArrayBuffer }) => {
      const record = new TimingRecord(memory);
      const lateness = new Map<number, number>();
      for (const [value, count] of record.lateness.counts()) lateness.set(value, count);
      worker.once('exit', () => resolve({ result, lateness }));
    });
  });
}

/** One slice of cyclictest under the same policy; adds its counts by µs. False when it is not installed. */
function runCyclictest(seconds: number, core: number, into: Map<number, number>): boolean {
  const policy = enterScheduling({});
  policy.restore();
  const real =
    policy.policy === 'SCHED_FIFO'
      ? ['--priority', String(policy.priority), '--policy', 'fifo']
      : ['--priority', '0', '--policy', 'other'];
  const loops = Math.round(seconds * 1000);
  const run = spawnSync(
    'cyclictest',
    [
      '-q',
      '-t',
      '1',
      '-a',
      String(core),
      '-i',
      '1000',
      '-l',
      String(loops),
      '-h',
      '20000',
      '--latency=1000000',
      ...real,
    ],
    {
      encoding: 'utf8',
    },
  );
  if (run.error !== undefined || run.status !== 0) return false;
  for (const line of run.stdout.split('\n')) {
    const found = /^(\d{6}) (\d{6,})/.exec(line);
    if (found) into.set(Number(found[1]), (into.get(Number(found[1])) ?? 0) + Number(found[2]));
  }
  return true;
}

function quantiles(counts: Map<number, number>): { p50: number; p99: number; p999: number; max: number } {
  const sorted = [...counts].filter((entry) => entry[1] > 0).sort((a, b) => a[0] - b[0]);
  const total = sorted.reduce((sum, entry) => sum + entry[1], 0);
  const at = (share: number) => {
    let seen = 0;
    for (const [value, count] of sorted) if ((seen += count) >= share * total) return value;
    return 0;
  };
  return { p50: at(0.5), p99: at(0.99), p999: at(0.999), max: sorted.at(-1)?.[0] ?? 0 };
}
