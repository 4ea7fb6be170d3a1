import fs from 'node:fs';
import { Packr } from 'msgpackr';
import { beforeAll, describe, expect, it } from 'vitest';
import { crc32, crc32ByTable } from '../../../runtime/recording/crc32.js';
import { exportCsv } from '../../../runtime/recording/export-csv.js';
import { FRAME, MAGIC, RecordingError } from '../../../runtime/recording/format.js';
import { Recording, type RecordingOverview } from '../../../runtime/recording/reader.js';
import { RecordedInputs } from '../../../runtime/recording/recorded-inputs.js';
import { signalDigest } from '../../../runtime/recording/signal-digest.js';
import { startChild } from '../../support/child.js';
import { recordSample, sampleHeader, scratchFile } from './sample.js';

const packr = new Packr({ useRecords: false, variableMapSize: true });

function examine(bytes: Uint8Array): RecordingOverview {
  const file = scratchFile('x.osr');
  fs.writeFileSync(file, bytes);
  const recording = new Recording(file);
  try {
    return recording.examine();
  } finally {
    recording.close();
    fs.rmSync(file);
  }
}

function frame(fields: object, payload: Uint8Array = packr.pack(fields)): Buffer {
  const head = Buffer.alloc(FRAME);
  head.writeUInt32LE(payload.length, 0);
  head.writeUInt32LE(crc32(payload, crc32(head.subarray(0, 4))), 4);
  return Buffer.concat([head, payload]);
}

describe('damage to a recording', () => {
  let whole: Buffer;
  /** Byte at which each block begins, the end of the file last. */
  let starts: number[];
  let rowsBefore: number[];

  beforeAll(async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 60, { blockRows: 8 });
    whole = fs.readFileSync(file);
    starts = [MAGIC.length];
    while (starts.at(-1)! < whole.length) starts.push(starts.at(-1)! + FRAME + whole.readUInt32LE(starts.at(-1)!));
    rowsBefore = starts.map((start, i) => (i === 0 ? 0 : examine(whole.subarray(0, start)).rows));
  });

  it('reads up to the last whole block wherever the file is cut', () => {
    expect(rowsBefore.at(-1)).toBe(60);
    for (let cut = 0; cut < whole.length; cut += 1) {
      const blocks = starts.filter((start) => start <= cut).length - 1;
      if (blocks < 1) {
        expect(() => examine(whole.subarray(0, cut)), `cut at ${cut}`).toThrow(RecordingError);
        continue;
      }
      const found = examine(whole.subarray(0, cut));
      expect(found.ending.how, `cut at ${cut}`).toBe('ended early');
      expect(found.ending.atByte).toBe(starts[blocks]);
      expect(found.blocks).toBe(blocks);
      expect(found.rows).toBe(rowsBefore[blocks]);
    }
  });

  it('sees every single bit that flips', () => {
    let damaged = 0;
    for (let byte = 0; byte < whole.length; byte += 1) {
      const bytes = Buffer.from(whole);
      bytes[byte] = bytes[byte]! ^ (1 << ((byte * 7) % 8));
      const block = starts.findLastIndex((start) => start <= byte);
      if (block < 1) {
        expect(() => examine(bytes), `byte ${byte}`).toThrow(RecordingError);
        continue;
      }
      const found = examine(bytes);
      expect(found.ending.how, `byte ${byte}`).not.toBe('complete');
      expect(found.ending.atByte, `byte ${byte}`).toBe(starts[block]);
      expect(found.ending.what).toMatch(new RegExp(`^block ${block} at byte ${starts[block]}: `));
      if (found.ending.how === 'damaged') damaged += 1;
      // Only in the last block is a bad one the same as a torn one.
      else expect(block).toBe(starts.length - 2);
    }
    expect(damaged).toBeGreaterThan(1000);
  });

  it('sees blocks that are missing, doubled, swapped or behind the end', () => {
    const block = (i: number) => whole.subarray(starts[i], starts[i + 1]);
    const of = (order: number[]) => examine(Buffer.concat([whole.subarray(0, starts[0]), ...order.map(block)]));
    const all = starts.slice(0, -1).map((_, i) => i);
    expect(of(all).ending.how).toBe('complete');
    expect(of(all.filter((i) => i !== 3)).ending.what).toMatch(/its number is 4 and not 3/);
    expect(of([...all.slice(0, 4), 3, ...all.slice(4)]).ending).toMatchObject({ how: 'damaged', atByte: starts[4] });
    expect(of([0, 2, 1, ...all.slice(3)]).ending.how).toBe('damaged');
    expect(examine(Buffer.concat([whole, Buffer.from('x')])).ending).toMatchObject({
      how: 'damaged',
      what: expect.stringMatching(/1 bytes behind the end/),
    });
  });

  it('takes a tail of zeros for what a power cut leaves', () => {
    const cut = starts[starts.length - 3]!;
    expect(examine(Buffer.concat([whole.subarray(0, cut), Buffer.alloc(5000)])).ending).toMatchObject({
      how: 'ended early',
      atByte: cut,
    });
  });

  it('will not digest, export or replay past damage', async () => {
    const file = scratchFile('b.osr');
    const bytes = Buffer.from(whole);
    bytes[starts[4]! + 20]! ^= 1;
    fs.writeFileSync(file, bytes);
    const recording = new Recording(file);
    expect(() => signalDigest(recording)).toThrow(
      /is damaged: block 4 at byte \d+: the checksum does not fit; a good block follows/,
    );
    const to = scratchFile('b.csv');
    await expect(exportCsv(recording, { to })).rejects.toThrow(/is damaged/);
    expect(fs.existsSync(to)).toBe(false);
    const inputs = new RecordedInputs(recording);
    inputs.remaining(1e9);
    expect(inputs.ending?.how).toBe('damaged');
    recording.close();
  });
});

