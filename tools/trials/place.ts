import { type ChildProcess, spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { Recording } from '../../runtime/recording/reader.js';
import type { RunSummary } from '../../runtime/run-summary.js';
import { type Choose, chooser } from '../determinism/draw.js';
import { packageRoot } from '../loop/controller-module.js';
import { rederive } from '../run/rederive.js';
import { lookInto, type Remains } from '../salvage/look.js';
import { demand } from './trial.js';

/** A program that was started, and how it ended. */
export interface Started {
  readonly process: ChildProcess;
  /** Text so far. */
  output(): string;
  errors(): string;
  readonly ended: Promise<{ code: number | null; signal: NodeJS.Signals | null }>;
}

export interface Ended {
  readonly code: number | null;
  readonly signal: NodeJS.Signals | null;
  readonly output: string;
  readonly errors: string;
}

/** What a whole run says of itself, and its recording. */
export interface Evidence {
  readonly remains: Remains;
  readonly summary: RunSummary | undefined;
}

/** A folder for one round, chance from its seed, and the programs that it started. */
export class Place {
  readonly folder = fs.mkdtempSync(path.join(os.tmpdir(), 'trial-'));
  readonly choose: Choose;
  private readonly started: Started[] = [];

  constructor(seed: number) {
    this.choose = chooser(seed);
  }

  file(name: string): string {
    return path.join(this.folder, name);
  }

  write(name: string, text: string): string {
    fs.writeFileSync(this.file(name), text);
    return this.file(name);
  }

  bench(name: string): string {
    return path.join(packageRoot(), 'configs', name, 'bench.yaml');
  }

  start(words: readonly string[], environment: NodeJS.ProcessEnv = {}): Started {
    const env: NodeJS.ProcessEnv = { ...process.env, NO_COLOR: '1', ...environment };
    delete env['NODE_OPTIONS'];
    const child = spawn(words[0]!, words.slice(1), { stdio: ['ignore', 'pipe', 'pipe'], env });
    let output = '';
    let errors = '';
    child.stdout.setEncoding('utf8').on('data', (text: string) => (output += text));
    child.stderr.setEncoding('utf8').on('data', (text: string) => (errors += text));
    const ended = new Promise<{ code: number | null; signal: NodeJS.Signals | null }>((resolve, reject) => {
      child.once('error', reject);
      child.once('close', (code, signal) => resolve({ code, signal }));
    });
    const started = { process: child, output: () => output, errors: () => errors, ended };
    this.started.push(started);
    return started;
  }

  /** Starts `oilspring run BENCH`, recording into `run.osrec`; `around` stands ahead of node. */
  run(
    bench: string,
    more: readonly string[],
    around: readonly string[] = [],
    environment: NodeJS.ProcessEnv = {},
    node: readonly string[] = [],
  ): Started {
    const program = path.join(packageRoot(), 'dist', 'tools', 'oilspring.js');
    const words = [process.execPath, ...node, program, 'run', bench, '--json', '--record', this.recording, ...more];
    return this.start([...around, ...words], environment);
  }

  get recording(): string {
    return this.file('run.osrec');
  }

  /** Waits until the recording holds a row of tick `tick` or a later one, or the run has ended. */
  async beyond(started: Started, tick: number): Promise<void> {
    while (started.process.exitCode === null && started.process.signalCode === null) {
      if (this.lastTick() >= tick) return;
      await sleep(50);
    }
  }

  private lastTick(): number {
    if (!fs.existsSync(this.recording) || fs.statSync(this.recording).size < 64) return Number.NEGATIVE_INFINITY;
    try {
      const recording = new Recording(this.recording);
      try {
        return recording.examine().lastTick;
      } finally {
        recording.close();
      }
    } catch {
      // its header is being written
      return Number.NEGATIVE_INFINITY;
    }
  }

  async end(started: Started): Promise<Ended> {
    const { code, signal } = await started.ended;
    return { code, signal, output: started.output(), errors: started.errors() };
  }

  /**
   * What every recording must bear out, however its run ended: nothing in it is damaged, it is derived again to the bit,
   * ticks without a row are as many as the run owns up to, and no tick was later than the run says.
   */
  async evidence(ended?: Ended): Promise<Evidence> {
    const remains = (await lookInto(this.recording, () => true))!;
    demand(remains.ending.how !== 'damaged', () => `the recording is damaged: ${remains.ending.what}`);
    let summary: RunSummary | undefined;
    if (ended !== undefined) {
      demand(!/\n\s+at /.test(ended.errors), () => `a stack trace: ${ended.errors}`);
      const lines = ended.output.split('\n').filter((line) => line !== '');
      demand(lines.length === 1, () => `${lines.length} lines on standard output: ${ended.errors}`);
      summary = JSON.parse(lines[0]!) as RunSummary;
      demand(ended.code === summary.exitCode, () => `exit code ${ended.code}, the summary says ${summary!.exitCode}`);
      demand(
        summary.rowsLost === remains.gaps,
        () => `${remains.gaps} ticks without a row, ${summary!.rowsLost} owned up to`,
      );
      this.punctual(summary);
    }
    if (remains.rows > 0) {
      const { identical, compared, firstTick } = await rederive(this.recording, () => true);
      demand(identical && compared === remains.rows, () => `derived again it differs from tick ${firstTick} on`);
    }
    return { remains, summary };
  }

  /** The rows carry each tick's lateness: the summary may not say less than their largest, nor fewer overruns. */
  private punctual(summary: RunSummary): void {
    if (!summary.timing.measured) return;
    const recording = new Recording(this.recording);
    const at = recording.header.signals.findIndex((signal) => signal.path === 'timing.lateness');
    let most = 0;
    let overruns = 0;
    for (const block of at < 0 ? [] : recording.blocks()) {
      if (block.kind !== 'rows') continue;
      for (let row = 0; row < block.count; row += 1) {
        if (block.ticks[row]! <= 0) continue;
        const late = block.data[at * block.count + row]! * 1e6;
        most = Math.max(most, late);
        if (late >= recording.header.step * 1e6) overruns += 1;
      }
    }
    recording.close();
    const { lateness, overruns: said } = summary.timing;
    demand(
      lateness.max >= most * (1 - 1e-6),
      () => `a tick was ${most} µs late, the run says ${lateness.max} µs at most`,
    );
    demand(said >= overruns, () => `${overruns} ticks were a period late, the run says ${said} overruns`);
  }

  /** What the programs said, for somebody who looks for the reason. */
  words(): string {
    return this.started
      .map(
        (one) =>
          `  ${one.process.spawnargs.join(' ').slice(0, 300)}\n    ${one.errors().slice(0, 2000)}\n    ${one.output().slice(0, 500)}\n`,
      )
      .join('');
  }

  /** Ends what is left and removes the folder. */
  async leave(): Promise<void> {
    for (const one of this.started) {
      if (one.process.exitCode === null && one.process.signalCode === null) one.process.kill('SIGKILL');
      await one.ended.catch(() => undefined);
    }
    fs.rmSync(this.folder, { recursive: true, force: true });
  }
}

export function sleep(milliseconds: number): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, milliseconds));
}

/** Whether a program is there and runs with these words. */
export function works(words: readonly string[]): Promise<boolean> {
  return new Promise((resolve) => {
    const child = spawn(words[0]!, words.slice(1), { stdio: 'ignore' });
    child.once('error', () => resolve(false));
    child.once('close', (code) => resolve(code === 0));
  });
}
