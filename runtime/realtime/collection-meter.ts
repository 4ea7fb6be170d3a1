import v8 from 'node:v8';
import vm from 'node:vm';

export interface CollectionReport {
  /** Garbage collections of the calling thread's heap. */
  readonly collections: number;
  /** The longest of them, µs. */
  readonly longest: number;
  /** Bytes that were allocated on the heap of the calling thread, collected or not. */
  readonly allocated: number;
}

interface ProfiledCollection {
  readonly cost: number;
  readonly beforeGC: { readonly heapStatistics: { readonly usedHeapSize: number } };
  readonly afterGC: { readonly heapStatistics: { readonly usedHeapSize: number } };
}

/**
 * Counts the garbage collections of the calling thread and what it allocates between `start` and `stop`. It uses V8's own
 * collection profile: a PerformanceObserver reports nothing in a thread that does not return to its event loop. Both
 * calls allocate; neither belongs in a tick.
 */
export class CollectionMeter {
  private profiler: v8.GCProfiler | undefined;
  private used = 0;
  /** What an empty interval allocates, bytes: the meter's own part. */
  private own = 0;

  constructor() {
    let own = Number.POSITIVE_INFINITY;
    for (let i = 0; i < 4; i += 1) {
      this.start();
      own = Math.min(own, this.stop().allocated);
    }
    this.own = own;
  }

  start(): void {
    this.profiler?.stop();
    this.profiler = new v8.GCProfiler();
    this.profiler.start();
    this.used = v8.getHeapStatistics().used_heap_size;
  }

  /** Throws when it was not started. */
  stop(): CollectionReport {
    if (this.profiler === undefined) throw new Error('CollectionMeter.stop() before start()');
    const used = v8.getHeapStatistics().used_heap_size;
    const found = (this.profiler.stop() as unknown as { statistics: ProfiledCollection[] }).statistics;
    this.profiler = undefined;
    let longest = 0;
    let allocated = 0;
    let from = this.used;
    for (const one of found) {
      longest = Math.max(longest, one.cost);
      allocated += one.beforeGC.heapStatistics.usedHeapSize - from;
      from = one.afterGC.heapStatistics.usedHeapSize;
    }
    return { collections: found.length, longest, allocated: Math.max(0, allocated + used - from - this.own) };
  }
}

/**
 * Collects the calling thread's heap now, so that what start-up and warm-up left behind is not collected in a tick. It
 * changes no heap setting. Does nothing where V8 does not hand out its collector.
 */
export function collectNow(): void {
  v8.setFlagsFromString('--expose-gc');
  const collect = vm.runInNewContext("typeof gc === 'function' ? gc : undefined") as (() => void) | undefined;
  collect?.();
}
