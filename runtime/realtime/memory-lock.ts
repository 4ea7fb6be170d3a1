import { errnoName, libc, whyNotLive } from './ffi.js';
import { schedulingRights } from './scheduling.js';

const MCL_CURRENT = 1;
const MCL_FUTURE = 2;
const MCL_ONFAULT = 4;

export interface MemoryLock {
  readonly locked: boolean;
  readonly words: string;
  /** Before any worker ends and before the process ends; harmless when repeated. */
  release(): void;
}

let exitHooked = false;

/**
 * Keeps the pages of the whole process in memory (pages that come later as well, once touched), where its rights allow.
 *
 * V8 aborts the process when an isolate ends while its memory is locked. So the lock has to be released before a worker
 * ends or is terminated, and on the way out: an `exit` hook of the calling thread does the latter. The host thread calls
 * this, because it outlives the workers that it starts; a lock taken by a worker lacks the hook in the host thread.
 */
export function lockMemory(): MemoryLock {
  if (whyNotLive() !== '') return { locked: false, words: `memory not locked: ${whyNotLive()}`, release() {} };
  const c = libc();
  const rights = schedulingRights();
  // With a limit and no capability the call may succeed now and let a later allocation fail, which ends the process.
  if (!rights.lockCapability && rights.lockLimit !== Number.POSITIVE_INFINITY) {
    return { locked: false, words: `memory not locked: needs CAP_IPC_LOCK or no limit (${rights.words})`, release() {} };
  }
  if (!exitHooked) {
    exitHooked = true;
    process.on('exit', () => c.munlockall());
  }
  if (c.mlockall(MCL_CURRENT | MCL_FUTURE | MCL_ONFAULT) !== 0) {
    return { locked: false, words: `memory not locked: ${errnoName(c.errno())} (${rights.words})`, release() {} };
  }
  return {
    locked: true,
    words: 'memory of the process locked',
    release() {
      c.munlockall();
    },
  };
}
