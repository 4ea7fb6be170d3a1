import type {
  BuildValues,
  CommandDeclaration,
  ElementKind,
  Laws,
  LimitDeclaration,
  MemoryDeclaration,
  ParameterDeclaration,
  ReadingDeclaration,
  StartDeclaration,
  StateDeclaration,
} from '../runtime/contract.js';
import type { PortKindName, PortVariables } from './ports.js';

type Numbers<T> = { readonly [K in keyof T]: number };
type Writable<T> = { -readonly [K in keyof T]: number };
type Ports<P extends Record<string, PortKindName>> = { [K in keyof P]: PortVariables[P[K]] };

/** The one argument of an element function. Ports stand beside the tables under their own names. */
export type Argument<P extends Record<string, PortKindName>, S, M, C, R, Q, L> = {
  readonly parameter: Numbers<Q>;
  readonly state: Numbers<S>;
  /** Written only in `update`; everywhere else read. */
  readonly memory: Writable<M>;
  readonly command: Numbers<C>;
  readonly reading: Writable<R>;
  readonly derivative: Writable<S>;
  readonly fluid: FluidValues;
  readonly law: L;
  /** Length of the substep, s; only in `update`. */
  readonly step: number;
} & Ports<P>;

/** What a declared fluid is to an element: see plants/fluids.ts. */
export interface FluidValues {
  readonly [name: string]: number;
}

interface Declaration<
  P extends Record<string, PortKindName>,
  S extends Record<string, StateDeclaration>,
  M extends Record<string, MemoryDeclaration>,
  C extends Record<string, CommandDeclaration>,
  R extends Record<string, ReadingDeclaration>,
  Q extends Record<string, ParameterDeclaration>,
  L extends Laws,
> {
  kind: string;
  about: string;
  source: string;
  valid?: string;
  ports: P;
  optionalPorts?: readonly (keyof P & string)[];
  states?: S;
  memory?: M;
  commands?: C;
  readings?: R;
  parameters?: Q;
  starts?: Record<string, StartDeclaration>;
  fluid?: boolean;
  laws?: L;
  limits?: readonly LimitDeclaration[];
  update?: (argument: Argument<P, S, M, C, R, Q, L>) => void;
  energy?: (argument: Argument<P, S, M, C, R, Q, L>) => number;
  supply?: (argument: Argument<P, S, M, C, R, Q, L>) => number;
  loss?: (argument: Argument<P, S, M, C, R, Q, L>) => number;
  heat?: 'kept' | 'leaves';
  holds?: Record<string, (argument: Argument<P, S, M, C, R, Q, L>) => number>;
  brings?: Record<string, (argument: Argument<P, S, M, C, R, Q, L>) => number>;
  initial?: (values: BuildValues & { readonly start: Readonly<Record<string, number>> }) => Record<string, number>;
  examine?: ElementKind['examine'];
}

const nothing = {} as const;

function complete(role: 'store' | 'branch', given: object): ElementKind {
  return {
    states: nothing,
    memory: nothing,
    commands: nothing,
    readings: nothing,
    parameters: nothing,
    starts: nothing,
    fluid: false,
    laws: nothing,
    limits: [],
    heat: 'kept',
    ...given,
    role,
  } as unknown as ElementKind;
}

/** Declares a store: it holds something, writes the efforts of its ports and reads only the sums of their flows. */
export function store<
  const P extends Record<string, PortKindName>,
  const S extends Record<string, StateDeclaration> = Record<never, StateDeclaration>,
  const M extends Record<string, MemoryDeclaration> = Record<never, MemoryDeclaration>,
  const C extends Record<string, CommandDeclaration> = Record<never, CommandDeclaration>,
  const R extends Record<string, ReadingDeclaration> = Record<never, ReadingDeclaration>,
  const Q extends Record<string, ParameterDeclaration> = Record<never, ParameterDeclaration>,
  const L extends Laws = Record<never, unknown>,
>(
  declaration: Declaration<P, S, M, C, R, Q, L> & {
    efforts: (argument: Argument<P, S, M, C, R, Q, L>) => void;
    derivatives?: (argument: Argument<P, S, M, C, R, Q, L>) => void;
  },
): ElementKind {
  return complete('store', declaration);
}

/** Declares a branch: it joins ports of stores, reads their efforts and adds flows to them. */
export function branch<
  const P extends Record<string, PortKindName>,
  const S extends Record<string, StateDeclaration> = Record<never, StateDeclaration>,
  const M extends Record<string, MemoryDeclaration> = Record<never, MemoryDeclaration>,
  const C extends Record<string, CommandDeclaration> = Record<never, CommandDeclaration>,
  const R extends Record<string, ReadingDeclaration> = Record<never, ReadingDeclaration>,
  const Q extends Record<string, ParameterDeclaration> = Record<never, ParameterDeclaration>,
  const L extends Laws = Record<never, unknown>,
>(
  declaration: Declaration<P, S, M, C, R, Q, L> & {
    flows: (argument: Argument<P, S, M, C, R, Q, L>) => void;
  },
): ElementKind {
  return complete('branch', declaration);
}
