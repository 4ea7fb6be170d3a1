import { parentPort } from 'node:worker_threads';
import { BoardWriter } from '../../runtime/status-board.js';

/** Writes boards on which every number is the tick, as fast as it goes, until it is told to stop by the last tick. */
const count = 400;
const writer = new BoardWriter(
  Int32Array.from({ length: count }, (_, i) => i),
  Int32Array.from({ length: count }, (_, i) => i),
  1,
);
parentPort!.postMessage(writer.memory);
const values = new Float64Array(count);
const until = Date.now() + 400;
let tick = 0;
for (; Date.now() < until; tick += 1) {
  values.fill(tick);
  writer.write(values, values, tick);
}
parentPort!.postMessage(tick - 1);
