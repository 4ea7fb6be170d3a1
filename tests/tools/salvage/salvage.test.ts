import fs from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { exportCsv } from '../../../runtime/recording/export-csv.js';
import { FRAME, MAGIC, RecordingError } from '../../../runtime/recording/format.js';
import { Recording } from '../../../runtime/recording/reader.js';
import { reportOfRecording } from '../../../tools/report/from-recording.js';
import { rederive } from '../../../tools/run/rederive.js';
import { endsWhole } from '../../../tools/salvage/ends-whole.js';
import { lastWithoutEnd } from '../../../tools/salvage/last-without-end.js';
import { copyWhole, lookInto } from '../../../tools/salvage/look.js';
import { remainsText } from '../../../tools/salvage/words.js';
import { random } from '../../support/random.js';
import { runCommand, scratch, startCommand } from '../../system/command.js';

/** 8 and more: every cut and every garbled file is reported on too. */
const effort = Number(process.env['OILSPRING_EFFORT'] ?? 1);
const folder = scratch();
const whole = folder.file('whole.osrec');
const bench = 'configs/flywheel-stand/bench.yaml';
let bytes: Buffer;
/** Byte at which each block begins, the end of the file last, and the rows before it. */
const starts = [MAGIC.length];
const rowsBefore = [0];
let firstTick = 0;
afterAll(() => folder.remove());

beforeAll(async () => {
  const run = await runCommand('run', bench, '--pace', 'fast', '--for', '500ms', '--record', whole, '--json');
  expect(run.code, run.errors).toBe(0);
  bytes = fs.readFileSync(whole);
  const recording = new Recording(whole);
  let rows = 0;
  starts.push(recording.afterHeader);
  rowsBefore.push(0);
  for (const block of recording.blocks()) {
    if (block.kind === 'rows') rows += block.count;
    if (block.kind === 'rows' && rows === block.count) firstTick = block.ticks[0]!;
    starts.push(recording.position);
    rowsBefore.push(rows);
  }
  recording.close();
});

const put = (name: string, content: Uint8Array): string => {
  const file = folder.file(name);
  fs.writeFileSync(file, content);
  return file;
};
const exported = async (file: string): Promise<number> => {
  const recording = new Recording(file);
  try {
    return (await exportCsv(recording, { to: folder.file('x.csv') })).rows;
  } finally {
    recording.close();
  }
};
const yes = () => true;

describe('a recording cut off anywhere', () => {
  it('is told, reported as not valid: ended early, and exported up to its last whole block', async () => {
    const choose = random(8);
    const cuts = [
      ...starts.slice(2, -1),
      ...starts.slice(2, -1).map((start) => start + FRAME - 1),
      ...Array.from({ length: 10 * effort }, () => starts[1]! + choose(bytes.length - starts[1]!)),
    ];
    for (const at of cuts) {
      const file = put('cut.osrec', bytes.subarray(0, at));
      const blocks = starts.filter((start) => start <= at).length - 1;
      const rows = rowsBefore[blocks]!;
      const ticks = rows === 0 ? 0 : Math.max(0, firstTick + rows);
      expect(endsWhole(file), `cut at ${at}`).toBe(false);
      const found = (await lookInto(file, yes))!;
      expect(found, `cut at ${at}`).toMatchObject({ rows, ticks, gaps: 0, unreadable: at - starts[blocks]! });
      expect(found.ending).toMatchObject({ how: 'ended early', atByte: starts[blocks] });
      expect(remainsText(found)).toContain('not valid: ended early');
      expect(await exported(file)).toBe(rows);
      // a report reads the whole bench again
      if (choose(8) >= effort) continue;
      const { judgement, ticks: reported } = reportOfRecording(file).data;
      expect(judgement).toMatchObject({ verdict: 'not valid', valid: false, reasons: [{ reason: 'ended early' }] });
      expect(reported).toBe(ticks);
    }
    expect(cuts.length).toBeGreaterThan(20);
  });

  it('is derived again up to there', async () => {
    for (const share of [0.5, 0.97]) {
      const at = starts[1]! + Math.floor(share * (bytes.length - starts[1]!));
      const found = await rederive(put('cut.osrec', bytes.subarray(0, at)), yes);
      expect(found).toMatchObject({ identical: true, missing: 0, ending: 'ended early' });
      expect(found.compared).toBe(rowsBefore[starts.filter((start) => start <= at).length - 1]);
      expect(found.remarks.join()).toContain('the recording ended early: ');
    }
  });

  it('before its header was whole is told as a file of which nothing can be read', async () => {
    for (const at of [0, 7, 8, 20, starts[1]! - 1])
      await expect(lookInto(put('cut.osrec', bytes.subarray(0, at)), yes)).rejects.toThrow(RecordingError);
  });
});

