import { parentPort, workerData } from 'node:worker_threads';
import { type Assembly, assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue as library } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { globTest } from '../../configs/signal-list.js';
import { BuildError } from '../../runtime/contract.js';
import { noHands } from '../../runtime/hand.js';
import { HandRing } from '../../runtime/hand-ring.js';
import { eachSignal } from '../../runtime/judge/formula.js';
import { CollectionMeter, collectNow } from '../../runtime/realtime/collection-meter.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { holdIdleStates } from '../../runtime/realtime/idle-states.js';
import { lockMemory } from '../../runtime/realtime/memory-lock.js';
import { Pacer } from '../../runtime/realtime/pacer.js';
import { enterScheduling } from '../../runtime/realtime/scheduling.js';
import { TimingRecord } from '../../runtime/realtime/timing-record.js';
import { RingJournal } from '../../runtime/ring-journal.js';
import { noMeter } from '../../runtime/tick.js';
import { driveSignals, driveStride } from '../report/drive-trace.js';
import { attachLinks } from './attach-links.js';
import { loadController } from './controller-module.js';
import { CONTROL, createLoopControl, runLoop, type Samples } from './engine.js';
import { inlineMore } from './engine-flags.js';
import type { LoopMessage, RunDone, RunOrder } from './run-order.js';
import { StageClock } from './stage-meter.js';
import { statusBoard } from './status.js';
import { hotCode, type WarmUpResult, warmUp } from './warm-up.js';

/**
 * The loop thread: builds the bench, warms up, runs all ticks with its own sockets, and ends. It shares rings and a few
 * words with the host and nothing else; no file, no terminal and no browser is touched here while ticks run.
 */
// before the hot code compiles; process-wide, so the host keeps its defaults only until here
inlineMore();

/** What was taken of the machine, to be given back on every way out. */
const taken: { restore(): void }[] = [];

const port = parentPort!;
const say = (message: LoopMessage) => port.postMessage(message);

void main(workerData as RunOrder)
  .catch((error: unknown) => {
    const code = error instanceof BuildError ? 2 : 5;
    say({ kind: 'failed', what: error instanceof Error ? error.message : String(error), code });
  })
  .finally(() => {
    for (const one of taken.reverse()) one.restore();
  });

async function main(order: RunOrder): Promise<void> {
  if (order.pace === 'live' && whyNotLive() !== '')
    throw new BuildError([{ path: 'run --pace live', what: whyNotLive(), remedy: 'use --pace fast here' }]);
  const began = performance.now();
  const texts = Object.fromEntries(order.sources.map((source) => [source.path, source.text]));
  const spec = readBench(order.sources[0]!.path, library, memoryFiles(texts));
  const assembly = assemble(spec, { seed: order.seed, script: order.script });
  const built = performance.now();
  const selection = choose(assembly, order.patterns);
  const live = order.pace === 'live';
  const shared = createLoopControl(order.control);
  const journal = new RingJournal(order.ring, selection);
  const board = statusBoard(assembly);
  const peaks = Int32Array.from(order.peaks, (path) => requireSignal(assembly, path));
  const pacer = live
    ? new Pacer({ period: Math.round(spec.step * 1e9), record: new TimingRecord(order.timing) })
    : undefined;
  const lateness = assembly.table.find('timing.lateness');
  const timingSignals = live && lateness >= 0 ? { lateness, step: assembly.table.find('timing.step') } : undefined;
  const meter = order.profile ? new StageClock() : undefined;
  if (meter) assembly.tick.meter = meter;
  const code = hotCode(assembly, [journal, board.writer, ...(pacer ? [pacer, pacer.record.step] : [])]);

  const driven = driveSamples(assembly, order.ticks);
  let warmed: WarmUpResult = { ticks: 0, tick: 0, settled: true };
  if (live) {
    Atomics.store(shared.control, CONTROL.phase, 1);
    warmed = warmUp({
      assembly,
      selection,
      partner: order.controller.kind,
      factory:
        spec.controller?.module === undefined || spec.map.links.length === 0
          ? undefined
          : await loadController(order.folder, spec.controller.module),
      hands: order.hands !== undefined,
      board: statusBoard(assembly).writer,
      peaks,
      timingSignals,
      meter: meter ?? noMeter,
      samples: driven,
      code,
      stopped: () => Atomics.load(shared.control, CONTROL.stop) !== 0,
    });
  }
  const warm = performance.now();
  const links = await attachLinks(order, spec, assembly.exchange);
  taken.push({ restore: () => links.close() });
  assembly.exchange.setJournal(journal);
  assembly.tick.journal = journal;
  assembly.watch.journal = journal;
  assembly.hands.source = order.hands === undefined ? noHands : new HandRing(order.hands);

  let policy = 'SCHED_OTHER';
  let words = ['fast pace: no scheduling asked for'];
  if (live) {
    collectNow();
    const idle = holdIdleStates();
    taken.push({ restore: () => idle.release() });
    const memory = lockMemory([
      assembly.block,
      assembly.signals,
      new Uint8Array(order.ring.memory),
      new Uint8Array(order.timing),
    ]);
    taken.push({ restore: () => memory.release() });
    const scheduling = enterScheduling(order.core === undefined ? {} : { core: order.core });
    taken.push(scheduling);
    policy = scheduling.policy;
    words = [...scheduling.words, memory.words, idle.words];
  }
  say({
    kind: 'ready',
    signals: [...selection].map((index) => {
      const { path, unit, about, group } = assembly.table.all[index]!;
      return { path, unit, about, group };
    }),
    paths: assembly.table.all.map((info) => info.path),
    events: { kinds: assembly.events.kinds, subjects: assembly.events.subjects },
    links: [...spec.map.links.map((link) => link.name), 'hands', 'life'],
    hands: assembly.handTargets.map(({ path, unit }) => ({ path, unit })),
    board: board.handle,
    block: Array.from({ length: assembly.layout.length }, (_, i) => assembly.layout.path(i)),
    scheduling: words,
    policy,
    startUp: {
      load: Math.max(0, performance.timeOrigin + began - order.ordered) / 1000,
      build: (built - began) / 1000,
      warmUp: (warm - built) / 1000,
      attach: (performance.now() - warm) / 1000,
      preRoll: live ? spec.life.preRoll * spec.step : 0,
      dryTicks: warmed.ticks,
      dryTick: warmed.tick * 1e-9,
      settled: warmed.settled,
    },
  });

  const meterOfCollections = new CollectionMeter();
  let collections = { collections: 0, longest: 0, allocated: 0 };
  let counting = false;
  let atEnd: ReturnType<typeof said> | undefined;
  const end = runLoop({
    assembly,
    ticks: order.ticks,
    firstTick: assembly.firstTick,
    shared,
    barriers: links.barriers,
    board: board.writer,
    pacer,
    timingSignals,
    peaks,
    code: live ? code : undefined,
    onCount: (ticks) => {
      if (counting) {
        collections = meterOfCollections.stop();
        code.finish(ticks);
        atEnd = said(assembly, ticks);
      } else {
        meter?.reset();
        if (live) code.begin();
        meterOfCollections.start();
      }
      counting = true;
    },
    samples: driven,
    afterRun: spec.life.afterRun,
  });
  journal.close();
  say({
    kind: 'done',
    ticks: end.ticks,
    stopped: end.stopped,
    failure: end.failure ?? null,
    wall: end.wall,
    processor: end.processor,
    hash: end.hash,
    peaks: Object.fromEntries(order.peaks.map((path, i) => [path, end.peaks[i]!])),
    code: code.report(),
    collections: collections.collections,
    longestCollection: collections.longest,
    heapGrowth: collections.allocated,
    refined: assembly.plant.solver.refined,
    replaced: assembly.plant.solver.replaced,
    overflows: journal.overflows,
    dropped: journal.dropped,
    stages: meter?.summary() ?? [],
    ...(atEnd ?? said(assembly, end.ticks)),
    drive: driven ? sampled(driven, end.ticks) : null,
  });
}

