import v8 from 'node:v8';
import { noTransport } from '../../bridge/transport.js';
import type { Assembly } from '../../configs/assemble.js';
import { noHands } from '../../runtime/hand.js';
import { eachSignal } from '../../runtime/judge/formula.js';
import { Clock } from '../../runtime/realtime/clock.js';
import { CodeWatch, methodsOf } from '../../runtime/realtime/code-watch.js';
import { collectNow } from '../../runtime/realtime/collection-meter.js';
import { Pacer } from '../../runtime/realtime/pacer.js';
import { createRing, RingReader } from '../../runtime/ring.js';
import { RingJournal } from '../../runtime/ring-journal.js';
import type { BoardWriter } from '../../runtime/status-board.js';
import type { StageMeter } from '../../runtime/tick.js';
import { attachModule } from './attach-links.js';
import type { Barrier, ControllerFactory } from './controller-module.js';
import { createLoopControl, LoopBody, type LoopOptions, runLoop, type Samples } from './engine.js';
import { rehearse } from './rehearsal-partner.js';
import { rehearseHands } from './rehearse-hands.js';

/** A round of the dry run, ticks; how many rounds at least and at most; rounds that have to agree. */
const ROUND = 1000;
/** Ticks that the loop runs on end in a round: entered often, the loop itself is compiled as a whole. */
const STRETCH = 50;
const LEAST_ROUNDS = 4;
const MOST_ROUNDS = 30;
const AGREE = 3;
/** Rounds whose processor time is within this of the best one have settled. */
const SETTLED = 1.1;
/** Ticks of pre-roll ahead of tick 0 in the rehearsals. */
const LEAD = 20;
/** A period that every tick overstays, and one that leaves time to sleep, ns. */
const SHORT = 10_000;
const LONG = 400_000;

/**
 * What the warm-up used, kept for as long as the thread lives: the engine gives up code that mentions an object when that
 * object is collected.
 */
const kept: unknown[] = [];

export interface WarmUpResult {
  /** Ticks of the dry run. */
  readonly ticks: number;
  /** Processor time of a tick in its last round, ns. */
  readonly tick: number;
  /** False when the steps had not settled within the most rounds. */
  readonly settled: boolean;
}

export interface WarmUpOptions {
  readonly assembly: Assembly;
  readonly selection: Int32Array;
  /** Who answers in the live run: that decides what the links are attached to here. */
  readonly partner: 'module' | 'udp' | 'none';
  readonly factory: ControllerFactory | undefined;
  /** Whether hands may act in the live run. */
  readonly hands: boolean;
  readonly board: BoardWriter;
  readonly peaks: Int32Array;
  readonly timingSignals: { readonly lateness: number; readonly step: number } | undefined;
  readonly meter: StageMeter;
  readonly samples: Samples | undefined;
  readonly code: CodeWatch;
  /** True when the run is to be given up. */
  readonly stopped: () => boolean;
}

/**
 * Brings all code of a live run to where it stays: the very loop, sockets, journal and pacer, on the very block, which is
 * put back to the start afterwards. What trouble runs through comes first (wrong datagrams, time-outs, faults, warnings,
 * a step that overstays, the solver's last resort), so that the engine has seen every branch when it compiles; then
 * rounds of the loop until their processor time has settled and no function is compiled or given up any more.
 */
