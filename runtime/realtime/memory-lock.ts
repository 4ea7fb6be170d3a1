import { readFileSync } from 'node:fs';
import { errnoName, libc, whyNotLive } from './ffi.js';
import { schedulingRights } from './scheduling.js';

export interface MemoryLock {
  /** Bytes that stay in memory, by mappings of program text and by the views given. */
  readonly textBytes: number;
  readonly viewBytes: number;
  /** For the run's record: what is locked, or why not. */
  readonly words: string;
  /** Unlocks everything that this process has locked; harmless when repeated. */
  release(): void;
}

/**
 * Keeps in memory what a live loop must not wait for a disk for: the mapped program files (node, the C library, FFI) and
 * the loop's own numbers (`views`: block, signals, rings, histograms).
 *
 * Not `mlockall`: V8 discards pages of its own heap with madvise(MADV_DONTNEED), which the kernel refuses on locked pages
 * (EINVAL, madvise(2)), and V8 then aborts the process: when an isolate ends, and already when its code space grows. The
 * heap's pages are anonymous memory and leave only for a swap device; `words` says if there is one.
 */
export function lockMemory(views: readonly ArrayBufferView[]): MemoryLock {
  const why = whyNotLive();
  if (why !== '') return { textBytes: 0, viewBytes: 0, words: `memory not locked: ${why}`, release() {} };
  const c = libc();
  const refused: string[] = [];
  let viewBytes = 0;
  for (const view of views) {
    if (view.byteLength === 0) continue;
    if (c.mlock(c.addressOf(view), view.byteLength) === 0) viewBytes += view.byteLength;
    else refused.push(`${view.byteLength} bytes of loop data (${errnoName(c.errno())})`);
  }
  let textBytes = 0;
  for (const [from, to] of programText()) {
    if (c.mlock(from, to - from) === 0) textBytes += to - from;
    else if (refused.push(`program text (${errnoName(c.errno())})`) > 3) break;
  }
  const parts = [`${megabytes(textBytes)} of program text and ${megabytes(viewBytes)} of loop data locked in memory`];
  if (refused.length > 0)
    parts.push(
      `refused: ${[...new Set(refused)].join(', ')}; ${schedulingRights().words}; CAP_IPC_LOCK or a larger limit would help`,
    );
  parts.push(
    hasSwap() ? 'the heap is not locked and this computer swaps: turn swap off for live runs' : 'no swap in use',
  );
  return {
    textBytes,
    viewBytes,
    words: parts.join('; '),
    release() {
      c.munlockall();
    },
  };
}

/** Address ranges of the mapped executable file pages of this process. */
function programText(): [number, number][] {
  const ranges: [number, number][] = [];
  for (const line of readFileSync('/proc/self/maps', 'utf8').split('\n')) {
    const found = /^([0-9a-f]+)-([0-9a-f]+) r-xp \S+ \S+ [1-9]\d*\s+\//.exec(line);
    if (found) ranges.push([Number.parseInt(found[1]!, 16), Number.parseInt(found[2]!, 16)]);
  }
  return ranges;
}

function hasSwap(): boolean {
  try {
    return readFileSync('/proc/swaps', 'utf8').trim().split('\n').length > 1;
  } catch {
    return false;
  }
}

function megabytes(bytes: number): string {
  return `${(bytes / 1e6).toFixed(1)} MB`;
}
