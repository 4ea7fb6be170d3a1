import type { ChildProcess } from 'node:child_process';
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { RecordingError } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { signalDigest } from '../../runtime/recording/signal-digest.js';
import { RecordingWriter } from '../../runtime/recording/writer.js';
import type { RunSummary } from '../../runtime/run-summary.js';
import { finished } from '../support/child.js';
import { runCommand, scratch, startCommand, truck } from './command.js';

const folder = scratch();
afterAll(() => folder.remove());

const fast = (record: string, ...more: string[]) =>
  runCommand('run', truck, '--pace', 'fast', '--for', '4s', '--json', '--record', folder.file(record), ...more);
const summaryOf = (output: string): RunSummary => {
  const lines = output.split('\n').filter((line) => line !== '');
  expect(lines).toHaveLength(1);
  return JSON.parse(lines[0]!) as RunSummary;
};
const digest = (name: string) => {
  const recording = new Recording(folder.file(name));
  try {
    return signalDigest(recording);
  } finally {
    recording.close();
  }
};

describe('run --pace fast', () => {
  let summary: RunSummary;
  beforeAll(async () => {
    const run = await fast('one.osrec');
    expect(run.errors).toBe('');
    expect(run.code).toBe(0);
    summary = summaryOf(run.output);
  });

  it('prints one object that says all that was promised', () => {
    expect(summary).toMatchObject({
      verdict: 'pass',
      valid: true,
      simulated: 4,
      seed: 1,
      recording: folder.file('one.osrec'),
    });
    for (const key of ['period', 'lateness', 'step'] as const)
      expect(Object.keys(summary.timing[key]).sort()).toEqual(['max', 'p50', 'p99', 'p999']);
    expect(summary.timing).toMatchObject({ overruns: 0, drift: 0 });
    expect(summary.realTimeFactor).toBeGreaterThan(0);
    expect(summary.peaks['highLine.pressure']).toBeGreaterThan(2e7);
    expect(summary.ledger.energyResidual).toBeLessThan(1e-4);
    expect(summary.ledger.oilResidual).toBeLessThan(1e-12);
    expect(summary.stateHash).toMatch(/^[0-9a-f]{16}$/);
    expect(summary.links[0]).toMatchObject({ lost: 0, late: 0, malformed: 0, timeOuts: 0, oneStepShare: 1 });
  });

  it('gives the same bytes of signal data again, and other bytes with another seed', async () => {
    expect((await fast('two.osrec')).code).toBe(0);
    expect((await fast('seed.osrec', '--seed', '2')).code).toBe(0);
    expect(digest('two.osrec')).toBe(digest('one.osrec'));
    expect(digest('seed.osrec')).not.toBe(digest('one.osrec'));
  });

  it('gives the same bytes with the controller as a process of its own in lockstep', async () => {
    const run = await fast('process.osrec', '--controller', 'process');
    expect(run.errors).toBe('');
    expect(summaryOf(run.output).stateHash).toBe(summary.stateHash);
    expect(digest('process.osrec')).toBe(digest('one.osrec'));
  });

  it('is derived again to the bit', async () => {
    const again = await runCommand('rederive', folder.file('one.osrec'));
    expect(again.output).toContain(`state hash ${summary.stateHash}`);
    expect(again.output).toMatch(/^identical: 5300 ticks/);
    expect(again.code).toBe(0);
  });

  it('is found to differ when one bit of one recorded input is changed, with tick and states', async () => {
    const from = new Recording(folder.file('one.osrec'));
    const writer = new RecordingWriter(folder.file('bit.osrec'), from.header);
    const bytes = (view: ArrayBufferView) => Buffer.from(view.buffer as ArrayBuffer, view.byteOffset, view.byteLength);
    let changed = -1;
    for (const block of from.blocks()) {
      if (block.kind === 'rows')
        writer.add('rows', { ticks: bytes(block.ticks), hashes: bytes(block.hashes), data: bytes(block.data) });
      else if (block.kind === 'snapshot') writer.add('snapshot', { tick: block.tick, block: bytes(block.block) });
      else if (block.kind === 'inputs') {
        const data = Uint8Array.from(block.bytes);
        for (let i = 0; i < block.count && changed < 0; i += 1) {
          const length = block.offsets[i + 1]! - block.offsets[i]!;
          if (block.ticks[i]! < 2000 || length < 40) continue;
          changed = block.ticks[i]!;
          data[block.offsets[i]! + 30]! ^= 1;
        }
        writer.add('inputs', {
          ticks: bytes(block.ticks),
          links: bytes(block.links),
          lengths: bytes(Uint32Array.from(block.ticks, (_, i) => block.offsets[i + 1]! - block.offsets[i]!)),
          bytes: data,
        });
      }
    }
    await writer.close();
    from.close();
    expect(changed).toBeGreaterThanOrEqual(2000);
    const again = await runCommand('rederive', folder.file('bit.osrec'), '--json');
    const found = JSON.parse(again.output) as { identical: boolean; firstTick: number; states: { path: string }[] };
    expect(again.code).toBe(4);
    expect(found.identical).toBe(false);
    expect(found.firstTick).toBe(changed);
    expect(found.states.length).toBeGreaterThan(0);
    expect(found.states.some((state) => state.path.includes('wrongChecksum'))).toBe(true);
  });

  it('is exported with units in the heading', async () => {
    const run = await runCommand(
      'export',
      folder.file('one.osrec'),
      '--signals',
      'highLine.pressure,body.velocity',
      '--every',
      '100ms',
      '--to',
      folder.file('one.csv'),
    );
    expect(run.code).toBe(0);
    const lines = readFileSync(folder.file('one.csv'), 'utf8').trim().split('\n');
    expect(lines[0]).toBe('time (s),highLine.pressure (Pa),body.velocity (m/s)');
    // 5 s and 0.3 s of after-run, and the heading
    expect(lines).toHaveLength(54);
    const wrong = await runCommand(
      'export',
      folder.file('one.osrec'),
      '--signals',
      'highLine.presure',
      '--to',
      folder.file('no.csv'),
    );
    expect(wrong.code).toBe(2);
    expect(wrong.errors).toContain('did you mean highLine.pressure');
    expect(existsSync(folder.file('no.csv'))).toBe(false);
  });
});

