import { spawn } from 'node:child_process';
import { enterScheduling } from '../../runtime/realtime/scheduling.js';

/** Counts of lateness by its value, µs. */
export type LatenessCounts = Map<number, number>;

export interface CyclictestWish {
  readonly seconds: number;
  /** Length of a period, µs. */
  readonly interval: number;
  /** Absent: as the kernel likes. */
  readonly core?: number | undefined;
}

/** Above this it counts in one bucket, µs. */
const MOST = 50_000;

/**
 * Runs `cyclictest` (Debian package rt-tests), the kernel developers' own measure of wake-up latency, under the policy
 * that the loop gets on this computer. Its counts by whole µs, or undefined where it is not installed or will not run.
 */
export function runCyclictest(wish: CyclictestWish): Promise<LatenessCounts | undefined> {
  const trial = enterScheduling({});
  trial.restore();
  const policy =
    trial.policy === 'SCHED_FIFO'
      ? ['--priority', String(trial.priority), '--policy', 'fifo']
      : ['--priority', '0', '--policy', 'other'];
  const pin = wish.core === undefined ? [] : ['-a', String(wish.core)];
  const loops = Math.max(1, Math.round((wish.seconds * 1e6) / wish.interval));
  // `--latency` large: it leaves the idle states as the loop finds them
  const words = [
    '-q',
    '-t',
    '1',
    ...pin,
    '-i',
    String(wish.interval),
    '-l',
    String(loops),
    '-h',
    String(MOST),
    '--latency=1000000',
    ...policy,
  ];
  return new Promise((resolve) => {
    const child = spawn('cyclictest', words, { stdio: ['ignore', 'pipe', 'ignore'] });
    let text = '';
    child.stdout.setEncoding('utf8').on('data', (part: string) => {
      text += part;
    });
    child.once('error', () => resolve(undefined));
    child.once('close', (code) => resolve(code === 0 ? countsOf(text) : undefined));
  });
}

/** The histogram in what cyclictest prints: `000012 004711`. */
export function countsOf(text: string): LatenessCounts {
  const counts: LatenessCounts = new Map();
  for (const line of text.split('\n')) {
    const row = /^(\d{6}) (\d{6,})/.exec(line);
    if (row && Number(row[2]) > 0) counts.set(Number(row[1]), (counts.get(Number(row[1])) ?? 0) + Number(row[2]));
    const over = /^# Histogram Overflows: (\d+)/.exec(line);
    if (over && Number(over[1]) > 0) counts.set(MOST, (counts.get(MOST) ?? 0) + Number(over[1]));
  }
  return counts;
}
