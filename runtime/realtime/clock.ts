import { type LibC, libc } from './ffi.js';

export const CLOCK_REALTIME = 0;
export const CLOCK_MONOTONIC = 1;
export const CLOCK_PROCESS_CPUTIME = 2;
export const CLOCK_THREAD_CPUTIME = 3;

/**
 * The first two seconds in ns fit into 32 bits, and the engine compiles for that and gives its code up when they are
 * over: in the middle of the run. With this lead it sees large numbers from the first reading on.
 */
const LEAD = 1000;
const TIMER_ABSTIME = 1;
const EINTR = 4;
/** A sleep that is interrupted this often is not a sleep: something is wrong with the machine. */
const MOST_INTERRUPTIONS = 1000;

/**
 * The monotonic clock and processor times in nanoseconds as doubles, without allocation. Monotonic time counts from
 * `LEAD` seconds before the clock object was made, so that it stays exact (below 2^53 ns, 104 days).
 */
export class Clock {
  private readonly c: LibC = libc();
  private readonly spec = new Int32Array(4);
  private readonly target = new Int32Array(4);
  private readonly base: number;

  constructor() {
    this.c.clock_gettime(CLOCK_MONOTONIC, this.spec);
    this.base = this.spec[0]! - LEAD;
  }

  /** Writes the monotonic time, ns since `base`, into out[index]. */
  now(out: Float64Array, index: number): void {
    this.c.clock_gettime(CLOCK_MONOTONIC, this.spec);
    out[index] = (this.spec[0]! - this.base) * 1e9 + this.spec[2]!;
  }

  /** Writes the processor time of the calling thread, ns, into out[index]. */
  threadTime(out: Float64Array, index: number): void {
    this.c.clock_gettime(CLOCK_THREAD_CPUTIME, this.spec);
    // By way of the array: a double from the first reading on (see LEAD).
    out[index] = this.spec[0]!;
    out[index] = out[index]! * 1e9 + this.spec[2]!;
  }

  /** Writes the processor time of all threads of the process, ns, into out[index]. */
  processTime(out: Float64Array, index: number): void {
    this.c.clock_gettime(CLOCK_PROCESS_CPUTIME, this.spec);
    // By way of the array: a double from the first reading on (see LEAD).
    out[index] = this.spec[0]!;
    out[index] = out[index]! * 1e9 + this.spec[2]!;
  }

  /**
   * Sleeps until times[index] (ns since `base`, a whole number); goes back to sleep when a signal interrupts it. Returns
   * 0, or the error number of the C library.
   */
  sleepUntil(times: Float64Array, index: number): number {
    const time = times[index]!;
    const seconds = Math.floor(time / 1e9);
    this.target[0] = this.base + seconds;
    this.target[2] = time - seconds * 1e9;
    let result = 0;
    for (let i = 0; i < MOST_INTERRUPTIONS; i += 1) {
      result = this.c.clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, this.target, null);
      if (result !== EINTR) return result;
    }
    return result;
  }
}