/** Waits until a recording that is being written holds a counted tick beyond `tick`. */
async function recordedBeyond(file: string, tick: number, child: ChildProcess): Promise<void> {
  for (let i = 0; i < 900 && child.exitCode === null; i += 1) {
    await new Promise((resolve) => setTimeout(resolve, 100));
    try {
      const recording = new Recording(file);
      const { lastTick } = recording.examine();
      recording.close();
      if (lastTick > tick) return;
    } catch (error) {
      // not there yet, or its header is being written
      if (!(error instanceof RecordingError)) throw error;
    }
  }
}

describe('a live run', () => {
  it('is ended by an interrupt at any moment, with the recording whole and derivable', async () => {
    const child = startCommand(['run', truck, '--for', '60s', '--json', '--record', folder.file('live.osrec')]);
    const end = finished(child);
    await recordedBeyond(folder.file('live.osrec'), 1500, child);
    child.kill('SIGINT');
    const { code, output, errors } = await end;
    expect(errors).toBe('');
    const summary = summaryOf(output);
    expect(code).toBe(3);
    expect(summary).toMatchObject({ ending: 'stopped', valid: false, verdict: 'not valid', pace: 'live' });
    expect(summary.reasons.some((reason) => reason.reason === 'ended early')).toBe(true);
    expect(summary.simulated).toBeGreaterThan(1);
    expect(summary.links[0]!.received).toBeGreaterThan(100);
    const again = await runCommand('rederive', folder.file('live.osrec'));
    expect(again.output).toContain(summary.stateHash);
    expect(again.code).toBe(0);
  });

  it('leaves a recording that reads up to its last whole block after kill -9', async () => {
    const child = startCommand(['run', truck, '--for', '60s', '--json', '--record', folder.file('killed.osrec')]);
    const end = finished(child);
    await recordedBeyond(folder.file('killed.osrec'), 1500, child);
    child.kill('SIGKILL');
    await end;
    const again = await runCommand('rederive', folder.file('killed.osrec'), '--json');
    const found = JSON.parse(again.output) as { identical: boolean; compared: number; ending: string };
    expect(found.identical).toBe(true);
    expect(found.compared).toBeGreaterThan(1000);
    expect(found.ending).not.toBe('complete');
  });
});

