import { Exchange } from '../bridge/exchange.js';
import { BlockLayout } from '../runtime/block.js';
import { buildCircuit, type Circuit, places } from '../runtime/circuit/build.js';
import { BuildError, type Problem } from '../runtime/contract.js';
import { EnergyParts } from '../runtime/energy-parts.js';
import { HandStage, type HandTarget } from '../runtime/hand.js';
import type { InstrumentUpdate } from '../runtime/instrument.js';
import { EventCatalogue } from '../runtime/journal.js';
import { JudgeStage } from '../runtime/judge/stage.js';
import { Life } from '../runtime/life.js';
import { ledgerSignals, meterSignals, stuffSignals, timingSignals } from '../runtime/own-signals.js';
import { Plant, type PlantPlaces } from '../runtime/plant.js';
import { emptyScript, requirementsOf, Script, type ScriptSpec } from '../runtime/script.js';
import { SignalTable } from '../runtime/signals.js';
import { LedgerStage, Tick, throughputs } from '../runtime/tick.js';
import { Watch } from '../runtime/watch.js';
import type { WatchWarning } from '../runtime/watch-log.js';
import type { BenchSpec, InstrumentSpec } from './bench-spec.js';

/** A bench put together: everything that one thread needs to run ticks. */
export interface Assembly {
  readonly spec: BenchSpec;
  readonly script: ScriptSpec;
  readonly circuit: Circuit;
  readonly plant: Plant;
  readonly layout: BlockLayout;
  readonly table: SignalTable;
  readonly events: EventCatalogue;
  readonly block: Float64Array;
  readonly signals: Float64Array;
  readonly exchange: Exchange;
  readonly tick: Tick;
  readonly ledger: LedgerStage;
  /** Energy by element since the start. */
  readonly energy: EnergyParts;
  readonly firstTick: number;
  /** Slot of a command by path, or -1. */
  readonly target: (path: string) => number;
  /** Puts the block back to the start, as if no tick had run. */
  reset(): void;
  /** Warnings so far, oldest first. Not for the tick. */
  warnings(): readonly WatchWarning[];
  readonly watch: Watch;
  /** All requirements, those of the bench first. */
  readonly judge: JudgeStage;
  readonly hands: HandStage;
  /** What a hand may take hold of, in the order of the numbers by which hands name it. */
  readonly handTargets: readonly HandTarget[];
  /** Slot of the ticks by which the timeline lags behind the clock because it was held. */
  readonly scriptDelaySlot: number;
}

export interface AssemblyOptions {
  readonly seed: number;
  readonly script?: ScriptSpec;
  /** Substeps instead of the file's: for accuracy references. */
  readonly substeps?: number;
  /** A circuit that is built already, to save building it again. */
  readonly circuit?: Circuit;
}

