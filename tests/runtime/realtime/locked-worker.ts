import { isMainThread, parentPort, Worker } from 'node:worker_threads';
import { lockMemory } from '../../../runtime/realtime/memory-lock.js';

/** Enough garbage for the heap to grow, be collected and shrink. */
function litter(rounds: number): number {
  let kept: unknown[] = [];
  for (let round = 0; round < rounds; round += 1) {
    kept = [];
    for (let i = 0; i < 100_000; i += 1) kept.push({ i });
  }
  return kept.length;
}

if (isMainThread) {
  const worker = new Worker(new URL(import.meta.url), { execArgv: process.execArgv });
  worker.on('message', (words: string) => {
    console.log(words);
    litter(10);
  });
  worker.once('exit', (code) => console.log(`worker ended ${code}`));
} else {
  const lock = lockMemory([
    new Float64Array(new SharedArrayBuffer(4 << 20)),
    new Float64Array(100_000),
    new Float64Array(4),
  ]);
  litter(20);
  parentPort?.postMessage(lock.words);
}