describe('a controller that does not answer in lockstep', () => {
  it('ends the run with exit code 5 and a message, never as data', async () => {
    const stub = folder.file('stub.mjs');
    writeFileSync(stub, 'setTimeout(() => {}, 20000);\n');
    const run = await runCommand(
      'run',
      truck,
      '--pace',
      'fast',
      '--for',
      '1s',
      '--controller',
      `${process.execPath} ${stub}`,
      '--no-record',
      '--json',
    );
    expect(run.code).toBe(5);
    expect(run.errors).toContain('no controller said hello');
  });
});

describe('bad input', () => {
  it('is answered with file, line, column, value and remedy, and exit code 2', async () => {
    const file = folder.file('wrong.yaml');
    writeFileSync(
      file,
      readFileSync(truck, 'utf8')
        .replace('include: messages.yaml\n', '')
        .replace('volume: 50 L\n', 'volume: 50 bar\n')
        .replace('cracking: 330 bar(g)', 'cracking: 360 bar'),
    );
    const run = await runCommand('check', file);
    expect(run.code).toBe(2);
    expect(run.errors).toMatch(/wrong\.yaml:\d+:\d+ .*50 bar/);
    expect(run.errors).toMatch(/wrong\.yaml:\d+:\d+ .*360 bar/);
    expect(run.errors.trim().split('\n').length).toBeGreaterThan(2);
    expect(run.output).toBe('');
  });
  const wrong: [string[], RegExp][] = [
    [['run', 'nowhere.yaml'], /nowhere\.yaml/],
    [['run', truck, '--pace', 'slow'], /live or fast/],
    [['run', truck, '--for', '3 litres'], /--for/],
    [['run', truck, '--seed', '-1'], /whole number/],
    [['rederive', truck], /not a recording/],
    [['list', 'elements', 'pump'], /no element `pump`/],
    [['wire', truck], /--c FILE/],
    [['nonsense'], /unknown command/],
  ];
  for (const [words, expected] of wrong) {
    it(`oilspring ${words.join(' ')}`, async () => {
      const run = await runCommand(...words);
      expect(run.code).toBe(2);
      expect(run.errors).toMatch(expected);
      expect(run.errors).not.toMatch(/\n\s+at /);
    });
  }
});

describe('help', () => {
  for (const command of ['check', 'run', 'rederive', 'export', 'list', 'wire']) {
    it(`${command} --help has an example`, async () => {
      const run = await runCommand(command, '--help');
      expect(run.code).toBe(0);
      expect(run.output).toMatch(/Example/);
    });
  }
  it('lists elements and signals, readable and as JSON', async () => {
    const elements = JSON.parse((await runCommand('list', 'elements', '--json')).output) as {
      kind: string;
      source: string;
    }[];
    expect(elements.length).toBeGreaterThan(25);
    for (const element of elements) expect(element.source.length).toBeGreaterThan(3);
    const signals = JSON.parse((await runCommand('list', 'signals', truck, '--json')).output) as {
      path: string;
      unit: string;
    }[];
    expect(signals.find((signal) => signal.path === 'highLine.pressure')?.unit).toBe('Pa');
    expect((await runCommand('list', 'elements', 'pump-motor')).output).toContain('Wilson');
  });
});