/** Puts a checked bench together. Throws BuildError for what only the built circuit shows. */
export function assemble(spec: BenchSpec, options: AssemblyOptions): Assembly {
  const script = options.script ?? emptyScript;
  const circuit = options.circuit ?? buildCircuit(withStart(spec.circuit, script.start));
  const layout = new BlockLayout();
  const table = new SignalTable();
  const events = new EventCatalogue();
  const firstTick = -spec.life.preRoll;

  const at = reservePlant(layout, circuit);
  const commandAt = new Map(circuit.commands.map((command, i) => [command.path, at.commands + i]));
  const shown = declareCircuit(table, circuit, at);
  const life = new Life({
    ...spec.life,
    firstTick,
    layout,
    signals: table,
    events,
    link: spec.map.links.length + 1,
  });
  for (const [path, slot] of life.targets) commandAt.set(path, slot);
  for (const { slot, signal } of life.shown) {
    shown.slots.push(slot);
    shown.signals.push(signal);
  }
  const units = new Map(spec.signals.map((info) => [info.path, info.unit]));
  const declared = spec.instruments.map((instrument) =>
    declareInstrument(instrument, layout, table, spec.step, units, commandAt, shown),
  );
  const targets = { find: (path: string) => commandAt.get(path) ?? -1, nearest: () => [...commandAt.keys()] };

  const outputs = new Map(
    spec.instruments
      .filter((instrument) => instrument.kind.stage === 'before')
      .flatMap((instrument) => Object.keys(instrument.kind.outputs).map((output) => `${instrument.name}.${output}`))
      .map((path) => [path, table.find(path)]),
  );
  const said = { find: (path: string) => outputs.get(path) ?? -1 };
  const scriptStage = new Script(script, spec.step, layout, table, events, targets, said);
  const declaredLedger = declareLedger(table, circuit);
  const ledgerSlots = {
    turnover: layout.addMany('ledger.turnover', throughputs(circuit).length),
    start: layout.addMany('ledger.start', 1 + circuit.stuffs.length),
  };
  const meters = declareMeters(circuit, layout, table);
  declareTiming(table);
  const exchange = new Exchange({
    map: spec.map,
    layout,
    signals: table,
    events,
    targets: { find: targets.find, nearest: () => [] },
    step: spec.step,
    bootWindowTicks: spec.life.bootWindow,
    firstTick,
    seed: options.seed,
    without: [...spec.without, ...(script.without ?? [])],
  });
  for (const { slot, ...info } of exchange.faults) {
    commandAt.set(info.path, slot);
    shown.slots.push(slot);
    shown.signals.push(table.add({ ...info, group: 'command' }));
  }
  const instruments = spec.instruments.map((instrument, i) =>
    buildInstrument(instrument, declared[i]!, table, options.seed, i, spec.step),
  );
  const drives = spec.instruments.flatMap((instrument) =>
    Object.entries(instrument.drives).map(([output, path]) => ({
      from: table.find(`${instrument.name}.${output}`),
      to: targets.find(path),
    })),
  );
  const watch = new Watch({
    watched: spec.watched,
    signals: table,
    layout,
    events,
    step: spec.step,
    ambientPressure: spec.ambient.pressure,
  });
  const handTargets = targetsOfHands(spec, commandAt, table);
  const hands = new HandStage({
    targets: handTargets,
    reach: {
      heldSlot: scriptStage.heldSlot,
      scenario: script.name,
      acknowledge: (values, warning, now) => watch.acknowledge(values, warning, now),
      warnings: watch.ladders.map((ladder) => ladder.path),
    },
    layout,
    events,
    step: spec.step,
    link: spec.map.links.length,
  });
  commandAt.set('watch.acknowledge', watch.acknowledgeSlot);
  life.bind(targets.find);
  requireTargets(script, new Set([...commandAt.keys(), ...outputs.keys()]));
  scriptStage.bind(table);
  const judge = new JudgeStage({
    requirements: requirementsOf(spec.requirements, script),
    signals: table,
    layout,
    events,
    step: spec.step,
  });

  const block = layout.create();
  const signals = new Float64Array(table.length);
  const plant = new Plant(circuit, { step: spec.step, substeps: options.substeps ?? spec.substeps }, block, at);
  const ledger = new LedgerStage(circuit, plant, spec.step, ledgerSlots, declaredLedger, meters);
  const energy = new EnergyParts(circuit, table, spec.step);
  const initial = block.slice();
  const tick = new Tick({
    plant,
    block,
    signals,
    exchange,
    life,
    hands,
    script: scriptStage,
    before: stageOf(spec, instruments, 'before'),
    drives: { from: Int32Array.from(drives, (drive) => drive.from), to: Int32Array.from(drives, (drive) => drive.to) },
    after: stageOf(spec, instruments, 'after'),
    ledger,
    energy,
    watch,
    judge,
    shown: { slots: Int32Array.from(shown.slots), signals: Int32Array.from(shown.signals) },
    snapshotEvery: Math.max(1, Math.round(1 / spec.step)),
  });
  const reset = () => {
    block.set(initial);
    signals.fill(0);
    judge.reset();
    scriptStage.reset();
    plant.reset();
    plant.solver.clear();
    signals.set(plant.observed, 0);
    ledger.begin(block);
    energy.begin(signals);
  };
  reset();
  return {
    spec,
    script,
    circuit,
    plant,
    layout,
    table,
    events,
    block,
    signals,
    exchange,
    tick,
    ledger,
    energy,
    firstTick,
    target: targets.find,
    reset,
    watch,
    judge,
    hands,
    handTargets,
    scriptDelaySlot: scriptStage.delaySlot,
    warnings: () => watch.warnings(block),
  };
}

