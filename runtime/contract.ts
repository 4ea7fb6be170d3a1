/**
 * The element contract: what an element declares and what the builder (runtime/circuit) makes of it.
 *
 * The runtime knows no hydraulics. It knows stores, branches and instruments, ports with efforts and flows, states,
 * memory, commands, readings and parameters. Which port kinds exist and what they carry is data (plants/ports.ts).
 */

/** Something with a unit and one line about it. `unit` is SI, written as in `kg/s`, `N m`, `1` for a pure number. */
export interface Quantity {
  readonly unit: string;
  readonly about: string;
  /** A pressure or temperature difference: neither absolute nor gauge, no zero of a scale. */
  readonly difference?: boolean;
}

/** A port kind: the efforts a store writes and the flows branches add, each flow counted into the store. */
export interface PortKind {
  readonly about: string;
  readonly efforts: Readonly<Record<string, Quantity>>;
  readonly flows: Readonly<Record<string, Quantity>>;
  /** Power into the store through this port, as pairs of names multiplied and summed; a lone name is a power itself. */
  readonly power: readonly (readonly [string, string] | readonly [string])[];
  /** What a connection with ratio r multiplies: the branch sees r * effort and the store gets r * flow. */
  readonly scaled?: { readonly effort: string; readonly flow: string };
}
export type PortKinds = Readonly<Record<string, PortKind>>;

/** Plain numbers known when the circuit is built. Functions that take them are ordinary code and may do anything. */
export interface BuildValues {
  readonly parameter: Readonly<Record<string, number>>;
  readonly fluid: Readonly<Record<string, number>>;
}

export interface StateDeclaration extends Quantity {
  /** Bounds that a healthy run never leaves; crossing them is reported. */
  readonly least?: number;
  readonly most?: number;
  readonly initial?: number;
  /**
   * What one unit of this state's estimated error in one substep counts, relative to the error at which the safety
   * net refines (1). For an oil mass: (beta / (rho V)) / 0.5 bar. Absent: the state is not judged.
   */
  readonly errorWeight?: (values: BuildValues) => number;
  /**
   * A typical size, for scaling differences and accuracy figures, and for how long a stride of the solver may be (see
   * solver/rodas3.ts). Default: 1.
   */
  readonly scale?: number;
}

export interface MemoryDeclaration extends Quantity {
  readonly initial?: number;
  /**
   * True for what changes gently or only counts time. Anything else is a latch: the solver takes short substeps where it
   * changes.
   */
  readonly gradual?: boolean;
}

/** A number that the controller, the script, a fault or an instrument sets; held over a tick. */
export interface CommandDeclaration extends Quantity {
  /** The value when nobody sets it. */
  readonly rest: number;
  /** Name of a start value that stands in for `rest`: what is there at the start stays until somebody says otherwise. */
  readonly restFrom?: string;
  readonly least?: number;
  readonly most?: number;
  /** True for inputs that only faults and scenarios touch (leak factor, stuck position, ...). */
  readonly fault?: boolean;
}

export interface ReadingDeclaration extends Quantity {
  readonly least?: number;
  readonly most?: number;
}

/** Dimension of a parameter in a file; `unit` is the SI unit it is converted to. */
export interface ParameterDeclaration extends Quantity {
  /** Required when absent. */
  readonly default?: number;
  readonly least?: number;
  readonly most?: number;
  /** What data sheets usually say; outside it `check` remarks, it does not refuse. */
  readonly usual?: readonly [number, number];
  /** A pressure must say absolute or gauge unless it is a difference. */
  readonly difference?: boolean;
  /** A choice by name instead of a number: the name's index becomes the value. */
  readonly choices?: readonly string[];
}

/** What the user may say about the state at the start; converted by `initial`. */
export interface StartDeclaration extends ParameterDeclaration {}

/** A limit that the watch evaluates on a true reading in every tick. */
export interface LimitDeclaration {
  readonly reading: string;
  readonly side: 'above' | 'below';
  readonly level: WatchLevel;
  /** The setting: the name of a parameter; 0 or not given in the file switches the limit off. */
  readonly parameter: string;
  /** The setting is this share of the parameter (1.1 for 1.1 PS); pressures are scaled as gauge by configs. Default 1. */
  readonly share?: number;
  /** What it would mean on a vehicle, in one sentence. */
  readonly meaning: string;
}

/** Levels of warnings, least to most severe within a side. */
export type WatchLevel =
  | 'near relief'
  | 'relief passing'
  | 'above maximum'
  | 'above 1.1 maximum'
  | 'below precharge'
  | 'below least inlet'
  | 'over speed'
  | 'over temperature'
  | 'end of travel'
  | 'level low'
  | 'case pressure'
  | 'not following'
  | 'locked';

/** Pure functions of numbers and exported number constants (plants/laws); read by the builder by name. */
export type Laws = Readonly<Record<string, unknown>>;

// biome-ignore lint/suspicious/noExplicitAny: element functions are typed where they are written (plants/define.ts)
export type ElementFunction = (argument: any) => void;
// biome-ignore lint/suspicious/noExplicitAny: as above
export type ValueFunction = (argument: any) => number;

