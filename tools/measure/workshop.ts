import { type ChildProcess, spawn, spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { cHeader } from '../../bridge/c-header.js';
import type { MessageMap } from '../../bridge/message-map.js';
import { Datagram, UdpCodec } from '../../bridge/udp-codec.js';
import { mapChecksum } from '../../bridge/udp-layout.js';
import { assemble } from '../../configs/assemble.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import type { RunSummary } from '../../runtime/run-summary.js';
import { packageRoot } from '../loop/controller-module.js';
import { plantInC } from './twin/plant-in-c.js';

/** Ports of measurements: away from those of the ready benches. */
export const PORTS = { bench: 47710, partner: 47711, page: 47712 } as const;

/** A folder that goes with the process, and the C compiler. */
export class Workshop {
  readonly folder = fs.mkdtempSync(path.join(os.tmpdir(), 'oilspring-measure-'));
  private readonly children = new Set<ChildProcess>();

  close(): void {
    for (const child of this.children) child.kill('SIGTERM');
    fs.rmSync(this.folder, { recursive: true, force: true });
  }

  /** As Ctrl-C: what runs ends in good order. */
  interrupt(): void {
    for (const child of this.children) child.kill('SIGINT');
  }

  file(name: string): string {
    return path.join(this.folder, name);
  }

  /** Compiles a C program of tools/measure/twin; '' or why it cannot be. */
  compile(source: string, program: string): string {
    const from = path.join(packageRoot(), 'tools', 'measure', 'twin', source);
    const found = spawnSync(
      'cc',
      ['-O2', '-std=gnu11', '-ffp-contract=off', `-I${this.folder}`, '-o', this.file(program), from, '-lm'],
      { encoding: 'utf8' },
    );
    if (found.error) return 'no C compiler (Debian package gcc)';
    return found.status === 0
      ? ''
      : `the C compiler refuses ${source}: ${found.stderr.split('\n').find((line) => line.includes('error')) ?? found.stderr.slice(0, 300)}`;
  }

  /** Writes messages.h and plant.h of a bench and compiles the twin. */
  buildTwin(spec: BenchSpec): string {
    const { circuit, layout, table } = assemble(spec, { seed: 1 });
    const own = circuit.states.length + circuit.memory.length + circuit.commands.length;
    try {
      fs.writeFileSync(this.file('messages.h'), cHeader(spec.map, spec.name));
      fs.writeFileSync(
        this.file('plant.h'),
        plantInC(circuit, spec.map, {
          step: spec.step,
          substeps: spec.substeps,
          row: Math.min(200, table.length),
          blockMore: Math.max(0, layout.length - own),
        }),
      );
    } catch (error) {
      return (error as Error).message;
    }
    return this.compile('twin.c', 'twin');
  }

  start(program: string, words: readonly string[]): ChildProcess {
    const child = spawn(program, words, { stdio: ['ignore', 'pipe', 'pipe'] });
    this.children.add(child);
    child.once('exit', () => this.children.delete(child));
    return child;
  }

  /** Runs a program to its end; what it printed. Rejects with its last words when it failed. */
  async run(program: string, words: readonly string[], fine: readonly number[] = [0]): Promise<string> {
    const child = this.start(program, words);
    const text = collect(child);
    const code = await ended(child);
    if (!fine.includes(code))
      throw new Error(
        `${path.basename(program)} ended with ${code}: ${text.errors().trim().split('\n').slice(-3).join(' | ')}`,
      );
    return text.output();
  }

  /** A run of the command line that ends with one JSON object. Exit codes 1 and 3 (a verdict) are results as well. */
  async oilspring(words: readonly string[]): Promise<RunSummary> {
    const program = path.join(packageRoot(), 'dist', 'tools', 'oilspring.js');
    return JSON.parse(await this.run(process.execPath, [program, ...words], [0, 1, 3])) as RunSummary;
  }

  /** Starts the partner process; ask it for its JSON by `stopPartner`. `answers`: from which message's arrival. */
  startPartner(map: MessageMap, core: number): { readonly child: ChildProcess; readonly done: Promise<PartnerReport> } {
    fs.writeFileSync(this.file('templates'), templates(map));
    const child = this.start(this.file('partner'), [
      String(PORTS.partner),
      String(PORTS.bench),
      this.file('templates'),
      ...(core < 0 ? [] : [String(core)]),
    ]);
    const text = collect(child);
    const done = ended(child).then((code) => {
      if (code !== 0) throw new Error(`partner ended with ${code}: ${text.errors()}`);
      return JSON.parse(text.output()) as PartnerReport;
    });
    done.catch(() => undefined);
    return { child, done };
  }
}

interface Spread {
  readonly count: number;
  /** ns */
  readonly p1: number;
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
}
export interface PartnerReport {
  readonly interval: Spread;
  readonly turn: Spread;
}

function collect(child: ChildProcess): { output(): string; errors(): string } {
  let output = '';
  let errors = '';
  child.stdout?.setEncoding('utf8').on('data', (part: string) => {
    output += part;
  });
  child.stderr?.setEncoding('utf8').on('data', (part: string) => {
    errors += part;
  });
  return { output: () => output, errors: () => errors };
}

function ended(child: ChildProcess): Promise<number> {
  return new Promise((resolve, reject) => {
    child.once('error', reject);
    child.once('close', (code) => resolve(code ?? 1));
  });
}

/** Each received message as an answer to the sent message with the shortest cycle (the last of those). */
function templates(map: MessageMap): Uint8Array {
  const sent = map.messages.filter((message) => message.direction === 'sent' && message.every > 0);
  const trigger = sent.reduce((best, message) => (message.every <= best.every ? message : best), sent[0]!);
  const parts: Uint8Array[] = [];
  const answers = map.messages.filter((message) => message.direction === 'received');
  answers.forEach((message, i) => {
    const codec = new UdpCodec(message, mapChecksum(map));
    const datagram = new Datagram(codec.length);
    codec.quantise(
      Float64Array.from(message.signals, (signal) => signal.substitute),
      0,
      new Float64Array(codec.count),
      0,
    );
    codec.write(datagram, 0, 0);
    // with as many messages each way, each answers its own
    const asks = sent.length === answers.length ? sent[i]! : trigger;
    parts.push(
      new Uint8Array(Uint16Array.of(asks.identifier, codec.length).buffer),
      datagram.bytes.slice(0, codec.length),
    );
  });
  const whole = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    whole.set(part, at);
    at += part.length;
  }
  return whole;
}

