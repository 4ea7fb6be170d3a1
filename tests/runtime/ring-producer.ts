import { workerData } from 'node:worker_threads';
import { type RingHandle, RingWriter } from '../../runtime/ring.js';

const { handle, count } = workerData as { handle: RingHandle; count: number };
const ring = new RingWriter(handle);
for (let number = 0; number < count; number += 1) {
  const length = 8 + ((number * 7919) % 300);
  const at = ring.claim(1, length, number % 3 === 0);
  if (at < 0) continue;
  ring.f64[at >> 3] = number;
  ring.bytes.fill(number & 255, at + 8, at + length);
  ring.publish();
}
ring.close();
