import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { type Assembly, assemble } from '../../configs/assemble.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import type { Circuit } from '../../runtime/circuit/build.js';
import { HAND, type HandMessage, writeHand } from '../../runtime/hand-wire.js';
import { FORMAT, type RecordingHeader } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { Recorder } from '../../runtime/recording/recorder.js';
import { signalDigest } from '../../runtime/recording/signal-digest.js';
import { RecordingWriter } from '../../runtime/recording/writer.js';
import { createRing } from '../../runtime/ring.js';
import { RingJournal } from '../../runtime/ring-journal.js';
import { recordedForm, type ScriptSpec } from '../../runtime/script.js';
import { attachModule } from '../loop/attach-links.js';
import { loadController } from '../loop/controller-module.js';
import { createLoopControl, LoopBody } from '../loop/engine.js';
import { softwareVersion } from '../run/host-run.js';
import { readBenchFile } from '../run/plan.js';
import { chooser, type DrawnHands, drawHands, drawScript } from './draw.js';

/** What a run came to. */
export interface RunDigest {
  readonly number: number;
  readonly bench: string;
  /** SHA-256 of the recorded signals and of every tick's state hash. */
  readonly digest: string;
  readonly ticks: number;
  readonly steps: number;
  readonly hands: number;
}

/**
 * A source of chance for the tests of the tests: `input` comes in as a hand does, so that two runs differ and each is
 * derived again; `tick` sits in the plant, so that a run derived again differs too.
 */
export type Planted = 'input' | 'tick' | undefined;

export interface RunWishes {
  readonly benches: readonly string[];
  readonly folder: string;
  /** Most counted ticks. */
  readonly most: number;
  readonly planted?: Planted;
}

/** Draws scenario `number`, runs it and records it. Benches that were built are kept for the next number. */
export class Runner {
  private readonly built = new Map<string, { spec: BenchSpec; place: string; circuit: Circuit }>();

  constructor(private readonly wishes: RunWishes) {}

  static fileOf(folder: string, number: number): string {
    return path.join(folder, `${number}.osrec`);
  }

  async run(number: number): Promise<RunDigest> {
    const { benches, folder, most, planted } = this.wishes;
    const bench = benches[number % benches.length]!;
    let made = this.built.get(bench);
    if (made === undefined) {
      const { spec, folder: place } = readBenchFile(bench);
      made = { spec, place, circuit: assemble(spec, { seed: 1 }).circuit };
      this.built.set(bench, made);
    }
    const { spec, place, circuit } = made;
    const choose = chooser(number);
    const ticks = Math.min(most, 150 + choose(650));
    const script = recordedForm(drawScript(spec, choose, ticks));
    const seed = 1 + choose(1e6);
    const assembly = assemble(spec, { seed, script, circuit });
    const hands = drawHands(assembly, choose, ticks);
    if (planted === 'input') plantInput(assembly, hands);
    if (planted === 'tick') plantTick(assembly);
    const barrier =
      spec.controller?.module === undefined
        ? undefined
        : attachModule(
            spec,
            assembly.exchange,
            await loadController(place, spec.controller.module),
            spec.controller.period ?? 1,
          );
    const file = Runner.fileOf(folder, number);
    const header = headerOf(assembly, seed, script);
    const done = await record(assembly, script.ticks, hands, barrier, file, header);
    const recording = new Recording(file);
    const digest = createHash('sha256').update(signalDigest(recording)).update(done.hash).digest('hex');
    recording.close();
    let count = 0;
    for (const list of hands.values()) count += list.length;
    return { number, bench, digest, ticks: done.ticks, steps: script.steps.length, hands: count };
  }
}

