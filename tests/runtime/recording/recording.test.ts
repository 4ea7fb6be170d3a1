import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { describe, expect, it, vi } from 'vitest';
import { RecordingError } from '../../../runtime/recording/format.js';
import { Recording } from '../../../runtime/recording/reader.js';
import { RecordedInputs } from '../../../runtime/recording/recorded-inputs.js';
import { RecordedStates } from '../../../runtime/recording/recorded-states.js';
import { Recorder } from '../../../runtime/recording/recorder.js';
import { signalDigest } from '../../../runtime/recording/signal-digest.js';
import { RecordingWriter } from '../../../runtime/recording/writer.js';
import { createRing } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';
import { recordSample, sampleHeader, sampleInput, sampleTick, scratchFile } from './sample.js';

describe('recording', () => {
  it('gives back everything that was recorded, and how it ended', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 1000);
    const recording = new Recording(file);
    expect(recording.header).toEqual(sampleHeader());
    const overview = recording.examine();
    expect(overview.ending.how).toBe('complete');
    expect(overview).toMatchObject({
      rows: 1000,
      inputs: 999,
      events: 100,
      snapshots: 20,
      firstTick: 0,
      lastTick: 999,
    });
    expect(overview.ending.end).toMatchObject({
      rows: 1000,
      inputs: 999,
      events: 100,
      dropped: 0,
      overflows: 0,
      summary: { verdict: 'passed', ticks: 1000 },
    });
    expect(overview.stamps.length).toBeGreaterThanOrEqual(2);
    expect(Math.abs(overview.stamps[0]!.wall - Date.now())).toBeLessThan(600_000);

    let row = 0;
    for (const block of recording.blocks()) {
      if (block.kind === 'rows') {
        for (let i = 0; i < block.count; i += 1, row += 1) {
          expect(block.ticks[i]).toBe(row);
          expect(block.data[i]).toBe(1e5 + row);
          expect(block.data[block.count + i]).toBe(Math.fround(Math.sin(row)));
          expect(block.data[2 * block.count + i]).toBe(Math.fround(300 - row / 3));
          expect([block.hashes[2 * i], block.hashes[2 * i + 1]]).toEqual([Math.imul(row, 0x9e3779b1), ~row]);
        }
      } else if (block.kind === 'snapshot') expect([...block.block]).toEqual([block.tick, block.tick + 0.5]);
      else if (block.kind === 'events') {
        for (let i = 0; i < block.count; i += 1)
          expect([...block.values.subarray(3 * i, 3 * i + 3)]).toEqual([block.ticks[i], -block.ticks[i]! || -0, 0.5]);
      }
    }
    expect(row).toBe(1000);
    recording.close();
  });

  it('never has a row ahead of the inputs of its tick', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 500, { flushEvery: 0 });
    const recording = new Recording(file);
    let inputs = -1;
    for (const block of recording.blocks()) {
      if (block.kind === 'inputs') inputs = block.ticks[block.count - 1]!;
      // Ticks divisible by three have no input in the sample.
      if (block.kind === 'rows') expect(inputs).toBeGreaterThanOrEqual(block.ticks[block.count - 1]! - 1);
    }
    recording.close();
  });

  it('keeps the ticks of rows with gaps, and owns up to rows that were lost', async () => {
    const file = scratchFile('a.osr');
    const handle = createRing({ capacity: 4096, reserve: 2048, whenFull: 'drop' });
    const journal = new RingJournal(handle, Int32Array.of(0, 1, 2));
    const recorder = new Recorder(handle, new RecordingWriter(file, sampleHeader()), { signals: 3 });
    const signals = new Float64Array(3);
    for (let tick = 0; tick < 300; tick += 1) {
      signals[0] = tick;
      journal.row(tick, signals, Int32Array.of(tick, 0));
      if (tick % 100 === 99) recorder.drain();
    }
    await recorder.finish({});
    const recording = new Recording(file);
    const { rows, ending } = recording.examine();
    expect(journal.dropped).toBeGreaterThan(0);
    expect(rows + journal.dropped).toBe(300);
    expect(ending.end!.dropped).toBe(journal.dropped);
    for (const block of recording.blocks()) {
      if (block.kind === 'rows') for (let i = 0; i < block.count; i += 1) expect(block.data[i]).toBe(block.ticks[i]);
    }
    recording.close();
  });

  it('hands the inputs out again by tick and link, each exactly once', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 1000);
    const recording = new Recording(file);
    const inputs = new RecordedInputs(recording);
    const into = new Uint8Array(64);
    for (let tick = 0; tick < 1000; tick += 1) {
      for (let i = 0; i < tick % 3; i += 1) {
        const expected = sampleInput(tick, i);
        expect(inputs.next(tick, i, into)).toBe(expected.length);
        expect(into.subarray(0, expected.length)).toEqual(expected);
      }
      expect(inputs.next(tick, 0, into)).toBe(-1);
      expect(inputs.next(tick, 1, into)).toBe(-1);
    }
    expect(inputs.taken).toBe(999);
    expect(inputs.remaining(1e9)).toBe(0);
    expect(inputs.ending?.how).toBe('complete');
    recording.close();
  });

  it('compares states by tick, and has the blocks of the ticks that have one', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 300, { blockRows: 40 }, -100);
    const recording = new Recording(file);
    const states = new RecordedStates(recording);
    const hash = new Int32Array(2);
    const found: number[] = [];
    const blocks: number[] = [];
    for (let tick = -100; tick < 210; tick += 1) {
      hash[0] = Math.imul(tick, 0x9e3779b1);
      hash[1] = tick === 77 ? 0 : ~tick;
      found.push(states.compare(tick, hash));
      const block = states.snapshot(tick);
      if (block !== undefined) blocks.push(block[0]!);
    }
    expect(found.indexOf(0)).toBe(177);
    expect(found.filter((one) => one === 1).length).toBe(299);
    expect(found.slice(300).every((one) => one === -1)).toBe(true);
    expect(blocks).toEqual([-100, -50, 0, 50, 100, 150]);
    expect(states.ending?.how).toBe('complete');
    expect(states.skipped).toBe(0);
    expect(() => states.compare(5, hash)).toThrow(/tick 5 asked for after tick 209/);
    const late = new RecordedStates(recording);
    hash[1] = ~50;
    hash[0] = Math.imul(50, 0x9e3779b1);
    expect(late.snapshot(50)![0]).toBe(50);
    expect(late.compare(50, hash)).toBe(1);
    expect(late.skipped).toBe(150);
    const inputs = new RecordedInputs(recording);
    expect(inputs.next(-98, 0, new Uint8Array(64))).toBe(-1);
    recording.close();
  });

  it('says when an input was passed over, is too long, or comes from a link that is not there', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 100);
    const recording = new Recording(file);
    const into = new Uint8Array(64);
    expect(() => new RecordedInputs(recording).next(5, 0, into)).toThrow(
      /an input of tick 1 on link 0 was passed over at tick 5/,
    );
    expect(() => new RecordedInputs(recording).next(1, 2, into)).toThrow(/link 2: the recording has 2 links/);
    const short = new RecordedInputs(recording);
    expect(() => short.next(1, 0, new Uint8Array(3))).toThrow(/an input of 7 bytes at tick 1 into room for 3/);
    expect(short.remaining(4)).toBe(4);
    recording.close();
  });

  it('has one digest for the same signals, however they were cut into blocks, and another for a bit that differs', async () => {
    const digest = async (ticks: number, options: object, from = 0) => {
      const file = scratchFile('a.osr');
      await recordSample(file, ticks, options, from);
      const recording = new Recording(file);
      const result = signalDigest(recording);
      recording.close();
      return result;
    };
    const one = await digest(500, { blockRows: 40 });
    expect(one).toMatch(/^[0-9a-f]{64}$/);
    expect(await digest(500, { blockRows: 7, flushEvery: 0 })).toBe(one);
    expect(await digest(499, { blockRows: 40 })).not.toBe(one);
    expect(await digest(500, { blockRows: 40 }, 1)).not.toBe(one);
  });

  it('refuses what is no recording, and files that are there already', () => {
    const file = scratchFile('a.osr');
    const opening = () => new Recording(file);
    expect(opening).toThrow(/cannot be opened: ENOENT, there is no such file/);
    fs.writeFileSync(file, 'hello');
    expect(opening).toThrow(/is not a recording of oilspring/);
    fs.writeFileSync(file, '');
    expect(opening).toThrow(/is not a recording of oilspring/);
    fs.writeFileSync(file, Buffer.from('OSPRING\x09rest'));
    expect(opening).toThrow(/has format 9; this version reads format 1/);
    expect(() => new Recording(path.dirname(file))).toThrow(/is not a file/);
    expect(() => new RecordingWriter(file, sampleHeader())).toThrow(/EEXIST; it exists already: choose another name/);
    expect(() => new RecordingWriter('/dev/null/x', sampleHeader())).toThrow(RecordingError);
  });

  it('calls back for events and the latest row, with or without a file', async () => {
    const handle = createRing({ capacity: 1 << 16, whenFull: 'drop' });
    const journal = new RingJournal(handle, Int32Array.of(0, 1, 2));
    const events: number[][] = [];
    const rows: number[][] = [];
    const recorder = new Recorder(handle, undefined, {
      signals: 3,
      onEvent: (...event) => events.push(event),
      onRow: (tick, values) => rows.push([tick, values[0]!]),
    });
    for (let tick = 0; tick < 25; tick += 1) sampleTick(journal, tick, new Float64Array(3), new Int32Array(2));
    recorder.drain();
    expect(events.map((event) => event[0])).toEqual([0, 10, 20]);
    expect(events[1]).toEqual([10, 0, 0, 10, -10, 0.5]);
    expect(rows).toEqual([[24, 1e5 + 24]]);
    recorder.start();
    sampleTick(journal, 25, new Float64Array(3), new Int32Array(2));
    while (recorder.rows < 26) await new Promise((resolve) => setTimeout(resolve, 2));
    await recorder.finish({});
    expect([recorder.rows, recorder.inputs, recorder.events, recorder.lastTick]).toEqual([26, 25, 3, 25]);
  });
});

