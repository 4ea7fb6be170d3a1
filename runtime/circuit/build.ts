import {
  BuildError,
  type CircuitSpec,
  type CommandDeclaration,
  type ElementFunction,
  type ElementInstance,
  type PortKind,
  type Problem,
  type SignalInfo,
  type StateDeclaration,
} from '../contract.js';
import { rodas3Stages, strideWeightsOf } from '../solver/rodas3-code.js';
import { type Elimination, eliminate, printElimination, printPieces } from './elimination.js';
import { chunkSize, javaScript, type Output, printFunction } from './emit.js';
import { Graph, type NodeId } from './graph.js';
import { jacobian } from './jacobian.js';
import { type CircuitModule, compileModule, trainModule } from './module.js';
import { type ReadContext, readFunction, type Table } from './read.js';

/**
 * Builds a circuit: reads the element functions, inlines the whole circuit into fused straight-line functions,
 * differentiates it, finds sparsity and elimination order, and compiles the step's pieces. Knows no hydraulics.
 */

/** One state, memory slot, command or reading of a built circuit; its index is its place in the array. */
export interface Slot extends SignalInfo {
  readonly element: string;
  readonly name: string;
}
export interface StateSlot extends Slot {
  readonly initial: number;
  readonly scale: number;
  /** See StateDeclaration.errorWeight; 0: not judged. */
  readonly errorWeight: number;
}
export interface MemorySlot extends Slot {
  readonly initial: number;
  /** See MemoryDeclaration.gradual. */
  readonly gradual: boolean;
}
export interface CommandSlot extends Slot {
  readonly rest: number;
  readonly fault: boolean;
}

type Arrays = Float64Array;
export interface CircuitFunctions {
  /** d = dy/dt; y states, u commands, m memory. */
  readonly rates: (y: Arrays, u: Arrays, m: Arrays, d: Arrays) => void;
  /** Fills d (n rates, then the ledger rates: supplied, left, brought per stuff) and the Jacobian's values J. */
  readonly ratesAndJacobian: (y: Arrays, u: Arrays, m: Arrays, d: Arrays, J: Arrays) => void;
  /** Memory after a substep: out = new memory; h is the length of the substep that has ended, s. */
  readonly update: (y: Arrays, u: Arrays, m: Arrays, h: number, out: Arrays) => void;
  /** Readings, then the ledger rates, then total energy, then holdings per stuff. */
  readonly observe: (y: Arrays, u: Arrays, m: Arrays, out: Arrays) => void;
  /** Per element: imbalance of its energy, W (0 for a right element), then the sum of the magnitudes of its terms, W. */
  readonly audit: (y: Arrays, u: Arrays, m: Arrays, out: Arrays) => void;
  /** Factors c I - J; A gets the factors and the least pivot over c: see elimination.ts. */
  readonly factor: (J: Arrays, c: number, A: Arrays) => void;
  readonly solve: (A: Arrays, b: Arrays, x: Arrays) => void;
}

export interface Circuit {
  readonly name: string;
  readonly spec: CircuitSpec;
  readonly states: readonly StateSlot[];
  readonly memory: readonly MemorySlot[];
  readonly commands: readonly CommandSlot[];
  readonly readings: readonly Slot[];
  /** Kinds of conserved stuff, for instance `oil`. */
  readonly stuffs: readonly string[];
  /** Row and column of each Jacobian value. */
  readonly jacobian: { readonly rows: readonly number[]; readonly columns: readonly number[] };
  /** By state: what one unit of estimated error counts against a long stride; see solver/rodas3.ts. */
  readonly strideWeights: readonly number[];
  readonly elimination: Elimination;
  readonly functions: CircuitFunctions;
  /** The functions of a step, on arrays of their own. */
  readonly step: CircuitModule;
  /** The generated JavaScript, readable. */
  readonly code: string;
  readonly nodeCount: number;
  readonly hasMemory: boolean;
  /** For printing the same circuit in another language. */
  readonly outputs: CircuitOutputs;
  readonly graph: Graph;
}

