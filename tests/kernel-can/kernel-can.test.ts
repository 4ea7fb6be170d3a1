import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { Recording } from '../../runtime/recording/reader.js';
import { RecordedInputs } from '../../runtime/recording/recorded-inputs.js';
import { runCommand } from '../system/command.js';
import { canRun, prepareGuest, runInside } from './guest.js';

/*
 * The real CAN stack of Linux: this computer's own where it has virtual CAN, else a guest kernel. can-utils, python-can
 * and the package socketcan are the third parties. Nothing about time is asserted: a guest is slow and has one processor.
 */
describe.runIf(canRun)('on the CAN stack of Linux', { timeout: 240_000 }, () => {
  beforeAll(prepareGuest, 300_000);

  it('exchanges frames of every kind with can-utils and python-can, and survives whatever an interface does', () => {
    const found = runInside('socket.ts') as {
      fromCanUtils: string[];
      filtered: string[];
      stamped: boolean;
      toCanUtils: string[];
      ownFrames: number;
      fromPython: string[];
      life: Record<string, unknown>;
      overflow: { taken: number; dropped: number };
      queue: { refused: number; counted: number };
      absent: string;
      classic: string;
    };
    const flexible = (head: string, payload: string): string => (head + payload).padEnd(144, '0');
    expect(found.fromCanUtils).toEqual([
      '23010000030000000102ff0000000000',
      '0201ff9804000000aabbccdd00000000',
      flexible('230100000c050000', '000102030405060708090a0b'),
      '24010040000000000000000000000000',
    ]);
    expect(found.filtered).toEqual([found.fromCanUtils[0], found.fromCanUtils[2]]);
    expect(found.stamped).toBe(true);
    expect(found.toCanUtils).toEqual(['321#010203', '18FF0304#DEAD', `322##5${'55'.repeat(12)}`, '323#R']);
    expect(found.ownFrames).toBe(0);
    expect(found.fromPython).toEqual([
      '10000000020000000908000000000000',
      flexible('f0debc9a10050000', '000102030405060708090a0b0c0d0e0f'),
    ]);
    const [up, down, gone] = ['0100000001000000', '0101000001000000', '0102000001000000'];
    expect(found.life).toEqual({
      sendWhileDown: -1,
      // the state, and one frame not sent for ENETDOWN (100)
      down: [down, '0400640001000000'],
      downAtTheOther: [down],
      sendAfterUp: 16,
      upAtTheOther: ['23010000010000000200000000000000', up],
      sendWhileGone: -1,
      goneAtTheOther: [gone],
      again: [up],
      sendAgain: 16,
      heardAgain: ['23010000010000000400000000000000'],
    });
    expect(found.overflow.taken).toBeGreaterThan(0);
    expect(found.overflow.taken + found.overflow.dropped).toBe(1000);
    expect(found.queue.refused).toBeGreaterThan(0);
    expect(found.queue.counted).toBe(found.queue.refused);
    expect(found.absent).toContain('ENODEV finding interface vcan9 failed');
    expect(found.classic).toContain('interface vcan1 is set up for classic CAN and the map has CAN FD messages');
  });

  it('takes 20,000 random frames: every one accounted for, no value outside its range', () => {
    const { counts, messages, outside } = runInside('flood.ts') as {
      counts: Record<string, number>;
      messages: Record<string, Record<string, number>>;
      outside: number;
    };
    expect(outside).toBe(0);
    expect(counts['received']! + counts['dropped']!).toBe(20_001);
    const placed = ['replies', 'unknown', 'remote', 'malformed', 'wrongLength', 'errorFrames'].reduce(
      (sum, name) => sum + counts[name]!,
      0,
    );
    const refused = Object.values(messages).reduce(
      (sum, one) => sum + one['wrongChecksum']! + one['duplicate']! + one['late']! + one['outOfRange']!,
      0,
    );
    expect(placed + refused).toBe(counts['received']);
    for (const name of ['replies', 'unknown', 'remote', 'wrongLength'])
      expect([name, counts[name]! > 100]).toEqual([name, true]);
  });

  it('misbehaves as it counts: candump sees every frame that was dropped, doubled, swapped, damaged, shortened or put in', () => {
    const { ticks, found } = runInside('adversary.ts') as {
      ticks: number;
      found: { faults: Record<string, number>; frames: string[]; own: Record<string, number> }[];
    };
    for (const { faults, frames, own } of found) {
      const payloads = frames.map((frame) => frame.slice('100#'.length));
      const values = payloads.map((payload) => Number.parseInt(payload.slice(2, 4) + payload.slice(0, 2), 16));
      const seen = new Set(payloads);
      const witnessed = {
        Dropped: Array.from({ length: ticks }, (_, i) => i).filter((value) => !values.includes(value)).length,
        Duplicated: frames.length - seen.size,
        Reordered: values.filter((value, i) => i > 0 && value < values[i - 1]!).length,
        Corrupted: payloads.filter(
          (payload, i) => Number.parseInt(payload, 16) !== 0 && (values[i] !== i || !/^.{4}0*$/.test(payload)),
        ).length,
        Flooded: frames.filter((frame) => frame.startsWith('000#')).length,
        Shortened: payloads.filter((payload) => payload.length === 14).length,
      };
      const [fault] = Object.keys(faults);
      const name =
        fault === undefined
          ? undefined
          : {
              sentDrop: 'Dropped',
              sentDuplicate: 'Duplicated',
              sentReorder: 'Reordered',
              sentCorrupt: 'Corrupted',
              sentShorten: 'Shortened',
              sentSilence: 'Dropped',
              sentFlood: 'Flooded',
              reportBusOff: 'Dropped',
            }[fault];
      if (name === undefined) expect(payloads.length).toBe(ticks);
      else {
        // A frame that waits for a next one when the capture ends was not seen yet.
        const waits = name === 'Reordered' ? own['Reordered']! - witnessed.Reordered : 0;
        expect([0, 1]).toContain(waits);
        expect([fault, witnessed[name as keyof typeof witnessed] + waits]).toEqual([fault, own[name]]);
        expect(own[name]).toBeGreaterThan(50);
      }
    }
  });

  it('writes logs that canplayer plays, reads those of candump, and listens and replays as can-utils do', () => {
    const folder = mkdtempSync(path.join(tmpdir(), 'kernel-can-'));
    try {
      const found = runInside('log.ts', [folder], 200) as {
        sent: string[];
        played: string[];
        candump: string[];
        listened: string[];
        replayed: number;
        words: string;
        decoded: string;
      };
      // Frames of the kernel say that they are FD by a flag of their own.
      const sent = found.sent.map((frame) =>
        frame.length === 144
          ? `${frame.slice(0, 10)}0${(Number.parseInt(frame.slice(11, 12), 16) | 4).toString(16)}${frame.slice(12)}`
          : frame,
      );
      expect(found.played).toEqual(sent);
      expect(found.candump).toEqual(sent);
      expect(found.listened).toEqual(sent);
      expect(found.replayed).toBe(sent.length);
      expect(found.words).toContain('200 frames sent');
      expect(found.decoded).toMatch(
        /^\(\d+\.\d{6}\) vehicleStatus: speed -0\.02 km\/h, accelerator 0, brake 0\.004, direction 1, key 1, counter 0\n$/,
      );
    } finally {
      rmSync(folder, { recursive: true });
    }
  });

  it('closes the loop with the controller in its own process, candump as the witness, and derives the run again', async () => {
    const folder = mkdtempSync(path.join(tmpdir(), 'kernel-can-'));
    try {
      const { summary, frames, errors } = runInside('loop.ts', [folder], 110) as {
        summary: {
          ending: string;
          links: { received: number; sent: number; lost: number; oneStepShare: number | null }[];
          reasons: { reason: string }[];
        };
        frames: string[];
        errors: string;
      };
      expect(errors).toBe('');
      expect(summary.ending).toBe('complete');
      // Only the clock of a guest may be held against the run.
      expect(summary.reasons.filter((one) => one.reason !== 'timing budget')).toEqual([]);
      const ofId = (...ids: string[]): string[] => frames.filter((frame) => ids.includes(frame.split('#')[0]!));
      // A second of pre-roll, three counted, 300 ms of after-run: cycles of 5, 10 and 5 ms.
      expect(['001', '002', '003'].map((id) => ofId(id).length)).toEqual([860, 430, 860]);
      expect(ofId('001')[0]).toMatch(/^001##5[0-9A-F]{32}$/);
      expect(summary.links[0]!.received).toBeGreaterThan(100);
      expect(summary.links[0]!.lost).toBe(0);
      // a frame does not say which tick it answers
      expect(summary.links[0]!.oneStepShare).toBeNull();

      // What the record holds is what candump saw, frame by frame.
      const recording = new Recording(path.join(folder, 'run.osrec'));
      const inputs = new RecordedInputs(recording);
      const bytes = new Uint8Array(80);
      const recorded: string[] = [];
      for (let tick = -1000; tick < 3000; tick += 1)
        for (let size = inputs.next(tick, 0, bytes); size >= 0; size = inputs.next(tick, 0, bytes)) {
          expect(size).toBe(16);
          recorded.push(
            `0${bytes[0]!.toString(16)}#${Buffer.from(bytes.subarray(8, 8 + bytes[4]!)).toString('hex')}`.toUpperCase(),
          );
        }
      recording.close();
      const witnessed = ofId('010', '011');
      const from = witnessed.indexOf(recorded[0]!);
      expect(from).toBeGreaterThanOrEqual(0);
      expect(recorded.length).toBeGreaterThan(100);
      expect(witnessed.slice(from, from + recorded.length)).toEqual(recorded);

      const { code, output } = await runCommand('rederive', path.join(folder, 'run.osrec'));
      expect([code, output]).toEqual([0, expect.stringContaining('identical')]);
    } finally {
      rmSync(folder, { recursive: true });
    }
  });
});
