import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { performance } from 'node:perf_hooks';
import { Clock } from '../../runtime/realtime/clock.js';
import { FORMAT } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { Recorder } from '../../runtime/recording/recorder.js';
import { signalDigest } from '../../runtime/recording/signal-digest.js';
import { RecordingWriter } from '../../runtime/recording/writer.js';
import { createRing } from '../../runtime/ring.js';
import { RingJournal } from '../../runtime/ring-journal.js';

/**
 * What recording costs: a row in the loop thread, a row in the host thread, the file's size, reading and digesting it.
 * Both threads' work is done in turns by this one thread, so that each is measured alone.
 *
 *     node dist/tools/measure/recording.js [signals, default 100] [ticks, default 60000]
 */
const signals = Number(process.argv[2] ?? 100);
const ticks = Number(process.argv[3] ?? 60_000);
const file = path.join(fs.mkdtempSync(path.join(os.tmpdir(), 'measure-')), 'measure.osr');

const handle = createRing({ whenFull: 'drop' });
const values = new Float64Array(4 * signals);
const journal = new RingJournal(
  handle,
  Int32Array.from({ length: signals }, (_, i) => 4 * i),
);
const hash = new Int32Array(2);
const datagram = new Uint8Array(80);
const writer = new RecordingWriter(file, {
  format: FORMAT,
  run: 'measure',
  created: new Date().toISOString(),
  software: { version: '0', node: process.version, v8: process.versions.v8 },
  machine: {},
  bench: { name: 'measure', files: [] },
  scenario: null,
  seed: 0,
  step: 1e-3,
  pace: 'fast',
  options: {},
  signals: Array.from({ length: signals }, (_, i) => ({
    path: `signal.number${i}`,
    unit: '1',
    about: '',
    group: 'reading',
  })),
  events: { kinds: [], subjects: [] },
  links: ['link'],
  block: [],
});
const recorder = new Recorder(handle, writer, { signals });

// Processor time of this thread: what other programs take does not count.
const clock = new Clock();
const slot = new Float64Array(1);
const now = () => {
  clock.threadTime(slot, 0);
  return slot[0]! / 1e6;
};
const spent = { row: 0, input: 0, drain: 0 };
const portion = 500;
const start = performance.now();
for (let tick = 0; tick < ticks; tick += portion) {
  for (let i = 0; i < values.length; i += 1) values[i] = Math.sin(tick + i);
  const t0 = now();
  for (let i = 0; i < portion; i += 1) journal.row(tick + i, values, hash);
  const t1 = now();
  for (let i = 0; i < portion; i += 1) journal.input(tick + i, 0, datagram, 80);
  const t2 = now();
  recorder.drain();
  const t3 = now();
  spent.row += t1 - t0;
  spent.input += t2 - t1;
  spent.drain += t3 - t2;
  await new Promise((resolve) => setImmediate(resolve));
}
await recorder.finish({});
const written = performance.now() - start;

const recording = new Recording(file);
const r0 = now();
const overview = recording.examine();
const r1 = now();
const digest = signalDigest(recording);
const r2 = now();
const nanoseconds = (milliseconds: number) => `${((milliseconds * 1e6) / ticks).toFixed(0)} ns`;
console.log(`${signals} signals, ${ticks} ticks, one input of 80 bytes a tick`);
console.log(`loop thread   row ${nanoseconds(spent.row)}   input ${nanoseconds(spent.input)}`);
console.log(`host thread   row and input ${nanoseconds(spent.drain)} (checksum, packing and hand-over included)`);
console.log(
  `file          ${(recording.bytes / 1e6).toFixed(1)} MB, ${(recording.bytes / ticks).toFixed(0)} bytes a tick, written at ${(recording.bytes / 1e3 / written).toFixed(0)} MB/s`,
);
console.log(
  `reading       ${nanoseconds(r1 - r0)} a tick, digest ${nanoseconds(r2 - r1)} a tick (${digest.slice(0, 12)}...)`,
);
if (overview.ending.how !== 'complete' || overview.rows !== ticks)
  throw new Error(`the recording is not whole: ${overview.ending.what}`);
recording.close();
fs.rmSync(path.dirname(file), { recursive: true });
