import { type ChildProcess, spawn } from 'node:child_process';
import path from 'node:path';
import { packageRoot } from '../loop/controller-module.js';
import type { RunPlan } from './plan.js';

/** The controller as a child process: started ahead of the loop, ended with it, its words kept for messages. */
export class ControllerChild {
  private readonly child: ChildProcess;
  private text = '';
  /** Set when it ended before it was asked to. */
  ended: string | undefined;
  private stopping = false;

  constructor(plan: RunPlan, command: readonly string[]) {
    const lockstep = plan.wish.pace === 'fast';
    const [program, ...words] =
      command.length > 0
        ? command
        : [
            process.execPath,
            path.join(packageRoot(), 'dist', 'tools', 'controller.js'),
            path.resolve(plan.wish.bench),
            ...(lockstep ? ['--lockstep'] : []),
          ];
    this.child = spawn(program!, words, {
      cwd: command.length > 0 ? plan.folder : process.cwd(),
      // the channel tells our own controller when this process is gone, however it went
      stdio: ['ignore', 'pipe', 'pipe', ...(command.length > 0 ? [] : (['ipc'] as const))],
      env: { ...process.env, OILSPRING_LOCKSTEP: lockstep ? '1' : '0' },
    });
    const keep = (chunk: Buffer) => {
      this.text = (this.text + chunk.toString('utf8')).slice(-4000);
    };
    this.child.stdout?.on('data', keep);
    this.child.stderr?.on('data', keep);
    this.child.on('error', (error) => {
      this.ended = `cannot be started: ${error.message}`;
    });
    this.child.on('exit', (code, signal) => {
      if (!this.stopping)
        this.ended ??= `ended with ${signal ?? `exit code ${code}`}${this.words === '' ? '' : `: ${this.words}`}`;
    });
  }

  /** The last line that it printed. */
  get words(): string {
    return this.text.trim().split('\n').at(-1) ?? '';
  }

  async stop(): Promise<void> {
    this.stopping = true;
    if (this.child.exitCode !== null || this.child.signalCode !== null || this.child.pid === undefined) return;
    const gone = new Promise<void>((resolve) => this.child.once('exit', () => resolve()));
    this.child.kill('SIGTERM');
    const force = setTimeout(() => this.child.kill('SIGKILL'), 1000);
    await gone;
    clearTimeout(force);
  }
}