export interface CircuitOutputs {
  readonly rates: readonly Output[];
  readonly ratesAndJacobian: readonly Output[];
  readonly update: readonly Output[];
  readonly observe: readonly Output[];
  readonly audit: readonly Output[];
}

/** Places of things in `observe`'s output and in `d` of `ratesAndJacobian`. */
export function places(circuit: Pick<Circuit, 'states' | 'readings' | 'stuffs'>) {
  const n = circuit.states.length;
  const r = circuit.readings.length;
  const s = circuit.stuffs.length;
  return {
    rateSupplied: n,
    rateLeft: n + 1,
    rateBrought: n + 2,
    rateCount: n + 2 + s,
    supplied: r,
    left: r + 1,
    brought: r + 2,
    energy: r + 2 + s,
    holdings: r + 3 + s,
    observeCount: r + 3 + 2 * s,
  };
}

class ElementReader {
  readonly stateNodes = new Map<string, NodeId>();
  readonly memoryNodes = new Map<string, NodeId>();
  readonly commandNodes = new Map<string, NodeId>();
  readonly readings = new Map<string, NodeId>();
  readonly derivatives = new Map<string, NodeId>();
  readonly nextMemory = new Map<string, NodeId>();
  /** Stores: efforts written and flows summed, by port. */
  readonly efforts = new Map<string, Map<string, NodeId>>();
  readonly flows = new Map<string, Map<string, NodeId>>();
  /** Branches: what this branch itself added at its ports (as the branch counts it, ratio not applied). */
  readonly ownFlows = new Map<string, Map<string, NodeId>>();

  constructor(
    readonly element: ElementInstance,
    private readonly graph: Graph,
    private readonly portKinds: Readonly<Record<string, PortKind>>,
    private readonly storeOf: (name: string) => ElementReader,
  ) {}

  portKind(port: string): PortKind {
    return this.portKinds[this.element.kind.ports[port]!]!;
  }

  read(
    phase: 'efforts' | 'flows' | 'derivatives' | 'update' | 'value',
    name: string,
    fn: ElementFunction,
  ): NodeId | undefined {
    const { element, graph } = this;
    const { kind } = element;
    const fixed = (table: ReadonlyMap<string, NodeId>): Table => ({
      get: (key) => table.get(key),
      members: [...table.keys()],
    });
    const numbers = (values: Readonly<Record<string, number>>): Table => ({
      get: (key) => (key in values ? graph.constant(values[key]!) : undefined),
      members: Object.keys(values),
    });
    const writable = (table: Map<string, NodeId>, allowed: readonly string[], may: boolean): Table => ({
      get: (key) => table.get(key),
      members: allowed,
      ...(may
        ? {
            set: (key: string, value: NodeId, how: string) => {
              if (!allowed.includes(key) || how !== 'set') return false;
              table.set(key, value);
              return true;
            },
          }
        : {}),
    });
    const tables: Record<string, Table> = {
      parameter: numbers(element.parameters),
      fluid: numbers(element.fluid ?? {}),
      state: fixed(this.stateNodes),
      command: fixed(this.commandNodes),
      memory:
        phase === 'update'
          ? {
              get: (key) => this.memoryNodes.get(key),
              members: [...this.memoryNodes.keys()],
              set: (key, value, how) => {
                if (!this.memoryNodes.has(key) || how !== 'set') return false;
                this.nextMemory.set(key, value);
                return true;
              },
            }
          : fixed(this.memoryNodes),
      reading: writable(
        this.readings,
        Object.keys(kind.readings),
        phase === 'efforts' || phase === 'flows' || phase === 'derivatives',
      ),
      derivative: writable(this.derivatives, Object.keys(kind.states), phase === 'derivatives' || phase === 'flows'),
    };
    for (const port of Object.keys(kind.ports))
      tables[port] = kind.role === 'store' ? this.storePort(port, phase) : this.branchPort(port, phase);
    const context: ReadContext = {
      graph,
      label: `${element.name} (${kind.kind}).${name}`,
      ...(element.where ? { where: element.where } : {}),
      tables,
      numbers: phase === 'update' ? { step: graph.step() } : {},
      laws: kind.laws,
    };
    return readFunction(context, fn);
  }