/** The circuit with a scenario's start values over those of the bench. */
function withStart(circuit: BenchSpec['circuit'], start: ScriptSpec['start']): BenchSpec['circuit'] {
  if (start === undefined) return circuit;
  return {
    ...circuit,
    elements: circuit.elements.map((element) => {
      const own = start[element.name];
      return own === undefined ? element : { ...element, start: { ...element.start, ...own } };
    }),
  };
}

function reservePlant(layout: BlockLayout, circuit: Circuit): PlantPlaces {
  const states = layout.length;
  for (const state of circuit.states) layout.add(state.path, state.initial);
  const memory = layout.length;
  for (const slot of circuit.memory) layout.add(slot.path, slot.initial);
  const commands = layout.length;
  for (const command of circuit.commands) layout.add(command.path, command.rest);
  const ledger = layout.length;
  layout.add('ledger.supplied');
  layout.add('ledger.left');
  for (const stuff of circuit.stuffs) layout.add(`ledger.${stuff}Brought`);
  return { states, memory, commands, ledger };
}

/** The circuit's own signals: what `observe` writes, in its order, then states, memory and commands. */
function declareCircuit(table: SignalTable, circuit: Circuit, at: PlantPlaces): { slots: number[]; signals: number[] } {
  for (const reading of circuit.readings) table.add(plain(reading));
  table.add(ledgerSignals.supply);
  table.add(ledgerSignals.leaving);
  for (const stuff of circuit.stuffs) table.add(stuffSignals(stuff).bringing);
  table.add(ledgerSignals.stored);
  for (const stuff of circuit.stuffs) table.add(stuffSignals(stuff).held);
  if (table.length !== places(circuit).observeCount)
    throw new Error('the signals do not match what the circuit observes');
  const slots: number[] = [];
  const signals: number[] = [];
  const show = (
    list: readonly { path: string }[],
    first: number,
    infos: readonly Parameters<SignalTable['add']>[0][],
  ) => {
    list.forEach((slot, i) => {
      if (table.find(slot.path) >= 0) return;
      slots.push(first + i);
      signals.push(table.add(plain(infos[i]!)));
    });
  };
  show(circuit.states, at.states, circuit.states);
  show(circuit.memory, at.memory, circuit.memory);
  show(circuit.commands, at.commands, circuit.commands);
  return { slots, signals };
}

function plain(info: Parameters<SignalTable['add']>[0]): Parameters<SignalTable['add']>[0] {
  const { path, unit, about, group, least, most } = info;
  return {
    path,
    unit,
    about,
    group,
    ...(least === undefined ? {} : { least }),
    ...(most === undefined ? {} : { most }),
  };
}

function declareLedger(table: SignalTable, circuit: Circuit): { residual: number; turnover: number; stuffs: number } {
  const residual = table.add(ledgerSignals.residual);
  const turnover = table.add(ledgerSignals.turnover);
  const stuffs = table.length;
  for (const stuff of circuit.stuffs) table.add(stuffSignals(stuff).residual);
  return { residual, turnover, stuffs };
}

/** Every command, and what the instruments ahead of the plant say: pedals, selector, currents. */
function targetsOfHands(spec: BenchSpec, commandAt: ReadonlyMap<string, number>, table: SignalTable): HandTarget[] {
  const unitOf = (path: string) => table.all[table.find(path)]?.unit ?? '1';
  const commands = [...commandAt].map(([path, slot]) => ({ path, unit: unitOf(path), slot, signal: -1 }));
  const said = spec.instruments
    .filter((instrument) => instrument.kind.stage === 'before')
    .flatMap((instrument) => Object.keys(instrument.kind.outputs).map((output) => `${instrument.name}.${output}`))
    .map((path) => ({ path, unit: unitOf(path), slot: -1, signal: table.find(path) }));
  return [...commands, ...said];
}

/** Energy that machines took up while braking and gave back, by machine. */
function declareMeters(
  circuit: Circuit,
  layout: BlockLayout,
  table: SignalTable,
): { power: number; sign: 1 | -1; slot: number; signal: number }[] {
  return circuit.spec.elements
    .filter((element) => element.kind.kind === 'pump-motor')
    .flatMap((element) => {
      const own = meterSignals(element.name);
      const power = table.find(`${element.name}.shaftPower`);
      return (
        [
          [own.recovered, -1],
          [own.returned, 1],
        ] as const
      ).map(([info, sign]) => ({
        power,
        sign,
        slot: layout.add(info.path),
        signal: table.add(info),
      }));
    });
}