/** Room for what the driver was to follow and what it had; undefined without a driver. */
function driveSamples({ spec, table }: Assembly, ticks: number): Samples | undefined {
  const paths = driveSignals(spec);
  if (paths === undefined) return undefined;
  const signals = Int32Array.of(table.find(paths.target), table.find(paths.driven));
  if (signals.some((index) => index < 0)) return undefined;
  const stride = driveStride(spec.step);
  const count = Math.floor(ticks / stride);
  return { signals, stride, into: [new Float64Array(count), new Float64Array(count)] };
}

function sampled({ stride, into }: Samples, ticks: number): NonNullable<RunDone['drive']> {
  const count = Math.min(into[0].length, Math.floor(ticks / stride));
  return { wanted: into[0].slice(0, count), had: into[1].slice(0, count) };
}

/** What the run has come to by its last counted tick: what is behind it, an after-run, is recorded and changes none of this. */
function said(
  assembly: Assembly,
  ticks: number,
): Pick<RunDone, 'ledger' | 'last' | 'warnings' | 'requirements' | 'energy'> {
  const { block, signals, table } = assembly;
  const shares = assembly.ledger.shares(block, signals);
  return {
    ledger: {
      energyResidual: shares.energy,
      oilResidual: shares.stuffs['oil'] ?? 0,
      turnover: signals[table.find('ledger.turnover')]!,
      stuffs: shares.stuffs,
    },
    last: signals.slice(),
    warnings: assembly.warnings(),
    requirements: assembly.judge.results(ticks, block),
    energy: assembly.energy.list(signals),
  };
}

/** Indices of the signals that any pattern or requirement names, in the order of the list; those of watch, scenario, judge and life always. */
function choose(assembly: Assembly, patterns: readonly string[]): Int32Array {
  const tests = [...patterns, 'watch.*', 'scenario.*', 'judge.*', 'life.*'].map(globTest);
  const asked = new Set<string>();
  for (const { formula } of assembly.judge.judge.requirements) eachSignal(formula, (path) => asked.add(path));
  const found: number[] = [];
  assembly.table.all.forEach((info, i) => {
    if (asked.has(info.path) || tests.some((test) => test(info.path))) found.push(i);
  });
  return Int32Array.from(found);
}

function requireSignal(assembly: Assembly, path: string): number {
  const index = assembly.table.find(path);
  if (index >= 0) return index;
  const near = assembly.table.nearest(path);
  throw new BuildError([
    {
      path: 'record.signals',
      what: `no signal \`${path}\``,
      remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see `oilspring list signals BENCH`',
    },
  ]);
}
