import fs from 'node:fs';
import fc from 'fast-check';
import { Packr } from 'msgpackr';
import { describe, expect, it } from 'vitest';
import { exportCsv, shortest } from '../../../runtime/recording/export-csv.js';
import { Recording } from '../../../runtime/recording/reader.js';
import { unpack } from '../../../runtime/recording/unpack.js';
import { recordSample, scratchFile } from './sample.js';

describe('export to CSV', () => {
  it('writes time and the signals asked for, with units, at the ticks asked for', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 200);
    const recording = new Recording(file);
    const to = scratchFile('a.csv');
    const shares: number[] = [];
    const result = await exportCsv(recording, {
      to,
      signals: ['gas.temperature', 'line.pressure'],
      everyTicks: 50,
      onProgress: (share) => shares.push(share),
    });
    expect(result).toMatchObject({ rows: 4, columns: 2, ending: { how: 'complete' } });
    expect(fs.readFileSync(to, 'utf8')).toBe(
      'time (s),gas.temperature (K),line.pressure (Pa)\n0,300,100000\n0.05,283.33334,100050\n0.1,266.66666,100100\n0.15,250,100150\n',
    );
    expect(shares.every((share) => share > 0 && share <= 1)).toBe(true);
    const all = await exportCsv(recording, { to });
    expect([all.rows, all.columns]).toEqual([200, 3]);
    expect(fs.readFileSync(to, 'utf8').split('\n').length).toBe(202);
    recording.close();
  });

  it('refuses unknown signals with the nearest, wrong steps and targets, and removes what it had begun', async () => {
    const file = scratchFile('a.osr');
    await recordSample(file, 200);
    const recording = new Recording(file);
    const to = scratchFile('a.csv');
    await expect(exportCsv(recording, { to, signals: ['line.presure'] })).rejects.toThrow(
      /signal line.presure was not recorded; nearest: line.pressure/,
    );
    await expect(exportCsv(recording, { to, everyTicks: 0 })).rejects.toThrow(/every 0 ticks/);
    await expect(exportCsv(recording, { to: '/dev/null/x' })).rejects.toThrow(
      /\/dev\/null\/x cannot be written: ENOTDIR/,
    );
    await expect(exportCsv(recording, { to, abort: AbortSignal.abort() })).rejects.toThrow(/export stopped/);
    expect(fs.existsSync(to)).toBe(false);
    recording.close();
  });

  it('writes each value as text that reads back as the same 32 bits, and as short as it can', () => {
    fc.assert(
      fc.property(fc.float(), (value) => {
        const text = shortest(value);
        expect(Object.is(Math.fround(Number(text)), value) || Number.isNaN(value)).toBe(true);
        expect(text.length).toBeLessThanOrEqual(Object.is(value, -0) ? 2 : String(value).length);
      }),
      { numRuns: 2000, seed: 5 },
    );
    expect(
      [0.1, 1 / 3, 16_777_216, 3.4028234663852886e38, -0, 1e5].map((value) => shortest(Math.fround(value))),
    ).toEqual(['0.1', '0.33333334', '16777216', '3.4028235e+38', '-0', '100000']);
  });
});

describe('strict reader of MessagePack', () => {
  it('reads what msgpackr writes', () => {
    const packr = new Packr({ useRecords: false, variableMapSize: true });
    const value: fc.Arbitrary<unknown> = fc.letrec((tie) => ({
      value: fc.oneof(
        { maxDepth: 5 },
        fc.constant(null),
        fc.boolean(),
        fc.maxSafeInteger(),
        // msgpackr writes -0 as the whole number 0.
        fc.double().map((number) => number || 0),
        fc.string({ unit: 'grapheme', maxLength: 300 }),
        fc.uint8Array({ maxLength: 400 }).map((bytes) => Buffer.from(bytes)),
        fc.array(tie('value'), { maxLength: 40 }),
        fc.dictionary(
          fc.string({ maxLength: 40 }).filter((key) => key !== '__proto__'),
          tie('value'),
          { maxKeys: 40, noNullPrototype: true },
        ),
      ),
    })).value;
    const plain = (found: unknown): unknown =>
      found instanceof Uint8Array
        ? [...found]
        : Array.isArray(found)
          ? found.map(plain)
          : found !== null && typeof found === 'object'
            ? Object.fromEntries(Object.entries(found).map(([key, one]) => [key, plain(one)]))
            : found;
    fc.assert(
      fc.property(value, (one) => {
        expect(plain(unpack(packr.pack(one)))).toEqual(plain(one));
      }),
      { numRuns: 1000, seed: 9 },
    );
  });
});