  private storePort(port: string, phase: string): Table {
    const kind = this.portKind(port);
    const efforts = this.efforts.get(port)!;
    const flows = this.flows.get(port)!;
    return {
      get: (key) => efforts.get(key) ?? (phase === 'efforts' ? undefined : flows.get(key)),
      members: [...Object.keys(kind.efforts), ...Object.keys(kind.flows)],
      set: (key, value, how) => {
        if (phase !== 'efforts' || how !== 'set' || !(key in kind.efforts)) return false;
        efforts.set(key, value);
        return true;
      },
    };
  }

  private branchPort(port: string, phase: string): Table {
    const kind = this.portKind(port);
    const connection = this.element.connections[port];
    const { graph } = this;
    const own = this.ownFlows.get(port)!;
    const members = [...Object.keys(kind.efforts), ...Object.keys(kind.flows)];
    if (!connection) {
      return {
        get: (key) => (key in kind.efforts ? graph.constant(0) : undefined),
        members,
        set: (key, _value, how) => key in kind.flows && how !== 'set' && phase === 'flows',
      };
    }
    const target = this.storeOf(connection.store);
    const ratio = graph.constant(connection.ratio);
    const efforts = target.efforts.get(connection.port)!;
    const flows = target.flows.get(connection.port)!;
    return {
      get: (key) => {
        const effort = efforts.get(key);
        if (effort === undefined) return undefined;
        return kind.scaled?.effort === key ? graph.apply('*', [ratio, effort]) : effort;
      },
      members,
      set: (key, value, how) => {
        if (phase !== 'flows' || how === 'set' || !(key in kind.flows)) return false;
        const op = how === 'add' ? '+' : '-';
        const scaled = kind.scaled?.flow === key ? graph.apply('*', [ratio, value]) : value;
        flows.set(key, graph.apply(op, [flows.get(key)!, scaled]));
        own.set(key, graph.apply(op, [own.get(key)!, value]));
        return true;
      },
    };
  }

  /** The efforts that a branch sees at a connected port. */
  effortsSeen(port: string): (key: string) => NodeId {
    const table = this.branchPort(port, 'value');
    return (key) => table.get(key)!;
  }

  /** Sum of the powers into the store at one port, from given flows. */
  portPower(port: string, efforts: (key: string) => NodeId, flows: ReadonlyMap<string, NodeId>): NodeId[] {
    return this.portKind(port).power.map((pair) =>
      pair.length === 1 ? flows.get(pair[0])! : this.graph.product(flows.get(pair[0])!, efforts(pair[1])),
    );
  }
}

/** Names of the ledger readings that each element gets besides its own. */
const ledgerReadings = {
  energy: ['J', 'stored energy'],
  supply: ['W', 'power from outside'],
  loss: ['W', 'power dissipated'],
} as const;

export interface BuildOptions {
  /** Operations in one generated function, at most: for tests of the cutting. */
  readonly chunkSize?: number;
}

