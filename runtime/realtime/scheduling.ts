import { readFileSync } from 'node:fs';
import { errnoName, libc } from './ffi.js';

const SCHED_OTHER = 0;
const SCHED_FIFO = 1;
const PR_SET_TIMERSLACK = 29;
const PR_GET_TIMERSLACK = 30;
/** Enough for 8192 processors. */
const MASK_BYTES = 1024;
/** Above the interrupt threads of a PREEMPT_RT kernel (50), below its watchdogs (99). */
const DEFAULT_PRIORITY = 80;

export interface SchedulingWish {
  /** Priority 1..99 under SCHED_FIFO, or 0 for none. Default 80, or what the rtprio limit allows. */
  readonly priority?: number;
  /** Processor number to stay on; absent: as the kernel likes. */
  readonly core?: number;
}

/** What the calling thread got, in words for the run's record, and the way back. */
export interface Scheduling {
  readonly policy: 'SCHED_FIFO' | 'SCHED_OTHER';
  readonly priority: number;
  /** The processor it is pinned to, or -1. */
  readonly core: number;
  /** ns; SCHED_FIFO has none whatever it says. */
  readonly timerSlack: number;
  readonly words: readonly string[];
  /** Puts back policy, processors and timer slack as they were. Call it on the same thread. */
  restore(): void;
}

/**
 * Makes the calling thread, and no other, as prompt as its rights allow: SCHED_FIFO, one processor, timer slack 1 ns.
 * Never fails for want of a right: `words` says what was refused and what would help.
 */
export function enterScheduling(wish: SchedulingWish = {}): Scheduling {
  const c = libc();
  const words: string[] = [];
  const before = {
    policy: c.sched_getscheduler(0),
    parameter: new Int32Array(1),
    mask: new Uint8Array(MASK_BYTES),
    slack: c.prctl(PR_GET_TIMERSLACK, 0, 0, 0, 0),
  };
  c.sched_getparam(0, before.parameter);
  const maskKnown = c.sched_getaffinity(0, MASK_BYTES, before.mask) >= 0;

  let core = -1;
  if (wish.core !== undefined) {
    const mask = new Uint8Array(MASK_BYTES);
    if (wish.core >= 0 && wish.core < MASK_BYTES * 8) mask[wish.core >> 3] = 1 << (wish.core & 7);
    if (c.sched_setaffinity(0, MASK_BYTES, mask) === 0) {
      core = wish.core;
      words.push(`loop thread pinned to processor ${core}`);
    } else {
      words.push(
        `loop thread not pinned: processor ${wish.core} refused (${errnoName(c.errno())}); allowed are ${allowedCores().join(', ')}`,
      );
    }
  }

  let timerSlack = before.slack;
  if (c.prctl(PR_SET_TIMERSLACK, 1, 0, 0, 0) === 0) timerSlack = 1;
  else words.push(`timer slack stays at ${before.slack} ns (${errnoName(c.errno())})`);

  let policy: Scheduling['policy'] = before.policy === SCHED_FIFO ? 'SCHED_FIFO' : 'SCHED_OTHER';
  let priority = before.parameter[0]!;
  const rights = schedulingRights();
  const wanted =
    wish.priority ??
    (rights.niceCapability ? DEFAULT_PRIORITY : Math.min(DEFAULT_PRIORITY, rights.priorityLimit || DEFAULT_PRIORITY));
  if (wanted > 0) {
    if (c.sched_setscheduler(0, SCHED_FIFO, Int32Array.of(wanted)) === 0) {
      policy = 'SCHED_FIFO';
      priority = wanted;
      words.push(`loop thread under SCHED_FIFO, priority ${priority}`);
    } else {
      words.push(
        `loop thread without SCHED_FIFO (${errnoName(c.errno())}; ${rights.words}), timer slack ${timerSlack} ns instead: ` +
          'lateness under load is an order of magnitude larger. Give the process CAP_SYS_NICE or an rtprio limit of 80',
      );
    }
  } else {
    words.push('loop thread without SCHED_FIFO: not asked for');
  }

  return {
    policy,
    priority,
    core,
    timerSlack,
    words,
    restore() {
      c.sched_setscheduler(0, before.policy < 0 ? SCHED_OTHER : before.policy, before.parameter);
      if (maskKnown) c.sched_setaffinity(0, MASK_BYTES, before.mask);
      if (before.slack > 0) c.prctl(PR_SET_TIMERSLACK, before.slack, 0, 0, 0);
    },
  };
}

/** Numbers of the processors that the calling thread may run on. */
export function allowedCores(): number[] {
  const mask = new Uint8Array(MASK_BYTES);
  const cores: number[] = [];
  if (libc().sched_getaffinity(0, MASK_BYTES, mask) < 0) return cores;
  for (let core = 0; core < MASK_BYTES * 8; core += 1)
    if ((mask[core >> 3]! & (1 << (core & 7))) !== 0) cores.push(core);
  return cores;
}

export interface SchedulingRights {
  /** CAP_SYS_NICE in effect. */
  readonly niceCapability: boolean;
  /** RLIMIT_RTPRIO, 0..99. */
  readonly priorityLimit: number;
  /** CAP_IPC_LOCK in effect. */
  readonly lockCapability: boolean;
  /** RLIMIT_MEMLOCK, bytes; Infinity for none. */
  readonly lockLimit: number;
  readonly words: string;
}

/** The rights of this process to real-time scheduling and locked memory. */
export function schedulingRights(): SchedulingRights {
  const status = readText('/proc/self/status');
  const limits = readText('/proc/self/limits');
  const effective = BigInt(`0x${/^CapEff:\s*([0-9a-f]+)/m.exec(status)?.[1] ?? '0'}`);
  const limit = (name: string) => {
    const found = new RegExp(`^${name}\\s+(\\S+)`, 'm').exec(limits)?.[1] ?? '0';
    return found === 'unlimited' ? Number.POSITIVE_INFINITY : Number(found);
  };
  const niceCapability = ((effective >> 23n) & 1n) === 1n;
  const lockCapability = ((effective >> 14n) & 1n) === 1n;
  const priorityLimit = Math.min(limit('Max realtime priority'), 99);
  const lockLimit = limit('Max locked memory');
  return {
    niceCapability,
    priorityLimit,
    lockCapability,
    lockLimit,
    words: `CAP_SYS_NICE ${niceCapability ? 'yes' : 'no'}, rtprio limit ${priorityLimit}, CAP_IPC_LOCK ${lockCapability ? 'yes' : 'no'}, locked memory limit ${
      lockLimit === Number.POSITIVE_INFINITY ? 'none' : `${lockLimit} bytes`
    }`,
  };
}

function readText(path: string): string {
  try {
    return readFileSync(path, 'utf8');
  } catch {
    return '';
  }
}
