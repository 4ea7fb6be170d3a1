import { parentPort, workerData } from 'node:worker_threads';
import v8 from 'node:v8';
import { noTransport } from '../../bridge/transport.js';
import { type Assembly, assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { memoryFiles } from '../../configs/files.js';
import { globTest } from '../../configs/signal-list.js';
import { BuildError } from '../../runtime/contract.js';
import { noHands } from '../../runtime/hand.js';
import { noJournal } from '../../runtime/journal.js';
import { eachSignal } from '../../runtime/judge/formula.js';
import { CollectionMeter, collectNow } from '../../runtime/realtime/collection-meter.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { Pacer } from '../../runtime/realtime/pacer.js';
import { enterScheduling, type Scheduling } from '../../runtime/realtime/scheduling.js';
import { TimingRecord } from '../../runtime/realtime/timing-record.js';
import { HandRing } from '../../runtime/hand-ring.js';
import { RingJournal } from '../../runtime/ring-journal.js';
import { catalogue as library } from '../../configs/catalogue.js';
import { attachLinks, attachModule } from './attach-links.js';
import { loadController } from './controller-module.js';
import { createLoopControl, runLoop } from './engine.js';
import { rehearseHands } from './rehearse-hands.js';
import type { LoopMessage, RunOrder } from './run-order.js';
import { StageClock } from './stage-meter.js';
import { statusBoard } from './status.js';

/**
 * The loop thread: builds the bench, warms up, runs all ticks with its own sockets, and ends. It shares rings and a few
 * words with the host and nothing else; no file, no terminal and no browser is touched here while ticks run.
 */
// before the hot code compiles; process-wide, so the host keeps its defaults only until here
v8.setFlagsFromString('--max-inlined-bytecode-size=2000');
v8.setFlagsFromString('--max-inlined-bytecode-size-cumulative=6000');

/** Ticks of the dry run before a live run: after these, steps take what they will take. */
const warmUpTicks = { live: 20_000, fast: 0 };
const scriptEvery = 1;

const port = parentPort!;
const say = (message: LoopMessage) => port.postMessage(message);

void main(workerData as RunOrder).catch((error: unknown) => {
  const code = error instanceof BuildError ? 2 : 5;
  say({ kind: 'failed', what: error instanceof Error ? error.message : String(error), code });
});

async function main(order: RunOrder): Promise<void> {
  if (order.pace === 'live' && whyNotLive() !== '') throw new BuildError([{ path: 'run --pace live', what: whyNotLive(), remedy: 'use --pace fast here' }]);
  const began = performance.now();
  const texts = Object.fromEntries(order.sources.map((source) => [source.path, source.text]));
  const spec = readBench(order.sources[0]!.path, library, memoryFiles(texts));
  const assembly = assemble(spec, { seed: order.seed, script: order.script });
  const built = performance.now();
  const selection = choose(assembly, order.patterns);
  const journal = new RingJournal(order.ring, selection);

  if (order.pace === 'live') await warmUp(assembly, spec, order);
  const warmed = performance.now();
  const links = await attachLinks(order, spec, assembly.exchange);
  assembly.exchange.setJournal(journal);
  assembly.tick.journal = journal;
  assembly.watch.journal = journal;
  assembly.hands.source = order.hands === undefined ? noHands : new HandRing(order.hands);
  const board = statusBoard(assembly);
  const meter = order.profile ? new StageClock() : undefined;
  if (meter) assembly.tick.meter = meter;

  let scheduling: Scheduling | undefined;
  if (order.pace === 'live') {
    Pacer.warmUp();
    collectNow();
  }
  if (order.pace === 'live') scheduling = enterScheduling(order.core === undefined ? {} : { core: order.core });
  say({
    kind: 'ready',
    signals: [...selection].map((index) => {
      const { path, unit, about, group } = assembly.table.all[index]!;
      return { path, unit, about, group };
    }),
    paths: assembly.table.all.map((info) => info.path),
    events: { kinds: assembly.events.kinds, subjects: assembly.events.subjects },
    links: [...spec.map.links.map((link) => link.name), 'hands'],
    hands: assembly.handTargets.map(({ path, unit }) => ({ path, unit })),
    board: board.handle,
    block: Array.from({ length: assembly.layout.length }, (_, i) => assembly.layout.path(i)),
    scheduling: scheduling?.words ?? ['fast pace: no scheduling asked for'],
    policy: scheduling?.policy ?? 'SCHED_OTHER',
    startUp: { build: (built - began) / 1000, warmUp: (warmed - built) / 1000 },
  });

  const meterOfCollections = new CollectionMeter();
  let collections = { collections: 0, longest: 0, allocated: 0 };
  let counting = false;
  const pacer = order.pace === 'live' ? new Pacer({ period: Math.round(spec.step * 1e9), record: new TimingRecord(order.timing) }) : undefined;
  const lateness = assembly.table.find('timing.lateness');
  const end = runLoop({
    assembly,
    ticks: order.ticks,
    shared: createLoopControl(order.control),
    barriers: links.barriers,
    board: board.writer,
    ...(pacer ? { pacer } : {}),
    ...(pacer && lateness >= 0 ? { timingSignals: { lateness, step: assembly.table.find('timing.step') } } : {}),
    peaks: Int32Array.from(order.peaks, (path) => requireSignal(assembly, path)),
    onCount: () => {
      if (!counting) {
        meter?.reset();
        meterOfCollections.start();
      } else collections = meterOfCollections.stop();
      counting = true;
    },
  });
  scheduling?.restore();
  journal.close();
  links.close();
  const shares = assembly.ledger.shares(assembly.block, assembly.signals);
  say({
    kind: 'done',
    ticks: end.ticks,
    stopped: end.stopped,
    failure: end.failure ?? null,
    wall: end.wall,
    processor: end.processor,
    hash: end.hash,
    peaks: Object.fromEntries(order.peaks.map((path, i) => [path, end.peaks[i]!])),
    ledger: {
      energyResidual: shares.energy,
      oilResidual: shares.stuffs['oil'] ?? 0,
      turnover: assembly.signals[assembly.table.find('ledger.turnover')]!,
      stuffs: shares.stuffs,
    },
    collections: collections.collections,
    longestCollection: collections.longest,
    heapGrowth: collections.allocated,
    refined: assembly.plant.solver.refined,
    replaced: assembly.plant.solver.replaced,
    overflows: journal.overflows,
    dropped: journal.dropped,
    stages: meter?.summary() ?? [],
    last: assembly.signals.slice(),
    warnings: assembly.warnings(),
    requirements: assembly.judge.results(end.ticks, assembly.block),
    energy: assembly.energy.list(assembly.signals),
  });
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
  throw new BuildError([{ path: 'record.signals', what: `no signal \`${path}\``, remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see `oilspring list signals BENCH`' }]);
}

/** Runs the very tick that will count, on the same arrays, and throws the state away: everything that it remembers stands in the block. */
async function warmUp(assembly: Assembly, spec: BenchSpec, order: RunOrder): Promise<void> {
  if (spec.map.links.length > 0 && spec.controller?.module !== undefined) {
    const factory = await loadController(order.folder, spec.controller.module);
    const barrier = attachModule(spec, assembly.exchange, factory, scriptEvery);
    dryRun(assembly, order.hands !== undefined, (tick) => barrier.end(tick));
  } else dryRun(assembly, order.hands !== undefined, () => {});
  for (const one of spec.map.links) assembly.exchange.attach(one.name, noTransport);
  assembly.reset();
}

function dryRun(assembly: Assembly, hands: boolean, end: (tick: number) => void): void {
  assembly.tick.journal = noJournal;
  const rehearse = hands ? rehearseHands(assembly) : undefined;
  for (let round = 0; round < 2; round += 1) {
    assembly.reset();
    const last = assembly.firstTick + warmUpTicks.live / 2;
    for (let tick = assembly.firstTick; tick < last; tick += 1) {
      rehearse?.(tick);
      assembly.tick.run(tick);
      end(tick);
    }
  }
}