export function buildCircuit(spec: CircuitSpec, options: BuildOptions = {}): Circuit {
  const most = options.chunkSize ?? chunkSize;
  checkWiring(spec);
  const states: StateSlot[] = [];
  const memory: MemorySlot[] = [];
  const commands: CommandSlot[] = [];
  for (const element of spec.elements) declareSlots(element, states, memory, commands);

  const graph = new Graph(states.length);
  const byName = new Map<string, ElementReader>();
  const readers = spec.elements.map((element) => {
    const reader = new ElementReader(element, graph, spec.portKinds, (name) => byName.get(name)!);
    byName.set(element.name, reader);
    return reader;
  });
  const tie = (
    slots: readonly Slot[],
    table: 'stateNodes' | 'memoryNodes' | 'commandNodes',
    node: (index: number) => NodeId,
  ) => {
    slots.forEach((slot, i) => {
      byName.get(slot.element)![table].set(slot.name, node(i));
    });
  };
  tie(states, 'stateNodes', (i) => graph.state(i));
  tie(memory, 'memoryNodes', (i) => graph.memory(i));
  tie(commands, 'commandNodes', (i) => graph.command(i));
  const nothingYet = graph.constant(-0);
  for (const reader of readers) {
    for (const port of Object.keys(reader.element.kind.ports)) {
      const empty = () => new Map(Object.keys(reader.portKind(port).flows).map((key) => [key, nothingYet]));
      reader.efforts.set(port, new Map());
      reader.flows.set(port, empty());
      reader.ownFlows.set(port, empty());
    }
  }

  const stores = readers.filter((reader) => reader.element.kind.role === 'store');
  const branches = readers.filter((reader) => reader.element.kind.role === 'branch');
  for (const reader of stores) {
    const fn = reader.element.kind.efforts;
    if (fn) reader.read('efforts', 'efforts', fn);
    for (const port of Object.keys(reader.element.kind.ports)) {
      for (const key of Object.keys(reader.portKind(port).efforts)) {
        if (!reader.efforts.get(port)!.has(key))
          fail(reader.element, `efforts does not write ${port}.${key}`, 'write every effort of every port');
      }
    }
  }
  for (const reader of branches) {
    const fn = reader.element.kind.flows;
    if (fn) reader.read('flows', 'flows', fn);
  }
  for (const reader of stores) {
    const fn = reader.element.kind.derivatives;
    if (fn) reader.read('derivatives', 'derivatives', fn);
  }
  for (const reader of readers) {
    const { kind } = reader.element;
    for (const name of Object.keys(kind.states))
      if (!reader.derivatives.has(name))
        fail(reader.element, `derivative.${name} is never written`, 'write the derivative of each state');
    for (const name of Object.keys(kind.readings))
      if (!reader.readings.has(name))
        fail(reader.element, `reading.${name} is never written`, 'write each declared reading');
    if (kind.update) reader.read('update', 'update', kind.update);
  }

  // ledger
  const values = readers.map((reader) => {
    const { kind } = reader.element;
    const of = (name: 'energy' | 'supply' | 'loss') =>
      kind[name] ? reader.read('value', name, kind[name]) : undefined;
    return { reader, energy: of('energy'), supply: of('supply'), loss: of('loss') };
  });
  const zero = graph.constant(0);
  const total = (nodes: readonly (NodeId | undefined)[]) =>
    nodes.reduce<NodeId>((sum, node) => (node === undefined ? sum : graph.sum(sum, node)), zero);
  const supplied = total(values.map((value) => value.supply));
  const left = total(values.map((value) => (value.reader.element.kind.heat === 'leaves' ? value.loss : undefined)));
  const energy = total(values.map((value) => value.energy));
  const stuffs = [
    ...new Set(
      spec.elements.flatMap((element) => [
        ...Object.keys(element.kind.holds ?? {}),
        ...Object.keys(element.kind.brings ?? {}),
      ]),
    ),
  ].sort();
  const stuffTotal = (table: 'holds' | 'brings', stuff: string) =>
    total(
      readers.map((reader) =>
        reader.element.kind[table]?.[stuff]
          ? reader.read('value', `${table}.${stuff}`, reader.element.kind[table]![stuff]!)
          : undefined,
      ),
    );
  const brought = stuffs.map((stuff) => stuffTotal('brings', stuff));
  const holdings = stuffs.map((stuff) => stuffTotal('holds', stuff));

  const readings: Slot[] = [];
  const readingNodes: NodeId[] = [];
  for (const { reader, ...ledger } of values) {
    const { element } = reader;
    for (const [name, declaration] of Object.entries(element.kind.readings)) {
      readings.push({ ...slot(element, name, declaration, 'reading'), ...bounds(declaration) });
      readingNodes.push(reader.readings.get(name)!);
    }
    for (const [name, [unit, about]] of Object.entries(ledgerReadings)) {
      const node = ledger[name as keyof typeof ledgerReadings];
      if (node === undefined || name in element.kind.readings) continue;
      readings.push(slot(element, name, { unit, about }, 'ledger'));
      readingNodes.push(node);
    }
    const passing = element.kind.role === 'branch' ? throughput(graph, reader) : undefined;
    if (passing !== undefined) {
      readings.push(
        slot(element, 'throughput', { unit: 'W', about: 'mechanical and hydraulic power passing through' }, 'ledger'),
      );
      readingNodes.push(passing);
    }
  }

  const rateNodes = states.map((state) => byName.get(state.element)!.derivatives.get(state.name)!);
  const { rows, columns, nodes: jacobianNodes } = jacobian(graph, rateNodes);

  const audit: NodeId[] = [];
  const auditScale: NodeId[] = [];
  for (const value of values) {
    const terms = balanceTerms(graph, value, rateNodes);
    audit.push(total(terms));
    auditScale.push(total(terms.map((term) => graph.apply('abs', [term]))));
  }

  const list = (array: string, nodes: readonly NodeId[], from = 0): Output[] =>
    nodes.map((node, i) => ({ array, index: from + i, node }));
  const rates = list('d', rateNodes);
  const outputs: CircuitOutputs = {
    rates,
    ratesAndJacobian: [
      ...rates,
      ...list('d', [supplied, left, ...brought], states.length),
      ...list('J', jacobianNodes),
    ],
    update: list(
      'out',
      memory.map(
        (slotInfo) =>
          byName.get(slotInfo.element)!.nextMemory.get(slotInfo.name) ??
          byName.get(slotInfo.element)!.memoryNodes.get(slotInfo.name)!,
      ),
    ),
    observe: list('out', [...readingNodes, supplied, left, ...brought, energy, ...holdings]),
    audit: list('out', [...audit, ...auditScale]),
  };
  const elimination = eliminate(states.length, rows, columns);
  const errorWeights = states.map((state) => state.errorWeight);
  const strideWeights = strideWeightsOf(states, columns);
  const step = compileModule({
    graph,
    outputs,
    elimination,
    commands: commands.length,
    entries: rows.length,
    errorWeights,
    strideWeights,
    most,
  });
  trainModule(step, { states, memory, commands });
  const auditFunction = lazily(
    () =>
      new Function(
        `'use strict';\n${printFunction(graph, 'audit', ['y', 'u', 'm', 'out'], outputs.audit, most)}\nreturn audit;`,
      )() as CircuitFunctions['audit'],
  );
  return {
    name: spec.name,
    spec,
    states,
    memory,
    commands,
    readings,
    stuffs,
    jacobian: { rows, columns },
    strideWeights,
    elimination,
    functions: { ...functionsOf(step), audit: auditFunction },
    step,
    get code(): string {
      return printCircuit(graph, outputs, elimination, errorWeights, strideWeights, most);
    },
    nodeCount: graph.nodes.length,
    hasMemory: memory.length > 0,
    outputs,
    graph,
  };
}