/** A copy of a ready bench's folder with the ports of measurements. Returns the bench file. */
export function copyBench(workshop: Workshop, name: string): string {
  const from = path.join(packageRoot(), 'configs', name);
  const to = workshop.file(name);
  fs.cpSync(from, to, { recursive: true });
  const compiled = path.join(packageRoot(), 'dist', 'configs', name, 'controller.js');
  if (fs.existsSync(compiled)) fs.copyFileSync(compiled, path.join(to, 'controller.js'));
  for (const file of fs.readdirSync(to)) {
    if (!file.endsWith('.yaml')) continue;
    const text = fs.readFileSync(path.join(to, file), 'utf8');
    fs.writeFileSync(
      path.join(to, file),
      text
        .replace(/local: [\d.]+:\d+/g, `local: 127.0.0.1:${PORTS.bench}`)
        .replace(/remote: [\d.]+:\d+/g, `remote: 127.0.0.1:${PORTS.partner}`),
    );
  }
  return path.join(to, 'bench.yaml');
}

export function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted.length === 0
    ? Number.NaN
    : sorted.length % 2 === 1
      ? sorted[sorted.length >> 1]!
      : 0.5 * (sorted[sorted.length / 2 - 1]! + sorted[sorted.length / 2]!);
}

/** Programs that do nothing but use the processors, at ordinary priority. */
export function startLoad(workshop: Workshop, count: number): () => void {
  const children = Array.from({ length: count }, () =>
    workshop.start(process.execPath, [
      '-e',
      'const a=new Float64Array(1<<20);for(let i=0;;i=(i+16)&((1<<20)-1))a[i]+=Math.sqrt(i)',
    ]),
  );
  return () => {
    for (const child of children) child.kill('SIGKILL');
  };
}
