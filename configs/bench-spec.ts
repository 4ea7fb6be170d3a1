import type { MessageMap } from '../bridge/message-map.js';
import type { FluidKind } from '../plants/fluids.js';
import type {
  CircuitSpec,
  ElementKind,
  PortKinds,
  Position,
  Problem,
  SignalInfo,
  WatchLevel,
} from '../runtime/contract.js';
import type { InstrumentKind } from '../runtime/instrument.js';
import type { Requirement } from '../runtime/judge/formula.js';
import type { Frames, ResetStep } from '../runtime/life.js';
import type { SourceText } from './source.js';

/** What a bench file may draw from: everything in it is passed in, so that tests bring their own. */
export interface Catalogue {
  readonly portKinds: PortKinds;
  readonly elements: readonly ElementKind[];
  readonly instruments: readonly InstrumentKind[];
  readonly fluids: readonly FluidKind[];
}

/** A bench as its file says it, checked, in SI and ticks. Plain data. */
export interface BenchSpec {
  readonly name: string;
  readonly about: string;
  /** Length of a tick, s. */
  readonly step: number;
  readonly substeps: number;
  readonly seed: number;
  readonly budgets: Budgets;
  readonly ambient: Ambient;
  readonly circuit: CircuitSpec;
  readonly instruments: readonly InstrumentSpec[];
  readonly map: MessageMap;
  /** Control units that the bench does not stand in for: the real ones are there. */
  readonly without: readonly string[];
  readonly watched: readonly WatchedSignal[];
  /** Asked of every run on this bench. */
  readonly requirements: readonly Requirement[];
  readonly life: LifeSpec;
  /** Scenario that `check` drives, path relative to the bench's folder. */
  readonly duty: string | undefined;
  readonly controller: ControllerSpec | undefined;
  readonly record: RecordSpec;
  /** All signals that the file's declarations give rise to, in the order of the file. */
  readonly signals: readonly SignalInfo[];
  /** Remarks: not wrong, worth a look. */
  readonly remarks: readonly Problem[];
  /** The files as read, names relative to the bench's folder: what a recording carries. */
  readonly sources: readonly SourceText[];
}

/** Past these a run is `not valid`. */
export interface Budgets {
  /** 99th percentile and worst lateness of a tick, s. */
  readonly lateness: number;
  readonly worstLateness: number;
  /** Overrun ticks, as a share of all. */
  readonly overruns: number;
  /** Drift of the bench against wall time, s. */
  readonly drift: number;
  /** Lost, late and malformed frames, as a share of those due. */
  readonly lostFrames: number;
  /** Residual of energy as a share of the energy turned over, and of oil as a share of the oil. */
  readonly energyResidual: number;
  readonly oilResidual: number;
}

export interface Ambient {
  /** K */ readonly temperature: number;
  /** Pa */ readonly pressure: number;
}

export interface InstrumentSpec {
  readonly name: string;
  readonly kind: InstrumentKind;
  readonly parameters: Readonly<Record<string, number>>;
  /** Input to signal path; an optional input that is not connected is absent. */
  readonly inputs: Readonly<Record<string, string>>;
  /** Output to the path of the command that it drives. */
  readonly drives: Readonly<Record<string, string>>;
  readonly where: Position;
}

/** A true signal with the settings that the watch compares it to in every tick. */
export interface WatchedSignal {
  readonly path: string;
  readonly unit: string;
  readonly limits: readonly WatchedLimit[];
  /** The relief valve that protects this pressure: its cracking pressure, Pa absolute. */
  readonly relief?: { readonly valve: string; readonly setting: number };
  /** Warn from this share below the relief setting (as gauge pressure). */
  readonly vicinity: number;
  /** Warn when the setting will be reached within this time at the present rate, s. */
  readonly lookAhead: number;
}
export interface WatchedLimit {
  readonly level: WatchLevel;
  readonly side: 'above' | 'below';
  /** SI; pressures absolute. */
  readonly setting: number;
  readonly meaning: string;
  /** `highLine.maximumAllowable` or `watch`: where the setting comes from. */
  readonly from: string;
}

/** The bench's life as far as the file fixes it; times in ticks. */
export interface LifeSpec {
  readonly supply: boolean;
  readonly key: boolean;
  /** Ticks before tick 0 in which the clock runs and the plant stands at rest. */
  readonly preRoll: number;
  /** Ticks from the start of the pre-roll in which time-outs of the controller do not count. */
  readonly bootWindow: number;
  /** What the controller sees. In the warm-up of a live run, before the pre-roll, its links are not open: silence. */
  readonly frames: { readonly preRoll: Frames; readonly afterRun: Frames };
  /** Ticks that the bench goes on behind the end of a run, however it ended, with the key off. */
  readonly afterRun: number;
  /** What the bench does with the controller between runs: from the beginning of the pre-roll, and of the after-run. */
  readonly reset: { readonly before: readonly ResetStep[]; readonly after: readonly ResetStep[] };
  /** A hand bench: hands in a run do not spoil it. */
  readonly hands: boolean;
}
export interface ControllerSpec {
  /** A module in the loop thread, or a command started as a process; relative to the bench's folder. */
  readonly module: string | undefined;
  readonly command: string | undefined;
  /** Ticks per lockstep period. */
  readonly period: number;
  /** Wall-clock limit for an answer in lockstep, s. */
  readonly patience: number;
}

export interface RecordSpec {
  /** Patterns of the signals to record in every row, as the file has them; `*` for all. */
  readonly patterns: readonly string[];
  /** What they match among `BenchSpec.signals`, in that order. */
  readonly signals: readonly string[];
  /** Paths whose peaks the summary names. */
  readonly peaks: readonly string[];
}
