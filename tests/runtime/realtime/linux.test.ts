import { describe, expect, it } from 'vitest';
import { Clock } from '../../../runtime/realtime/clock.js';
import { errnoName, libc, RealtimeUnavailable, whyNotLive } from '../../../runtime/realtime/ffi.js';
import { holdIdleStates } from '../../../runtime/realtime/idle-states.js';
import { machineFacts } from '../../../runtime/realtime/machine-facts.js';
import { allowedCores, enterScheduling, schedulingRights } from '../../../runtime/realtime/scheduling.js';
import { runChild } from '../../support/child.js';

const here = whyNotLive();

describe('real-time machinery elsewhere', () => {
  it('says why it will not run live on another system, and what works instead', () => {
    const platform = Object.getOwnPropertyDescriptor(process, 'platform')!;
    Object.defineProperty(process, 'platform', { ...platform, value: 'darwin' });
    try {
      expect(whyNotLive()).toMatch(/need Linux \(this is darwin\); use --pace fast/);
    } finally {
      Object.defineProperty(process, 'platform', platform);
    }
    expect(new RealtimeUnavailable('x').name).toBe('RealtimeUnavailable');
    expect(errnoName(98)).toBe('EADDRINUSE');
    expect(errnoName(9999)).toBe('errno 9999');
  });
});

if (here !== '') console.log(`not run: real-time machinery of Linux: ${here}`);
describe.skipIf(here !== '')('real-time machinery of Linux', () => {
  it('reads clocks that move forward and sleeps up to a time', () => {
    const clock = new Clock();
    const times = new Float64Array(8);
    clock.now(times, 0);
    times[1] = times[0]! + 3_000_000;
    expect(clock.sleepUntil(times, 1)).toBe(0);
    clock.now(times, 2);
    expect(times[2]).toBeGreaterThanOrEqual(times[1]!);
    // Across a change of second as well.
    times[1] = Math.ceil(times[2]! / 1e9) * 1e9 + 1000;
    expect(clock.sleepUntil(times, 1)).toBe(0);
    clock.now(times, 2);
    expect(times[2]).toBeGreaterThanOrEqual(times[1]!);
    clock.threadTime(times, 3);
    clock.processTime(times, 4);
    for (let i = 0; i < 1e6; i += 1) Math.sqrt(i);
    clock.threadTime(times, 5);
    clock.processTime(times, 6);
    expect(times[5]).toBeGreaterThan(times[3]!);
    expect(times[6]! - times[4]!).toBeGreaterThanOrEqual(times[5]! - times[3]!);
  });

  it('reports a sleep that cannot be', () => {
    const clock = new Clock();
    expect(clock.sleepUntil(Float64Array.of(Number.NaN), 0)).toBe(0);
    // A nanosecond field beyond its range.
    expect(libc().clock_nanosleep(1, 1, Int32Array.of(0, 0, 2_000_000_000, 0), null)).toBe(22);
  });

  it('takes what scheduling it may have, says so, and puts everything back', () => {
    const c = libc();
    const parameter = new Int32Array(1);
    const before = [c.sched_getscheduler(0), allowedCores().join(), c.prctl(30, 0, 0, 0, 0)];
    const core = allowedCores().at(-1)!;
    const scheduling = enterScheduling({ core });
    const rights = schedulingRights();
    expect(scheduling.core).toBe(core);
    expect(allowedCores()).toEqual([core]);
    expect(scheduling.timerSlack).toBe(1);
    c.sched_getparam(0, parameter);
    if (scheduling.policy === 'SCHED_FIFO') {
      expect(c.sched_getscheduler(0)).toBe(1);
      expect(parameter[0]).toBe(scheduling.priority);
      expect(scheduling.words.join('\n')).toMatch(/under SCHED_FIFO, priority \d+/);
    } else {
      expect(scheduling.words.join('\n')).toMatch(/without SCHED_FIFO \(E[A-Z]+; CAP_SYS_NICE/);
      expect(rights.niceCapability && rights.priorityLimit > 0).toBe(false);
    }
    scheduling.restore();
    expect([c.sched_getscheduler(0), allowedCores().join(), c.prctl(30, 0, 0, 0, 0)]).toEqual(before);
  });

  it('holds idle states off while it may, says so, and lets go twice without harm', () => {
    const hold = holdIdleStates();
    hold.release();
    hold.release();
    expect(hold.words).toMatch(hold.held ? /held off$/ : /not held off: \/dev\/cpu_dma_latency E[A-Z]+/);
  });

  it('lists facts about the machine as plain values', () => {
    const facts = machineFacts();
    expect(facts['system']).toMatch(/^Linux \d/);
    expect(facts['processors']).toBeGreaterThan(0);
    expect(facts['preemption']).toMatch(/^(PREEMPT|none)/);
    expect(facts['clockSource']).toMatch(/\w/);
    for (const value of Object.values(facts)) expect(['string', 'number', 'boolean']).toContain(typeof value);
  });

  it('refuses a processor that is not there, in words', () => {
    const scheduling = enterScheduling({ core: 4000, priority: 0 });
    scheduling.restore();
    expect(scheduling.core).toBe(-1);
    expect(scheduling.words.join('\n')).toMatch(/not pinned: processor 4000 refused \(EINVAL\); allowed are \d/);
    expect(scheduling.words.join('\n')).toMatch(/without SCHED_FIFO: not asked for/);
  });

  it('without the rights: goes on without SCHED_FIFO and says what would help', async () => {
    const { output, errors } = await runChild(new URL('./without-rights.ts', import.meta.url));
    const result = JSON.parse(output || errors) as { policy: string; words: string[]; memory: string };
    expect(result.policy).toBe('SCHED_OTHER');
    expect(result.words.join('\n')).toMatch(/without SCHED_FIFO \(EPERM; CAP_SYS_NICE no, rtprio limit \d+/);
    expect(result.memory).toMatch(/MB of program text and .* locked in memory/);
  });

  it('keeps memory locked through collections and the end of a worker', async () => {
    const result = await runChild(new URL('./locked-worker.ts', import.meta.url));
    expect(result.errors).toBe('');
    expect(result.code).toBe(0);
    expect(result.output).toMatch(/MB of program text[^\n]*\nworker ended 0\n$/);
  });

  it('allocates nothing per call in clock, pacer, histogram, socket and journal', async () => {
    const result = await runChild(new URL('./no-allocation.ts', import.meta.url));
    expect(result.errors).toBe('');
    const parts = JSON.parse(result.output) as Record<
      string,
      { calls: number; collections: number; allocated: number }
    >;
    // The meter itself must be able to see garbage: a control that makes some.
    expect(parts['control']!.collections).toBeGreaterThan(0);
    expect(parts['control']!.allocated / parts['control']!.calls).toBeGreaterThan(16);
    for (const [name, part] of Object.entries(parts)) {
      if (name === 'control') continue;
      expect(part.collections, name).toBe(0);
      expect(part.allocated / part.calls, `bytes per call of ${name}`).toBeLessThan(0.5);
    }
    expect(Object.keys(parts).length).toBeGreaterThanOrEqual(12);
  });
});
