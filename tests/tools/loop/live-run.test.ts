import { spawn, spawnSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { whyNotLive } from '../../../runtime/realtime/ffi.js';
import type { RunSummary } from '../../../runtime/run-summary.js';
import { packageRoot } from '../../../tools/loop/controller-module.js';
import { linkBench } from '../../../tools/measure/parts/replies.js';
import { Workshop } from '../../../tools/measure/workshop.js';

const why = whyNotLive();
if (why !== '') console.log(`not run: live runs: ${why}`);
const program = path.join(packageRoot(), 'dist', 'tools', 'oilspring.js');
const built = fs.existsSync(program);
if (!built) console.log('not run: live runs: the project is not built (npm test does)');
const root = process.getuid?.() === 0 && spawnSync('setpriv', ['--version']).error === undefined;
if (!root)
  console.log(
    'not run: live runs without rights and with CAP_SYS_NICE alone: needs root and setpriv to give rights up',
  );

/** Ordinary user, all capabilities gone but the named one. */
const dropped = (keep: string) => [
  'setpriv',
  ...[
    '--reuid=65534',
    '--regid=65534',
    '--clear-groups',
    '--no-new-privs',
    '--bounding-set',
    keep === '' ? '-all' : `-all,+${keep}`,
  ],
  ...['--inh-caps', keep === '' ? '-all' : `-all,+${keep}`, '--ambient-caps', keep === '' ? '-all' : `-all,+${keep}`],
];

describe.skipIf(why !== '' || !built)('a live run', () => {
  const workshop = new Workshop();
  afterAll(() => workshop.close());
  fs.chmodSync(workshop.folder, 0o755);
  const bench = workshop.file('link.yaml');
  // a port of its own, and nobody at the other end: other runs go on beside this test
  fs.writeFileSync(
    bench,
    linkBench(2, '1 ms').replace('127.0.0.1:47710', '127.0.0.1:47733').replace('127.0.0.1:47711', '127.0.0.1:47734'),
  );
  const words = (time: string) => [
    process.execPath,
    program,
    'run',
    bench,
    '--for',
    time,
    '--controller',
    'external',
    '--no-record',
    '--json',
  ];

  function run(prefix: readonly string[], time: string): RunSummary {
    const [command, ...rest] = [...prefix, ...words(time)];
    const found = spawnSync(command!, rest, { encoding: 'utf8', env: { ...process.env, NODE_OPTIONS: '' } });
    expect(found.stderr).toBe('');
    return JSON.parse(found.stdout) as RunSummary;
  }

  // again when it fails: the engine compiles beside this thread, as fast as the other tests let it
  it('collects no garbage, keeps its compiled code, and accounts for its start-up', { retry: 2 }, () => {
    const summary = run([], '5s');
    expect(summary.ending).toBe('complete');
    expect(summary.simulated).toBeCloseTo(5, 9);
    expect(summary.timing.collections).toBe(0);
    expect(summary.code).toMatchObject({ known: true, lost: [] });
    expect(summary.code!.optimised).toBeGreaterThan(20);
    const { load, build, warmUp, attach, preRoll, total, dryTicks } = summary.startUp;
    for (const part of [load, build, warmUp, attach]) expect(part).toBeGreaterThan(0);
    expect(preRoll).toBe(0.5);
    expect(dryTicks).toBeGreaterThan(3000);
    expect(load! + build + warmUp + attach! + preRoll!).toBeLessThan(total + 0.3);
  });

  it.skipIf(!root)('runs without any right, and says what would help', () => {
    const summary = run(dropped(''), '1s');
    expect(summary.ending).toBe('complete');
    expect(summary.scheduling.policy).toBe('SCHED_OTHER');
    expect(summary.scheduling.words.join('\n')).toMatch(/without SCHED_FIFO \(EPERM; CAP_SYS_NICE no/);
  });

  it.skipIf(!root)('runs under SCHED_FIFO with CAP_SYS_NICE alone', () => {
    const summary = run(dropped('sys_nice'), '1s');
    expect(summary.ending).toBe('complete');
    expect(summary.scheduling.policy).toBe('SCHED_FIFO');
    expect(summary.scheduling.words.join('\n')).toMatch(/under SCHED_FIFO, priority 80/);
  });

  it('ends on SIGTERM with a whole summary, in the warm-up and in the run', async () => {
    for (const after of ['building', 'running'] as const) {
      const child = spawn(process.execPath, words('600s').slice(1), { env: { ...process.env, NODE_OPTIONS: '' } });
      let text = '';
      child.stdout.setEncoding('utf8').on('data', (part: string) => {
        text += part;
      });
      const gone = new Promise<number | null>((resolve) => child.once('close', (code) => resolve(code)));
      // by processor time, which no other program's load stretches: the warm-up takes some seconds of it; the run is
      // told by the policy of its thread where the process may have it
      const reached = () =>
        after === 'building' ? processorTime(child.pid!) > 1.5 : fifo(child.pid!) || processorTime(child.pid!) > 25;
      while (!reached() && child.exitCode === null) await new Promise((resolve) => setTimeout(resolve, 20));
      child.kill('SIGTERM');
      await gone;
      const summary = JSON.parse(text) as RunSummary;
      expect(summary.ending).toBe('stopped');
      expect(summary.simulated).toBeLessThan(600);
    }
  });
});

/** Whether a thread of the process runs under SCHED_FIFO (field 41 of proc(5), stat). */
function fifo(pid: number): boolean {
  try {
    return fs
      .readdirSync(`/proc/${pid}/task`)
      .some((task) => fs.readFileSync(`/proc/${pid}/task/${task}/stat`, 'utf8').split(') ')[1]!.split(' ')[38] === '1');
  } catch {
    return false;
  }
}

/** s, user and system. */
function processorTime(pid: number): number {
  try {
    const fields = fs.readFileSync(`/proc/${pid}/stat`, 'utf8').split(') ')[1]!.split(' ');
    return (Number(fields[11]) + Number(fields[12])) / 100;
  } catch {
    return 0;
  }
}
