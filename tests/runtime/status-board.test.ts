import { Worker } from 'node:worker_threads';
import { expect, test } from 'vitest';
import { BoardReader, BoardWriter } from '../../runtime/status-board.js';
import { typescriptArguments } from '../support/child.js';

test('gives what was written last by name, and nothing before that', () => {
  const writer = new BoardWriter(Int32Array.of(2, 0), Int32Array.of(1), 20);
  const reader = new BoardReader({ memory: writer.memory, names: ['held', 'warning', 'line.age'] });
  expect(reader.read()).toBe(false);
  expect(reader.tick).toBeNaN();
  writer.write(Float64Array.of(1, 2, 3), Float64Array.of(4, 5), 7);
  expect(reader.read()).toBe(true);
  expect([reader.tick, reader.value('held'), reader.value('warning'), reader.value('line.age')]).toEqual([7, 3, 1, 5]);
  expect(reader.value('nothing of the kind')).toBeUndefined();
  expect([...reader.stretch(reader.place('held'), 2)]).toEqual([3, 1]);
  expect(reader.place('nothing of the kind')).toBe(-1);
});

test('is read whole while another thread writes it', async () => {
  const worker = new Worker(new URL('./board-writer.ts', import.meta.url), { execArgv: [...typescriptArguments] });
  const memory = await new Promise<SharedArrayBuffer>((resolve) => worker.once('message', resolve));
  const names = Array.from({ length: 800 }, (_, i) => `value${i}`);
  const reader = new BoardReader({ memory, names });
  let last: number | undefined;
  worker.on('message', (tick: number) => (last = tick));
  let whole = 0;
  let before = -1;
  while (last === undefined) {
    for (let i = 0; i < 200; i += 1) {
      if (!reader.read()) continue;
      const values = reader.stretch(reader.place('value0'), 800);
      if (!values.every((value) => value === reader.tick)) expect.fail(`torn at tick ${reader.tick}`);
      expect(reader.tick).toBeGreaterThanOrEqual(before);
      before = reader.tick;
      whole += 1;
    }
    await new Promise((resolve) => setImmediate(resolve));
  }
  expect(whole).toBeGreaterThan(100);
  expect(reader.read()).toBe(true);
  expect(reader.tick).toBe(last);
  await worker.terminate();
});
