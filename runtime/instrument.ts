import type {
  CommandDeclaration,
  MemoryDeclaration,
  ParameterDeclaration,
  Quantity,
  ReadingDeclaration,
} from './contract.js';

/**
 * Instruments: driver, sensors, power stages. Discrete, updated once a tick in their stage. Their update functions are
 * ordinary code (loops allowed) that allocates nothing; all they remember stands in the block.
 */
export interface InstrumentKind {
  readonly kind: string;
  readonly about: string;
  readonly source: string;
  /** Parameters and commands with the unit `input` take the unit of the input that has `anyUnit`. */
  readonly parameters: Readonly<Record<string, ParameterDeclaration>>;
  /** `before`: ahead of the plant step (driver, power stages); `after`: behind it (sensors). */
  readonly stage: 'before' | 'after';
  /** Signals that it reads. In a file the key takes a signal path. */
  readonly inputs: Readonly<Record<string, Quantity & { readonly optional?: boolean; readonly anyUnit?: boolean }>>;
  /** Signals that it writes: `instrument.output`. In a file `drives: { output: element.command }` ties one to a command. */
  readonly outputs: Readonly<Record<string, ReadingDeclaration & { readonly unitOf?: string }>>;
  readonly memory: Readonly<Record<string, MemoryDeclaration>>;
  /** What the script and faults set, `instrument.command`; held in the block like an element's commands. */
  readonly commands?: Readonly<Record<string, CommandDeclaration>>;
  /** Slots in a row beyond `memory`, for delay lines: plain code at build time. */
  readonly extraMemory?: (parameter: Readonly<Record<string, number>>, step: number) => number;
  readonly build: (setup: InstrumentSetup) => InstrumentUpdate;
}

export interface InstrumentSetup {
  readonly name: string;
  readonly parameter: Readonly<Record<string, number>>;
  /** Index into the signals, -1 when an optional one is not connected. */
  readonly input: Readonly<Record<string, number>>;
  readonly output: Readonly<Record<string, number>>;
  /** Index into the block of each memory slot, and of the first extra slot. */
  readonly memory: Readonly<Record<string, number>>;
  readonly extra: number;
  /** Index into the block of each held command. */
  readonly command: Readonly<Record<string, number>>;
  readonly seed: number;
  /** A number of its own for noise streams. */
  readonly identity: number;
  /** Tick length, s. */
  readonly step: number;
}

export type InstrumentUpdate = (block: Float64Array, signals: Float64Array, tick: number) => void;