/** The module's functions on arrays of the caller: for checks and tests. */
function functionsOf(module: CircuitModule): Omit<CircuitFunctions, 'audit'> {
  const copy = (from: Arrays, to: Arrays) => {
    for (let i = 0; i < from.length && i < to.length; i += 1) to[i] = from[i]!;
  };
  const load = (y: Arrays, u: Arrays, m: Arrays) => {
    copy(y, module.y);
    copy(u, module.u);
    copy(m, module.m);
  };
  return {
    rates(y, u, m, d) {
      load(y, u, m);
      copy(y, module.s);
      module.rates();
      copy(module.b, d);
    },
    ratesAndJacobian(y, u, m, d, J) {
      load(y, u, m);
      module.ratesAndJacobian();
      copy(module.d, d);
      copy(module.J, J);
    },
    update(y, u, m, h, out) {
      load(y, u, m);
      copy(y, module.s);
      module.t[0] = h;
      module.update();
      copy(module.n, out);
    },
    observe(y, u, m, out) {
      load(y, u, m);
      module.observe();
      copy(module.o, out);
    },
    factor(J, c, A) {
      copy(J, module.J);
      module.t[1] = c;
      module.factor();
      copy(module.J, A);
    },
    solve(A, b, x) {
      copy(A, module.J);
      copy(b, module.d);
      module.solve();
      copy(module.k1, x);
    },
  };
}