async function record(
  assembly: Assembly,
  ticks: number,
  hands: DrawnHands,
  barrier: { end(tick: number): void } | undefined,
  file: string,
  header: RecordingHeader,
): Promise<{ ticks: number; hash: string }> {
  const { spec, tick: stage } = assembly;
  const selection = recorded(assembly);
  const ring = createRing({ capacity: 8 << 20, whenFull: 'wait', patience: 0 });
  const journal = new RingJournal(ring, selection);
  fs.rmSync(file, { force: true });
  const recorder = new Recorder(ring, new RecordingWriter(file, header), {
    signals: selection.length,
  });
  assembly.exchange.setJournal(journal);
  stage.journal = journal;
  assembly.watch.journal = journal;
  let tick = assembly.firstTick;
  let taken = 0;
  const none: readonly HandMessage[] = [];
  assembly.hands.source = {
    poll: (into) => {
      const hand = (hands.get(tick) ?? none)[taken];
      if (hand === undefined) return -1;
      taken += 1;
      return writeHand(hand, into);
    },
  };
  const control = createLoopControl();
  const body = new LoopBody({
    assembly,
    ticks,
    shared: control,
    barriers: barrier === undefined ? [] : [barrier],
    peaks: new Int32Array(0),
  });
  const all = createHash('sha256');
  // a timeline that is held would never end
  const last = 3 * ticks;
  while (!body.over(tick) && tick < last) {
    taken = 0;
    const goesOn = body.run(tick);
    all.update(stage.hash);
    tick += 1;
    if ((tick & 63) === 0) recorder.drain();
    if ((tick & 511) === 0) await new Promise((resolve) => setImmediate(resolve));
    if (!goesOn) break;
  }
  journal.close();
  await recorder.finish({ drawn: true });
  if (recorder.overflows > 0 || recorder.dropped > 0) throw new Error(`${spec.name}: the ring was full`);
  return { ticks: tick - assembly.firstTick, hash: all.digest('hex') };
}

/** Every 7th signal: the hash covers the state, the columns what is computed from it. */
function recorded(assembly: Assembly): Int32Array {
  return Int32Array.from({ length: Math.ceil(assembly.table.length / 7) }, (_, i) => 7 * i);
}

function headerOf(assembly: Assembly, seed: number, script: ScriptSpec): RecordingHeader {
  const { spec } = assembly;
  return {
    format: FORMAT,
    run: `drawn ${script.name}`,
    created: new Date().toISOString(),
    software: { version: softwareVersion(), node: process.version, v8: process.versions.v8 },
    machine: {},
    bench: { name: spec.name, files: spec.sources.map((one) => ({ path: one.name, text: one.text })) },
    scenario: null,
    seed,
    step: spec.step,
    pace: 'fast',
    options: { ticks: script.ticks, controller: 'module', script: JSON.stringify(script) },
    signals: [...recorded(assembly)].map((index) => {
      const { path: name, unit, about, group } = assembly.table.all[index]!;
      return { path: name, unit, about, group };
    }),
    events: { kinds: assembly.events.kinds.map((kind) => ({ ...kind })), subjects: [...assembly.events.subjects] },
    links: [...spec.map.links.map((link) => link.name), 'hands'],
    block: Array.from({ length: assembly.layout.length }, (_, i) => assembly.layout.path(i)),
  };
}

function plantInput(assembly: Assembly, hands: DrawnHands): void {
  const hand: HandMessage = {
    kind: HAND.set,
    request: 1,
    target: 0,
    deadMan: 0,
    value: Math.random(),
    text: { who: 'chance', address: '', said: '' },
  };
  (hands as Map<number, readonly HandMessage[]>).set(0, [hand]);
  if (assembly.firstTick > 0) throw new Error('a bench begins behind tick 0');
}

/** The clock's last digits into a state, as a plant that reads the time would. */
function plantTick(assembly: Assembly): void {
  const run = assembly.tick.run.bind(assembly.tick);
  const wanted = assembly.circuit.states[0]!.path;
  let at = 0;
  while (assembly.layout.path(at) !== wanted) at += 1;
  assembly.tick.run = (tick) => {
    if (tick === 20)
      assembly.block[at] = assembly.block[at]! * (1 + 1e-9 * (performance.now() % 1)) + 1e-9 * Math.random();
    run(tick);
  };
}