export function warmUp(options: WarmUpOptions): WarmUpResult {
  const { assembly, code } = options;
  const { spec, exchange } = assembly;
  Pacer.warmUp(2000);
  const ring = createRing({ capacity: 1 << 20, whenFull: 'drop' });
  const journal = new RingJournal(ring, options.selection);
  const reader = new RingReader(ring);
  exchange.setJournal(journal);
  assembly.tick.journal = journal;
  assembly.watch.journal = journal;
  assembly.tick.meter = options.meter;
  const partners = options.partner === 'udp' ? rehearse(spec.map, exchange, options.factory, spec.step) : [];
  const barriers: Barrier[] = [...partners];
  if (options.partner === 'module' && options.factory)
    barriers.push(attachModule(spec, exchange, options.factory, spec.controller?.period ?? 1));
  barriers.push({
    end(tick) {
      if (tick % 64 !== 0) return;
      while (reader.next());
      reader.release();
    },
  });
  const fast = new Pacer({ period: SHORT });
  const slow = new Pacer({ period: LONG });
  const shared = createLoopControl();
  const clock = new Clock();
  const times = new Float64Array(2);
  const onCount = () => {};
  // the same properties in the same order as in the live run: the engine tells objects apart by that
  const optionsOf = (from: number, ticks: number, pacer: Pacer): LoopOptions => ({
    assembly,
    ticks: from + ticks,
    firstTick: from,
    shared,
    barriers,
    board: options.board,
    pacer,
    timingSignals: options.timingSignals,
    peaks: options.peaks,
    code,
    onCount,
    samples: options.samples,
    afterRun: 0,
  });
  const run = (from: number, ticks: number, pacer: Pacer) => {
    runLoop(optionsOf(from, ticks, pacer));
  };
  kept.push(
    options,
    journal,
    reader,
    partners,
    barriers,
    fast,
    slow,
    shared,
    run,
    onCount,
    new LoopBody(optionsOf(0, 0, fast)),
    optionsOf(0, 0, fast),
  );
  // a field that was written only once counts as constant, and the code that relies on it is given up at the next write
  assembly.hands.source = { poll: () => -1 };
  assembly.hands.source = noHands;
  code.rehearse();
  let ticks = 0;
  try {
    rareBranches(assembly, run, fast, slow);
    if (options.hands) hands(assembly);
    // from here on code is compiled after an eighth of the usual work: small functions would need ten thousand ticks
    v8.setFlagsFromString('--interrupt-budget=16000');
    assembly.reset();
    run(-LEAD, LEAD, fast);
    const costs: number[] = [];
    let settled = false;
    let optimised = -1;
    let steady = 0;
    for (let round = 0; round < MOST_ROUNDS && !settled && !options.stopped(); round += 1) {
      if (round > 0 && round % 10 === 0) assembly.reset();
      clock.threadTime(times, 0);
      for (const end = ticks + ROUND; ticks < end; ticks += STRETCH) run(ticks, STRETCH, fast);
      clock.threadTime(times, 1);
      costs.push((times[1]! - times[0]!) / ROUND);
      const best = Math.min(...costs);
      const now = code.count();
      steady = now === optimised ? steady + 1 : 0;
      optimised = now;
      const agreed = costs.slice(-AGREE).every((cost) => cost <= SETTLED * best);
      settled = round + 1 >= LEAST_ROUNDS && agreed && steady >= 2;
      // what is garbage now may hold code that is given up with it: better before the last rounds than after them
      if (round + 1 === LEAST_ROUNDS - 1) collectNow();
    }
    run(ticks, ROUND / 4, slow);
    return { ticks: ticks + ROUND / 4, tick: costs.at(-1) ?? 0, settled };
  } finally {
    for (const link of spec.map.links) exchange.attach(link.name, noTransport);
    for (const partner of partners) partner.close();
    assembly.reset();
  }
}

/** Everything that seldom runs, a few times each. */
function rareBranches(
  assembly: Assembly,
  run: (from: number, ticks: number, pacer: Pacer) => void,
  fast: Pacer,
  slow: Pacer,
): void {
  const { block, signals, plant, watch, table, spec, tick, script } = assembly;
  for (let round = 0; round < 6; round += 1) {
    const pacer = round % 2 === 0 ? slow : fast;
    assembly.reset();
    run(assembly.firstTick, 2, pacer);
    run(-LEAD, 2 * LEAD, pacer);
  }
  // faults and commands of instruments, one after the other
  for (const instrument of spec.instruments) {
    for (const [name, declaration] of Object.entries(instrument.kind.commands ?? {})) {
      const slot = assembly.target(`${instrument.name}.${name}`);
      if (slot < 0) continue;
      for (const value of [declaration.least, declaration.most]) {
        if (value === undefined || !Number.isFinite(value)) continue;
        assembly.reset();
        block[slot] = value;
        run(0, 5, fast);
      }
    }
  }
  // the whole scenario in leaps, with what stands ahead of the plant: as if the vehicle followed, lagged and ran ahead
  const { script: timeline, before } = tick.parts;
  const target = table.find('scenario.targetSpeed');
  const inputs = spec.instruments
    .filter((instrument) => instrument.kind.stage === 'before')
    .flatMap((instrument) => Object.values(instrument.inputs))
    .map((path) => (path.startsWith('scenario.') ? -1 : table.find(path)))
    .filter((index) => index >= 0);
  for (const follows of [0, 0.8, 1, 1.2, 2, 1]) {
    assembly.reset();
    const leap = Math.max(1, Math.floor(script.ticks / 500));
    for (let at = 0; at < script.ticks; at += leap) {
      timeline.run(block, signals, at, tick.journal);
      for (const index of inputs) signals[index] = follows * Math.max(1, target < 0 ? 1 : signals[target]!);
      for (let i = 0; i < before.length; i += 1) before[i]!(block, signals, at);
      timeline.apply(block, at);
    }
  }
  // every pressure through all levels and back, with acknowledgements: all at once, then slowly and one after the other
  const watched = spec.watched.map((input) => ({
    index: table.find(input.path),
    least: -1e5,
    most: 1.5 * Math.max(1e5, ...numbersIn(input)),
  }));
  for (const [period, apart] of [
    [600, 0],
    [5000, 1.7],
  ] as const) {
    assembly.reset();
    for (let at = 0; at < 2 * period; at += 1) {
      watched.forEach(({ index, least, most }, i) => {
        signals[index] = least + (0.5 - 0.5 * Math.cos((at * 2 * Math.PI) / period + apart * i)) * (most - least);
      });
      if (at % 250 === 249) block[watch.acknowledgeSlot] = block[watch.acknowledgeSlot]! === -1 ? 1 : -1;
      watch.run(block, signals, at);
    }
  }
  rehearseJudge(assembly);
  // a state that is no number: the solver's safety net to its end
  for (let round = 0; round < 20; round += 1) {
    assembly.reset();
    plant.y.fill(Number.NaN);
    plant.step();
  }
  assembly.reset();
}