/** The circuit as readable JavaScript. */
function printCircuit(
  graph: Graph,
  outputs: CircuitOutputs,
  elimination: Elimination,
  errorWeights: readonly number[],
  strideWeights: readonly number[],
  most: number,
): string {
  return [
    printFunction(graph, 'rates', ['y', 'u', 'm', 'd'], outputs.rates, most),
    printFunction(graph, 'ratesAndJacobian', ['y', 'u', 'm', 'd', 'J'], outputs.ratesAndJacobian, most),
    printFunction(graph, 'update', ['y', 'u', 'm', 'h', 'out'], outputs.update, most),
    printFunction(graph, 'observe', ['y', 'u', 'm', 'out'], outputs.observe, most),
    printElimination(elimination),
    ...rodas3Stages(elimination, errorWeights, strideWeights, javaScript).map(({ name, parameters, lines }) =>
      printPieces(name, parameters.join(', '), lines, elimination.cut),
    ),
  ].join('\n\n');
}

function lazily<F extends (...values: never[]) => void>(make: () => F): F {
  let made: F | undefined;
  return ((...values: never[]) => {
    made ??= make();
    made(...values);
  }) as F;
}

/** Terms of one element's energy balance, W; their sum is zero when its functions agree with each other. */
function balanceTerms(
  graph: Graph,
  value: { reader: ElementReader; energy: NodeId | undefined; supply: NodeId | undefined; loss: NodeId | undefined },
  rateNodes: readonly NodeId[],
): NodeId[] {
  const { reader, energy, supply, loss } = value;
  const { kind, connections } = reader.element;
  const negative = (node: NodeId) => graph.product(graph.constant(-1), node);
  const terms: NodeId[] = [];
  if (energy !== undefined) {
    for (let state = 0; state < rateNodes.length; state += 1) {
      if (graph.dependsOn(energy, state)) terms.push(graph.product(graph.derivative(energy, state), rateNodes[state]!));
    }
  }
  if (supply !== undefined) terms.push(negative(supply));
  if (loss !== undefined && kind.heat === 'leaves') terms.push(loss);
  for (const port of Object.keys(kind.ports)) {
    if (kind.role === 'store') {
      const efforts = reader.efforts.get(port)!;
      for (const power of reader.portPower(port, (key) => efforts.get(key)!, reader.flows.get(port)!))
        terms.push(negative(power));
    } else if (connections[port]) {
      const table = reader.effortsSeen(port);
      terms.push(...reader.portPower(port, table, reader.ownFlows.get(port)!));
    }
  }
  return terms;
}

/** Half the sum of the magnitudes of a branch's port powers other than heat, W; undefined when it has none. */
function throughput(graph: Graph, reader: ElementReader): NodeId | undefined {
  let sum: NodeId | undefined;
  for (const port of Object.keys(reader.element.kind.ports)) {
    if (!reader.element.connections[port]) continue;
    const efforts = reader.effortsSeen(port);
    const flows = reader.ownFlows.get(port)!;
    for (const pair of reader.portKind(port).power) {
      if (pair.length === 1) continue;
      const size = graph.apply('abs', [graph.product(flows.get(pair[0])!, efforts(pair[1]))]);
      sum = sum === undefined ? size : graph.sum(sum, size);
    }
  }
  return sum === undefined || graph.isConstant(sum) ? undefined : graph.product(graph.constant(0.5), sum);
}

function slot(
  element: ElementInstance,
  name: string,
  declaration: { unit: string; about: string },
  group: SignalInfo['group'],
): Slot {
  return {
    element: element.name,
    name,
    path: `${element.name}.${name}`,
    unit: declaration.unit,
    about: declaration.about,
    group,
  };
}

function bounds(declaration: { least?: number; most?: number }): { least?: number; most?: number } {
  return {
    ...(declaration.least === undefined ? {} : { least: declaration.least }),
    ...(declaration.most === undefined ? {} : { most: declaration.most }),
  };
}