describe('a disk that stalls', () => {
  it('costs rows, counted, and no input; what comes afterwards is recorded', async () => {
    const file = scratchFile('a.osr');
    const handle = createRing({ capacity: 1 << 15, reserve: 1 << 14, whenFull: 'drop' });
    const journal = new RingJournal(handle, Int32Array.of(0, 1, 2));
    const writer = new RecordingWriter(file, sampleHeader());
    await writer.drained();
    const recorder = new Recorder(handle, writer, { signals: 3, blockRows: 16, mostBacklog: 4096 });
    const stalled: (() => void)[] = [];
    const write = fs.write.bind(fs) as (...call: unknown[]) => void;
    const stall = vi
      .spyOn(fs, 'write')
      .mockImplementation(((...call: unknown[]) => stalled.push(() => write(...call))) as never);
    const signals = new Float64Array(3);
    const bytes = Uint8Array.of(1, 2, 3);
    const record = (from: number, to: number) => {
      for (let tick = from; tick < to; tick += 1) {
        signals[0] = tick;
        if (tick % 5 === 0) journal.input(tick, 0, bytes, 3);
        journal.row(tick, signals, Int32Array.of(tick, 0));
        recorder.drain();
      }
    };
    record(0, 1000);
    expect(stalled.length).toBe(1);
    expect(journal.dropped).toBeGreaterThan(100);
    const lost = journal.dropped;
    stall.mockRestore();
    stalled[0]!();
    await writer.drained();
    recorder.drain();
    await writer.drained();
    record(1000, 1100);
    await recorder.finish({});
    const recording = new Recording(file);
    const overview = recording.examine();
    expect(overview.ending).toMatchObject({ how: 'complete', end: { dropped: lost, overflows: 0 } });
    expect([overview.rows, overview.inputs, overview.lastTick]).toEqual([1100 - lost, 220, 1099]);
    recording.close();
  });
});

describe('a disk that fails', () => {
  it('leaves a recording that reads up to where the disk was full, and says so', async () => {
    // A file size limit is the same to the writer as a full disk: EFBIG instead of ENOSPC.
    const file = scratchFile('a.osr');
    const script = new URL('./record-until-full.ts', import.meta.url).pathname;
    const hooks = new URL('../../support/typescript-hooks.mjs', import.meta.url).pathname;
    const output = execFileSync(
      'bash',
      ['-c', `ulimit -f 64; trap '' XFSZ; exec "$0" --import "$1" "$2" "$3"`, process.execPath, hooks, script, file],
      { encoding: 'utf8' },
    );
    expect(output).toMatch(/finish: recording \S+ ends at byte \d+: EFBIG/);
    expect(output).toMatch(/rows read: 20000/);
    const recording = new Recording(file);
    const { ending, rows } = recording.examine();
    expect(ending.how).toBe('ended early');
    expect(rows).toBeGreaterThan(100);
    expect(rows).toBeLessThan(20_000);
    recording.close();
  });
});