describe('a garbled recording', () => {
  it('is never believed beyond the first bad byte, and its whole blocks can be had', async () => {
    const choose = random(88);
    let damaged = 0;
    for (let round = 0; round < 20 * effort; round += 1) {
      const garbled = Buffer.from(bytes);
      const from = starts[1]! + choose(bytes.length - starts[1]!);
      const length = Math.min(bytes.length - from, 1 + choose(choose(3) === 0 ? 40_000 : 40));
      for (let i = from; i < from + length; i += 1) garbled[i] = garbled[i]! ^ (1 + choose(255));
      const file = put('garbled.osrec', garbled);
      const good = starts.filter((start) => start <= from).length - 1;
      const found = (await lookInto(file, yes))!;
      expect(found.ending.how, `garbled at ${from}`).not.toBe('complete');
      expect(found.ending.atByte).toBe(starts[good]);
      expect(found.rows).toBe(rowsBefore[good]);
      if (choose(8) < effort) {
        const { judgement, ticks } = reportOfRecording(file).data;
        expect(judgement).toMatchObject({ verdict: 'not valid', reasons: [{ reason: 'ended early' }] });
        expect(ticks).toBe(rowsBefore[good] === 0 ? 0 : Math.max(0, firstTick + rowsBefore[good]!));
      }
      if (found.ending.how === 'damaged') {
        damaged += 1;
        await expect(exported(file)).rejects.toThrow(/salvage/);
      }
      fs.rmSync(folder.file('copy.osrec'), { force: true });
      copyWhole(found, folder.file('copy.osrec'));
      expect(await exported(folder.file('copy.osrec'))).toBe(rowsBefore[good]);
    }
    expect(damaged).toBeGreaterThan(5);
  });
});

describe('oilspring salvage', () => {
  it('finds what has no end in a folder, and says what to do with it', async () => {
    const place = folder.file('recordings');
    fs.mkdirSync(place);
    fs.copyFileSync(whole, `${place}/whole.osrec`);
    fs.writeFileSync(`${place}/cut.osrec`, bytes.subarray(0, Math.floor(0.7 * bytes.length)));
    fs.writeFileSync(`${place}/torn.osrec`, bytes.subarray(0, 50));
    const run = await runCommand('salvage', place);
    expect(run.code).toBe(3);
    expect(run.output).toContain('cut.osrec: not valid: ended early');
    expect(run.output).toMatch(/holds {8}0\.\d{3} s of 0\.500 s/);
    expect(run.output).toMatch(/oilspring report \S+cut\.osrec --to \S+cut\.html/);
    expect(run.output).toMatch(/torn\.osrec: nothing of it can be read\n.*header is not whole/);
    expect(run.output).toContain('1 other recordings have their end');
    fs.rmSync(`${place}/cut.osrec`);
    fs.rmSync(`${place}/torn.osrec`);
    const fine = await runCommand('salvage', place);
    expect([fine.code, fine.output]).toEqual([0, '1 recordings, all of them with their end\n']);
    expect((await runCommand('salvage', folder.file('nowhere'))).code).toBe(2);
    expect((await runCommand('salvage', bench)).code).toBe(2);
  });

  it('leaves what another process is writing alone, and finds it once that was killed', async () => {
    const place = folder.file('live');
    fs.mkdirSync(place);
    const file = `${place}/now.osrec`;
    const child = startCommand(['run', bench, '--pace', 'fast', '--for', '10min', '--json', '--record', file]);
    const gone = new Promise((resolve) => child.once('close', resolve));
    while (child.exitCode === null && (fs.statSync(file, { throwIfNoEntry: false })?.size ?? 0) < bytes.length)
      await new Promise((resolve) => setTimeout(resolve, 50));
    const during = await runCommand('salvage', place, '--json');
    expect(JSON.parse(during.output)).toMatchObject({ remains: [], writing: [{ file, process: child.pid }] });
    expect(lastWithoutEnd(place)).toBeUndefined();
    child.kill('SIGKILL');
    await gone;
    expect(lastWithoutEnd(place)).toBe(file);
    const after = await runCommand('salvage', place, '--json');
    expect(after.code).toBe(3);
    expect(JSON.parse(after.output)).toMatchObject({ remains: [{ file, gaps: 0 }], writing: [] });
  });
});
