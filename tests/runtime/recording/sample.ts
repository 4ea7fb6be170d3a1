import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { FORMAT, type RecordingHeader } from '../../../runtime/recording/format.js';
import { Recorder, type RecorderOptions } from '../../../runtime/recording/recorder.js';
import { RecordingWriter } from '../../../runtime/recording/writer.js';
import { createRing } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';

export const SIGNALS = ['line.pressure', 'shaft.speed', 'gas.temperature'];

export function sampleHeader(over: Partial<RecordingHeader> = {}): RecordingHeader {
  return {
    format: FORMAT,
    run: 'sample',
    created: '2024-05-01T10:00:00.000Z',
    software: { version: '0.1.0', node: process.version, v8: process.versions.v8 },
    machine: { cores: 2 },
    bench: { name: 'sample', files: [{ path: 'bench.yaml', text: 'bench: sample\n' }] },
    scenario: null,
    seed: 7,
    step: 1e-3,
    pace: 'fast',
    options: { for: 1 },
    signals: [
      { path: 'line.pressure', unit: 'Pa', about: 'pressure', group: 'state' },
      { path: 'shaft.speed', unit: 'rad/s', about: 'speed', group: 'state' },
      { path: 'gas.temperature', unit: 'K', about: 'temperature', group: 'reading' },
    ],
    events: { kinds: [{ name: 'started', severity: 'note', text: '{subject} started' }], subjects: ['line'] },
    links: ['powertrain', 'body'],
    block: ['line.mass', 'shaft.speed'],
    ...over,
  };
}

/** What the sample's journal gets at a tick: everything a function of the tick, so that a reader can check it. */
export function sampleTick(journal: RingJournal, tick: number, signals: Float64Array, hash: Int32Array): void {
  signals[0] = 1e5 + tick;
  signals[1] = Math.fround(Math.sin(tick));
  signals[2] = 300 - tick / 3;
  hash[0] = Math.imul(tick, 0x9e3779b1);
  hash[1] = ~tick;
  for (let i = 0; i < tick % 3; i += 1) {
    const bytes = sampleInput(tick, i);
    journal.input(tick, i % 2, bytes, bytes.length);
  }
  if (tick % 10 === 0) journal.event(tick, 0, 0, tick, -tick, 0.5);
  journal.row(tick, signals, hash);
  if (tick % 50 === 0) journal.snapshot(tick, Float64Array.of(tick, tick + 0.5));
}

export function sampleInput(tick: number, number: number): Uint8Array {
  return Uint8Array.from({ length: (tick * 7 + number * 13) % 40 }, (_, i) => (tick + number + i) & 255);
}

export function scratchFile(name: string): string {
  return path.join(fs.mkdtempSync(path.join(os.tmpdir(), 'recording-')), name);
}

/** Records `ticks` sample ticks into `file`. */
export async function recordSample(
  file: string,
  ticks: number,
  options: Partial<RecorderOptions> = {},
  from = 0,
): Promise<void> {
  const handle = createRing({ capacity: 1 << 16, whenFull: 'drop' });
  const journal = new RingJournal(handle, Int32Array.of(0, 1, 2));
  const writer = new RecordingWriter(file, sampleHeader());
  const recorder = new Recorder(handle, writer, { signals: 3, blockRows: 40, ...options });
  const signals = new Float64Array(3);
  const hash = new Int32Array(2);
  for (let tick = from; tick < from + ticks; tick += 1) {
    sampleTick(journal, tick, signals, hash);
    if (tick % 25 === 0) recorder.drain();
  }
  journal.close();
  await recorder.finish({ verdict: 'passed', ticks, nothing: undefined });
}
