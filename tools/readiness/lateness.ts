import { isMainThread, parentPort, Worker, workerData } from 'node:worker_threads';
import { Clock } from '../../runtime/realtime/clock.js';
import { CollectionMeter, collectNow } from '../../runtime/realtime/collection-meter.js';
import { holdIdleStates } from '../../runtime/realtime/idle-states.js';
import { Pacer } from '../../runtime/realtime/pacer.js';
import { enterScheduling } from '../../runtime/realtime/scheduling.js';
import { TimingRecord, type TimingSummary } from '../../runtime/realtime/timing-record.js';
import type { LatenessCounts } from './cyclictest.js';

/**
 * Lateness of the loop's own waiting, in a thread of its own as in a live run, with the rights that this process has and
 * nothing to do between the deadlines.
 */
export interface LatenessWish {
  readonly seconds: number;
  /** Length of a period, ns. */
  readonly period: number;
  readonly core?: number | undefined;
  /** Ask the kernel to keep idle states away, as a live run does; cyclictest beside it is told not to. */
  readonly holdIdle?: boolean;
}

export interface LatenessResult {
  readonly timing: TimingSummary;
  /** By µs: the upper edge of the histogram's bucket. */
  readonly counts: LatenessCounts;
  readonly policy: string;
  readonly words: readonly string[];
  /** Processor time of the thread as a share of wall time. */
  readonly share: number;
  readonly collections: number;
}

interface Reply {
  readonly memory: SharedArrayBuffer;
  readonly policy: string;
  readonly words: readonly string[];
  readonly share: number;
  readonly collections: number;
}

const WARM_UP = 500;
const MARK = 'oilspring lateness';

if (!isMainThread && (workerData as { mark?: string } | null)?.mark === MARK)
  loop((workerData as { wish: LatenessWish }).wish);

function loop(wish: LatenessWish): void {
  Pacer.warmUp();
  const clock = new Clock();
  const times = new Float64Array(4);
  const pacer = new Pacer({ period: wish.period });
  const meter = new CollectionMeter();
  const idle = wish.holdIdle ? holdIdleStates() : undefined;
  const scheduling = enterScheduling(wish.core === undefined ? {} : { core: wish.core });
  try {
    pacer.begin();
    for (let i = 0; i < WARM_UP; i += 1) pacer.wait();
    collectNow();
    for (let i = 0; i < WARM_UP; i += 1) pacer.wait();
    meter.start();
    pacer.count();
    clock.now(times, 0);
    clock.threadTime(times, 1);
    const periods = Math.round((wish.seconds * 1e9) / wish.period);
    for (let i = 0; i < periods; i += 1) pacer.wait();
    clock.now(times, 2);
    clock.threadTime(times, 3);
    const { collections } = meter.stop();
    const share = (times[3]! - times[1]!) / (times[2]! - times[0]!);
    const reply: Reply = {
      memory: pacer.record.memory,
      policy: scheduling.policy,
      words: [...scheduling.words, ...(idle ? [idle.words] : [])],
      share,
      collections,
    };
    parentPort!.postMessage(reply);
  } finally {
    scheduling.restore();
    idle?.release();
  }
}

/** Measures in a worker. Rejects when `abort` comes first. */
export function measureLateness(wish: LatenessWish, abort?: AbortSignal): Promise<LatenessResult> {
  return new Promise((resolve, reject) => {
    const worker = new Worker(new URL(import.meta.url), {
      workerData: { mark: MARK, wish },
      execArgv: process.execArgv,
    });
    const stop = () => {
      void worker.terminate();
      reject(new Error('stopped'));
    };
    abort?.addEventListener('abort', stop);
    worker.once('error', reject);
    worker.once('message', (reply: Reply) => {
      const record = new TimingRecord(reply.memory);
      worker.once('exit', () => {
        abort?.removeEventListener('abort', stop);
        resolve({
          timing: record.summary(),
          counts: new Map(record.lateness.counts()),
          policy: reply.policy,
          words: reply.words,
          share: reply.share,
          collections: reply.collections,
        });
      });
    });
  });
}