/** Signals that requirements ask about, each now on one side and now on the other of every number in its requirement. */
function rehearseJudge(assembly: Assembly): void {
  const { block, signals, table, tick } = assembly;
  const asked = assembly.judge.judge.requirements.map(({ formula }) => {
    const indices: number[] = [];
    eachSignal(formula, (path) => indices.push(table.find(path)));
    return {
      indices: indices.filter((index) => index >= 0),
      values: [0, 1, -1, ...numbersIn(formula).flatMap((value) => [0.9 * value, 1.1 * value])],
    };
  });
  assembly.reset();
  let draw = 1;
  for (let at = 0; at < 6000; at += 1) {
    // for a while the same, so that what has to last does, and then ever more often another
    if (at % Math.max(1, 60 - Math.floor(at / 100)) === 0) {
      for (const { indices, values } of asked) {
        for (const index of indices) {
          draw = (Math.imul(draw, 1664525) + 1013904223) | 0;
          signals[index] = values[(draw >>> 16) % values.length]!;
        }
      }
    }
    assembly.judge.run(block, signals, at, tick.journal);
  }
}

/** One hand of each kind, again and again. */
function hands(assembly: Assembly): void {
  assembly.reset();
  const rehearse = rehearseHands(assembly);
  for (let at = 0; at < 900; at += 1) {
    rehearse(assembly.firstTick + at);
    assembly.tick.run(at);
  }
  assembly.hands.source = noHands;
}

/** All numbers in a declaration. */
function numbersIn(input: object): number[] {
  return Object.values(input).flatMap((value) =>
    typeof value === 'number' && Number.isFinite(value)
      ? [value]
      : value !== null && typeof value === 'object'
        ? numbersIn(value)
        : [],
  );
}

/** What a live loop calls in every tick. */
export function hotCode(assembly: Assembly, others: readonly object[]): CodeWatch {
  const { tick, plant, exchange, watch, ledger, circuit } = assembly;
  const { script, before, after, judge, hands } = tick.parts;
  const found = methodsOf([
    tick,
    plant,
    plant.solver,
    exchange,
    watch,
    ledger,
    script,
    judge,
    hands,
    ...exchange.links,
    ...exchange.links.flatMap((link) => [...link.receivers, ...link.senders]),
    ...others,
  ]);
  for (const [name, one] of Object.entries(circuit.functions))
    if (typeof one === 'function') found.set(`circuit.${name}`, one);
  for (const [i, update] of before.entries()) found.set(`instrument before ${i}`, update);
  for (const [i, update] of after.entries()) found.set(`instrument after ${i}`, update);
  for (const name of ['wait', 'run', 'over'] as const) found.set(`LoopBody.${name}`, LoopBody.prototype[name]);
  found.set('runLoop', runLoop);
  return new CodeWatch(found);
}