/** Declarations that every store and branch has. */
export interface ElementKind {
  readonly kind: string;
  readonly role: 'store' | 'branch';
  readonly about: string;
  /** Standard, handbook or paper that the law is from, or `common practice, no source`. */
  readonly source: string;
  /** Limits of validity, in words. */
  readonly valid?: string;
  /** Port name to port kind name. */
  readonly ports: Readonly<Record<string, string>>;
  /** Ports that may stay unconnected (branches); they then see zero efforts. */
  readonly optionalPorts?: readonly string[];
  readonly states: Readonly<Record<string, StateDeclaration>>;
  readonly memory: Readonly<Record<string, MemoryDeclaration>>;
  readonly commands: Readonly<Record<string, CommandDeclaration>>;
  readonly readings: Readonly<Record<string, ReadingDeclaration>>;
  readonly parameters: Readonly<Record<string, ParameterDeclaration>>;
  readonly starts: Readonly<Record<string, StartDeclaration>>;
  /** True when the element needs a fluid declared in the bench file. */
  readonly fluid: boolean;
  readonly laws: Laws;
  readonly limits: readonly LimitDeclaration[];

  /** Stores: write the effort of each port (and readings). May read state, memory, command, parameter, fluid, law. */
  readonly efforts?: ElementFunction;
  /** Branches: read efforts, add flows (`port.flow += x`, `-=`), write `derivative.x` and `reading.x`. */
  readonly flows?: ElementFunction;
  /** Stores: read efforts and summed flows, write `derivative.x` and `reading.x`. */
  readonly derivatives?: ElementFunction;
  /** Discrete memory, at the start of each substep, from values before it: `memory.x = ...`. `step` is its length, s. */
  readonly update?: ElementFunction;
  /** Stored energy, J. */
  readonly energy?: ValueFunction;
  /** Power that enters the circuit here from outside (negative: leaves), W, other than `loss`. */
  readonly supply?: ValueFunction;
  /** Power that the law dissipates, W, from the law alone and never from port powers. Not negative. */
  readonly loss?: ValueFunction;
  /** `kept`: the element puts its loss as heat into its ports or itself; `leaves`: it goes to the surroundings. */
  readonly heat: 'kept' | 'leaves';
  /** What the element holds of a conserved stuff, kg: `{ oil: ({ state }) => state.mass }`. */
  readonly holds?: Readonly<Record<string, ValueFunction>>;
  /** What enters of it from outside, kg/s. */
  readonly brings?: Readonly<Record<string, ValueFunction>>;

  /** Values at the start from the user's start values, SI. Plain code at build time. States not named take `initial`. */
  readonly initial?: (
    values: BuildValues & { readonly start: Readonly<Record<string, number>> },
  ) => Record<string, number>;
  /** Remarks on parameters that only make sense together; an empty list is fine. Plain code at build time. */
  readonly examine?: (
    values: BuildValues,
  ) => readonly { readonly parameter: string; readonly what: string; readonly remedy: string }[];
}

export interface Position {
  readonly file: string;
  readonly line: number;
  readonly column: number;
}

/** Where a branch's port is tied. */
export interface Connection {
  readonly store: string;
  readonly port: string;
  /** The branch sees ratio * effort, the store gets ratio * flow. Only shafts have one; 1 elsewhere. */
  readonly ratio: number;
}

/** One element of a circuit, all values SI. */
export interface ElementInstance {
  readonly name: string;
  readonly kind: ElementKind;
  readonly parameters: Readonly<Record<string, number>>;
  readonly fluid?: Readonly<Record<string, number>>;
  readonly connections: Readonly<Record<string, Connection>>;
  readonly start: Readonly<Record<string, number>>;
  readonly where?: Position;
}

/** What the builder takes: elements in the order in which flows are summed. */
export interface CircuitSpec {
  readonly name: string;
  readonly portKinds: PortKinds;
  readonly elements: readonly ElementInstance[];
}

/** A named number that can be recorded, sensed, watched, judged or shown. */
export interface SignalInfo extends Quantity {
  /** `element.signal` */
  readonly path: string;
  readonly group: SignalGroup;
  readonly least?: number;
  readonly most?: number;
  /** Only of commands that nothing but a fault touches: the value without the fault. */
  readonly withoutFault?: number;
}
export type SignalGroup =
  | 'state'
  | 'memory'
  | 'reading'
  | 'command'
  | 'instrument'
  | 'sent'
  | 'received'
  | 'link'
  | 'ledger'
  | 'timing'
  | 'run';

/** An error that a user can act on. `at` is `file:line:column` where known. */
export class BuildError extends Error {
  override readonly name = 'BuildError';
  constructor(readonly problems: readonly Problem[]) {
    super(problems.map(problemText).join('\n'));
  }
}
export interface Problem {
  readonly where?: Position;
  readonly path: string;
  readonly what: string;
  readonly value?: string;
  readonly bound?: string;
  readonly remedy: string;
}
/** `file:line:column path: what, value, bound, remedy` */
export function problemText(problem: Problem): string {
  const place = problem.where ? `${problem.where.file}:${problem.where.line}:${problem.where.column} ` : '';
  const parts = [problem.what, problem.value, problem.bound, problem.remedy].filter(
    (part) => part !== undefined && part !== '',
  );
  return `${place}${problem.path}: ${parts.join(', ')}`;
}