function declareSlots(
  element: ElementInstance,
  states: StateSlot[],
  memory: MemorySlot[],
  commands: CommandSlot[],
): void {
  const { kind } = element;
  checkNames(element);
  const values = { parameter: element.parameters, fluid: element.fluid ?? {} };
  const initial = kind.initial ? kind.initial({ ...values, start: element.start }) : {};
  for (const [name, declaration] of Object.entries(kind.states) as [string, StateDeclaration][]) {
    const value = initial[name] ?? element.start[name] ?? declaration.initial ?? 0;
    if (!Number.isFinite(value))
      fail(
        element,
        `the start value of state ${name} is ${value}`,
        'look at the start values and parameters of this element',
      );
    states.push({
      ...slot(element, name, declaration, 'state'),
      ...bounds(declaration),
      initial: value,
      scale: declaration.scale ?? 1,
      errorWeight: declaration.errorWeight ? declaration.errorWeight(values) : 0,
    });
  }
  for (const [name, declaration] of Object.entries(kind.memory)) {
    memory.push({
      ...slot(element, name, declaration, 'memory'),
      initial: initial[name] ?? declaration.initial ?? 0,
      gradual: declaration.gradual ?? false,
    });
  }
  for (const [name, declaration] of Object.entries(kind.commands) as [string, CommandDeclaration][]) {
    commands.push({
      ...slot(element, name, declaration, 'command'),
      ...bounds(declaration),
      rest: (declaration.restFrom === undefined ? undefined : element.start[declaration.restFrom]) ?? declaration.rest,
      fault: declaration.fault ?? false,
    });
  }
}

/** Names that the builder gives to every element besides its own declarations. */
const takenReadings = ['energy', 'supply', 'loss', 'throughput'];

function checkNames(element: ElementInstance): void {
  const { kind } = element;
  const seen = new Set<string>();
  for (const name of [
    ...Object.keys(kind.states),
    ...Object.keys(kind.memory),
    ...Object.keys(kind.commands),
    ...Object.keys(kind.readings),
  ]) {
    if (seen.has(name))
      fail(
        element,
        `the name ${name} is declared twice among states, memory, commands and readings`,
        'give each its own name',
      );
    if (takenReadings.includes(name)) fail(element, `the name ${name} belongs to the ledger`, 'choose another');
    seen.add(name);
  }
}

function fail(element: ElementInstance, what: string, remedy: string): never {
  throw new BuildError([
    {
      ...(element.where ? { where: element.where } : {}),
      path: `${element.name} (${element.kind.kind})`,
      what,
      remedy,
    },
  ]);
}

function checkWiring(spec: CircuitSpec): void {
  const problems: Problem[] = [];
  const byName = new Map<string, ElementInstance>();
  for (const element of spec.elements) {
    const at = element.where ? { where: element.where } : {};
    if (byName.has(element.name))
      problems.push({
        ...at,
        path: element.name,
        what: 'this name is taken',
        remedy: 'give each element a name of its own',
      });
    byName.set(element.name, element);
  }
  for (const element of spec.elements) {
    const at = element.where ? { where: element.where } : {};
    if (element.kind.role !== 'branch') continue;
    for (const [port, kindName] of Object.entries(element.kind.ports)) {
      const connection = element.connections[port];
      const path = `${element.name}.${port}`;
      if (!connection) {
        if (!element.kind.optionalPorts?.includes(port))
          problems.push({
            ...at,
            path,
            what: 'port is not connected',
            remedy: `connect it to a store with a port of kind ${kindName}`,
          });
        continue;
      }
      const target = byName.get(connection.store);
      if (!target || target.kind.role !== 'store') {
        problems.push({
          ...at,
          path,
          what: `no store \`${connection.store}\``,
          remedy: 'connect it to a store of this bench',
        });
        continue;
      }
      const theirs = target.kind.ports[connection.port];
      if (theirs !== kindName) {
        problems.push({
          ...at,
          path,
          what: `port kinds differ: this is ${kindName}, ${connection.store}.${connection.port} is ${theirs ?? 'not there'}`,
          remedy: 'connect ports of one kind',
        });
      }
      if (connection.ratio !== 1 && !spec.portKinds[kindName]?.scaled)
        problems.push({
          ...at,
          path,
          what: `a ${kindName} port takes no ratio`,
          value: String(connection.ratio),
          remedy: 'remove the ratio',
        });
    }
  }
  if (problems.length > 0) throw new BuildError(problems);
}