describe('a recording made to do harm', () => {
  const start = () => [Buffer.from(MAGIC), frame({ n: 0, k: 'header', ...sampleHeader() })];
  const ending = (...blocks: Buffer[]) => examine(Buffer.concat([...start(), ...blocks])).ending;
  const bin = (length: number) => Buffer.alloc(length);

  it('is refused where its parts do not fit together', () => {
    const cases: [object, RegExp][] = [
      [{ n: 1, k: 'rows', first: 0, hashes: bin(16), data: bin(8) }, /rows of 2 numbers for 2 ticks of 3 signals/],
      [{ n: 1, k: 'rows', first: 0.5, hashes: bin(8), data: bin(12) }, /tick 0.5 out of order/],
      [{ n: 1, k: 'rows', ticks: bin(24), hashes: bin(16), data: bin(24) }, /ticks that do not match/],
      [{ n: 1, k: 'rows', hashes: bin(16), data: bin(24) }, /field ticks is missing/],
      [{ n: 1, k: 'rows', first: 0, hashes: 'x', data: bin(24) }, /field hashes is missing or not binary/],
      [{ n: 1, k: 'rows', first: 0, hashes: bin(7), data: bin(24) }, /field hashes of 7 bytes is not a multiple of 8/],
      [
        { n: 1, k: 'inputs', ticks: bin(8), links: bin(2), lengths: Buffer.from([255, 255, 255, 255]), bytes: bin(3) },
        /lengths do not add up/,
      ],
      [{ n: 1, k: 'inputs', ticks: bin(8), links: bin(4), lengths: bin(4), bytes: bin(0) }, /lengths do not add up/],
      [
        { n: 1, k: 'events', ticks: bin(8), codes: bin(4), subjects: bin(4), values: bin(8) },
        /events whose parts differ/,
      ],
      [{ n: 1, k: 'snapshot', tick: 'now', block: bin(8) }, /field tick is missing or not a number/],
      [
        { n: 1, k: 'end', rows: 0, inputs: 0, events: 0, dropped: 0, overflows: 0, summary: [1] },
        /an end without a summary/,
      ],
      [{ n: 1, k: 'surprise' }, /unknown kind of block "surprise"/],
    ];
    for (const [fields, message] of cases) {
      const found = ending(frame(fields));
      expect(found.how).toBe('damaged');
      expect(found.what).toMatch(message);
    }
  });

  it('cannot make the reader allocate what is not there, nest without end, or name a prototype', () => {
    const huge = Buffer.from([0xdd, 0xff, 0xff, 0xff, 0xff]);
    const cases: [Buffer, RegExp][] = [
      [huge, /a list of 4294967295 at byte 5 is longer than what follows/],
      [Buffer.from([0xdf, 0xff, 0xff, 0xff, 0xff]), /a map of 4294967295/],
      [Buffer.from([0xc6, 0xff, 0xff, 0xff, 0xff]), /ends at byte 5, in the middle of a value/],
      [Buffer.from([0xdb, 0xff, 0xff, 0xff, 0xff]), /in the middle of a value/],
      [Buffer.alloc(100, 0x91), /nested deeper than 32/],
      [packr.pack({ n: 1, k: new Date(0) }), /has no place here/],
      [
        Buffer.concat([Buffer.from([0x81, 0xa9]), Buffer.from('__proto__'), Buffer.from([0x80])]),
        /is not a plain name/,
      ],
      [Buffer.from([0x82, 0xa1, 0x6e, 0x01, 0xa1, 0x6e, 0x01]), /key "n" stands twice/],
      [Buffer.from([0xa2, 0xc3, 0x28]), /is not UTF-8/],
      [Buffer.from([0x80, 0x80]), /1 bytes too many/],
      [Buffer.from([0x01]), /the contents are not a map/],
    ];
    for (const [payload, message] of cases) expect(ending(frame({}, payload)).what).toMatch(message);
    const length = Buffer.alloc(FRAME);
    length.writeUInt32LE(0xfffffff0, 0);
    expect(ending(length).what).toMatch(/a length of 4294967280 bytes is no block's/);
  });

  it('is refused with a header that is not one', () => {
    const opening = (header: object) =>
      examine(Buffer.concat([Buffer.from(MAGIC), frame({ n: 0, k: 'header', ...header })]));
    expect(() => opening({ ...sampleHeader(), step: -1 })).toThrow(/header field step/);
    expect(() => opening({ ...sampleHeader(), signals: [{ path: '=1+1', unit: 'Pa', about: '', group: '' }] })).toThrow(
      /header field signals.0.path/,
    );
    expect(() => opening({})).toThrow(/header field format/);
    expect(() => examine(Buffer.concat([Buffer.from(MAGIC), frame({ n: 0, k: 'rows' })]))).toThrow(
      /begins with a block "rows"/,
    );
  });

  it('fares no better with random bytes in its place', () => {
    let state = 12_345;
    const random = () => (state = (Math.imul(state, 1103515245) + 12345) >>> 0) >>> 8;
    for (let round = 0; round < 3000; round += 1) {
      const payload = Buffer.from(packr.pack({ n: 1, k: 'rows', first: 0, hashes: bin(8), data: bin(12) }));
      for (let i = random() % 4; i >= 0; i -= 1) payload[random() % payload.length] = random() & 255;
      const found = ending(frame({}, payload));
      expect(['damaged', 'ended early']).toContain(found.how);
    }
  });
});

it('has the same checksum with and without zlib', () => {
  expect(crc32(Buffer.from('123456789'))).toBe(0xcbf43926);
  expect(crc32ByTable(Buffer.from('123456789'))).toBe(0xcbf43926);
  const bytes = Buffer.from(Array.from({ length: 1000 }, (_, i) => (i * 31) & 255));
  expect(crc32ByTable(bytes.subarray(400), crc32ByTable(bytes.subarray(0, 400)))).toBe(crc32(bytes));
});

describe('a recorder killed with SIGKILL', () => {
  const rounds = Number(process.env['OILSPRING_KILLS'] ?? 6);
  it(
    `leaves a recording that reads up to its last whole block (${rounds} times)`,
    async () => {
      let rows = 0;
      for (let round = 0; round < rounds; round += 1) {
        const file = scratchFile('killed.osr');
        const child = startChild(new URL('./record-for-ever.ts', import.meta.url), [file]);
        await new Promise<void>((resolve) => child.stdout!.once('data', () => resolve()));
        await new Promise((resolve) => setTimeout(resolve, Math.random() * 300));
        const ended = new Promise((resolve) => child.once('exit', resolve));
        child.kill('SIGKILL');
        await ended;
        const recording = new Recording(file);
        const found = recording.examine();
        expect(found.ending.how).toBe('ended early');
        expect(recording.bytes - found.ending.atByte).toBeLessThan(1 << 20);
        // All that was there is right: ticks without a gap, each with the values it should have.
        let tick = 0;
        const inputs = new RecordedInputs(recording);
        const into = new Uint8Array(64);
        for (const block of recording.blocks()) {
          if (block.kind !== 'rows') continue;
          for (let i = 0; i < block.count; i += 1, tick += 1) {
            if (block.ticks[i] !== tick || block.data[i] !== Math.fround(1e5 + tick))
              throw new Error(`row ${tick} is wrong`);
            for (let link = 0; link < tick % 3; link += 1)
              if (inputs.next(tick, link, into) < 0) throw new Error(`input of tick ${tick} is missing`);
          }
        }
        expect(tick).toBe(found.rows);
        rows += tick;
        recording.close();
        fs.rmSync(file);
      }
      expect(rows).toBeGreaterThan(100 * rounds);
    },
    30_000 + 10_000 * rounds,
  );
});