/** What a live run says of each tick besides: not part of the block, zero at fast pace. */
function declareTiming(table: SignalTable): void {
  for (const info of Object.values(timingSignals)) table.add(info);
}

interface DeclaredInstrument {
  readonly output: Record<string, number>;
  readonly command: Record<string, number>;
  readonly memory: Record<string, number>;
  readonly extra: number;
}

function declareInstrument(
  spec: InstrumentSpec,
  layout: BlockLayout,
  table: SignalTable,
  step: number,
  units: ReadonlyMap<string, string>,
  commandAt: Map<string, number>,
  shown: { slots: number[]; signals: number[] },
): DeclaredInstrument {
  const output: Record<string, number> = {};
  const memory: Record<string, number> = {};
  const command: Record<string, number> = {};
  const sensed = Object.entries(spec.kind.inputs).find(([, declaration]) => declaration.anyUnit)?.[0];
  const inputUnit = units.get(spec.inputs[sensed ?? ''] ?? '') ?? '1';
  for (const [name, declaration] of Object.entries(spec.kind.outputs)) {
    const from = declaration.unitOf === undefined ? undefined : units.get(spec.inputs[declaration.unitOf] ?? '');
    output[name] = table.add({
      ...plain({ ...declaration, path: '', group: 'instrument' }),
      path: `${spec.name}.${name}`,
      unit: from ?? declaration.unit,
    });
  }
  for (const [name, declaration] of Object.entries(spec.kind.commands ?? {})) {
    const path = `${spec.name}.${name}`;
    const slot = layout.add(path, declaration.rest);
    command[name] = slot;
    commandAt.set(path, slot);
    shown.slots.push(slot);
    shown.signals.push(
      table.add({
        ...plain({ ...declaration, path, group: 'command' }),
        unit: declaration.unit === 'input' ? inputUnit : declaration.unit,
      }),
    );
  }
  for (const [name, declaration] of Object.entries(spec.kind.memory))
    memory[name] = layout.add(`${spec.name}.${name}`, declaration.initial ?? 0);
  const count = spec.kind.extraMemory?.(spec.parameters, step) ?? 0;
  return { output, memory, command, extra: layout.addMany(`${spec.name}.memory`, count) };
}

function buildInstrument(
  spec: InstrumentSpec,
  declared: DeclaredInstrument,
  table: SignalTable,
  seed: number,
  identity: number,
  step: number,
): InstrumentUpdate {
  const input: Record<string, number> = {};
  const problems: Problem[] = [];
  for (const [name, declaration] of Object.entries(spec.kind.inputs)) {
    const path = spec.inputs[name];
    input[name] = path === undefined ? -1 : table.find(path);
    if (input[name] >= 0 || (path === undefined && declaration.optional)) continue;
    const near = path === undefined ? [] : table.nearest(path);
    problems.push({
      where: spec.where,
      path: `${spec.name}.${name}`,
      what: path === undefined ? 'input is not connected' : `no signal \`${path}\``,
      remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see `oilspring list signals BENCH`',
    });
  }
  if (problems.length > 0) throw new BuildError(problems);
  return spec.kind.build({
    name: spec.name,
    parameter: spec.parameters,
    input,
    output: declared.output,
    memory: declared.memory,
    command: declared.command,
    extra: declared.extra,
    seed,
    identity,
    step,
  });
}

function stageOf(spec: BenchSpec, updates: readonly InstrumentUpdate[], stage: 'before' | 'after'): InstrumentUpdate[] {
  return updates.filter((_, i) => spec.instruments[i]!.kind.stage === stage);
}

function requireTargets(script: ScriptSpec, known: ReadonlySet<string>): void {
  const problems: Problem[] = [];
  const named = [
    ...script.traces.map((trace) => ['traces', trace.target] as const),
    ...script.steps.map((step) => [`steps (${step.name})`, step.target] as const),
  ];
  for (const [where, target] of named) {
    if (target !== '' && !known.has(target))
      problems.push({
        path: `${script.name}: ${where}`,
        what: `no command \`${target}\``,
        remedy: 'see `oilspring list signals BENCH`',
      });
  }
  if (problems.length > 0) throw new BuildError(problems);
}
