import type { EnergyPart } from './energy-parts.js';
import type { Severity } from './judge/formula.js';
import type { RequirementVerdict } from './judge/result.js';
import type { CodeReport } from './realtime/code-watch.js';
import type { TimingSummary } from './realtime/timing-record.js';
import type { Invalidity, RunVerdict } from './verdict.js';
import type { WatchWarning } from './watch-log.js';
import type { PressureSettings } from './watch-settings.js';

/**
 * What a run says at its end: the object that `run --json` prints and the recording's end carries. Plain JSON, SI,
 * pressures absolute; durations in `timing` and `stages` in µs. `null`: not measured in this run.
 */
export interface RunSummary {
  readonly bench: string;
  readonly scenario: string;
  readonly pace: 'live' | 'fast';
  readonly seed: number;
  readonly software: string;

  readonly verdict: RunVerdict;
  readonly valid: boolean;
  readonly exitCode: number;
  /** The verdict in one sentence. */
  readonly verdictText: string;
  /** Why the run is not valid. */
  readonly reasons: readonly Invalidity[];
  readonly ending: 'complete' | 'stopped' | 'broken';
  /** Hands that acted on the run, one sentence each; also where the bench allows them. */
  readonly hands?: readonly string[];
  readonly requirements: readonly RunRequirement[];
  /** Requirements of the bench that the scenario does not ask, with the reason. */
  readonly waived: Readonly<Record<string, string>>;

  /** Simulated time, and what was planned, s. */
  readonly simulated: number;
  readonly planned: number;
  /** Simulated time over wall time of the counted ticks. */
  readonly realTimeFactor: number;
  readonly timing: RunTiming;
  /** s, by part: loading the loop thread's modules, building the bench, dry run, taking links and rights, pre-roll. */
  readonly startUp: {
    readonly load?: number;
    readonly build: number;
    readonly warmUp: number;
    readonly attach?: number;
    readonly preRoll?: number;
    readonly total: number;
    /** Ticks of the dry run, processor time of one of its last, s, and whether that had settled. */
    readonly dryTicks?: number;
    readonly dryTick?: number;
    readonly settled?: boolean;
  };
  /** Whether the code of the loop stayed what it was at the first counted tick; absent at fast pace. */
  readonly code?: CodeReport;
  readonly scheduling: { readonly policy: string; readonly words: readonly string[] };
  /** Processor time in the counted ticks: of the loop thread, and of all threads of the process, s. */
  readonly processor: { readonly loop: number; readonly all: number };
  readonly stages: readonly {
    readonly stage: string;
    readonly p50: number;
    readonly p99: number;
    readonly max: number;
  }[];

  /** Largest value by path: Pa for pressures. */
  readonly peaks: Readonly<Record<string, number>>;
  /** Settings of the watched pressures by path, Pa. */
  readonly settings: Readonly<Record<string, PressureSettings>>;
  readonly warnings: readonly WatchWarning[];

  readonly ledger: RunLedger;
  readonly energies: readonly RunEnergy[];
  /** By element, for the picture of energy. */
  readonly energyParts: readonly EnergyPart[];
  /** How well the driver followed the drive; null or absent when there was none to follow. */
  readonly drive?: DriveQuality | null;
  /** Burnt over the run; null without an engine. */
  readonly fuel: { readonly mass: number; readonly energy: number } | null;
  /** Steps that the solver's safety net refined, and results that it replaced. */
  readonly solver: { readonly refined: number; readonly replaced: number };

  readonly links: readonly RunLink[];
  readonly messages: readonly RunMessage[];
  /** Faults that the scenario set, in order; their ticks stand among the events. */
  readonly faults: readonly {
    readonly path: string;
    readonly value: number;
    readonly unit: string;
    readonly step: string;
  }[];
  /** Hash of the whole state after the last tick. */
  readonly stateHash: string;
  /** Path of the recording; null when nothing was recorded. */
  readonly recording: string | null;
  /** Ticks that the recording misses. */
  readonly rowsLost: number;
}

export interface RunTiming extends TimingSummary {
  /** False at fast pace: `period`, `lateness`, `overruns` and `drift` are 0 then. */
  readonly measured: boolean;
  /** Garbage collections of the loop thread in the counted ticks, and the growth of its heap, bytes a tick. */
  readonly collections: number;
  readonly heapGrowth: number;
}

export interface RunRequirement {
  readonly id: string;
  readonly text: string;
  readonly severity: Severity;
  readonly verdict: RequirementVerdict;
  /** null where nothing was asked of the run. */
  readonly margin: number | null;
  readonly unit: string;
  /** Time that decided it, s; null where none did. */
  readonly at: number | null;
  /** How often its trigger came; null without one. */
  readonly triggers: number | null;
  /** The run ended before it was decided. */
  readonly open: boolean;
  /** The run may pass though it was not exercised. */
  readonly optional: boolean;
}

export interface RunLedger {
  /** Energy that the balance leaves over, as a share of the turnover. */
  readonly energyResidual: number;
  /** Oil that the balance leaves over, as a share of the oil. */
  readonly oilResidual: number;
  /** Largest energy that passed through any one branch, J. */
  readonly turnover: number;
  /** The bounds of the bench. */
  readonly energyBound: number;
  readonly oilBound: number;
}

/** An energy for people: `recovered`, `returned`, ... */
export interface RunEnergy {
  readonly key: string;
  readonly about: string;
  /** J */
  readonly value: number;
}

/** After SAE J2951, 40 CFR 1037.555 and 40 CFR 600.109-08; ratings in percent, null where the drive asks nothing. */
export interface DriveQuality {
  readonly energyRating: number | null;
  readonly distanceRating: number | null;
  readonly energyEconomyRating: number | null;
  readonly absoluteSpeedChangeRating: number | null;
  readonly inertialWorkRating: number | null;
  /** m/s */
  readonly rootMeanSquareSpeedError: number;
  readonly regression: {
    readonly slope: number;
    /** m/s */
    readonly intercept: number;
    readonly standardError: number;
    readonly determination: number;
    /** What of the regression is not accepted; empty: all is. */
    readonly faults: readonly string[];
  };
  /** s */
  readonly outside: readonly { readonly from: number; readonly until: number }[];
}

export interface RunMessage {
  readonly link: string;
  readonly message: string;
  readonly direction: 'sent' | 'received';
  readonly count: number;
  /** By its cycle; null where it has none. */
  readonly due: number | null;
  readonly lost: number;
  readonly late: number;
  readonly malformed: number;
  readonly timeOuts: number;
}

export interface RunLink {
  readonly name: string;
  readonly received: number;
  readonly sent: number;
  readonly lost: number;
  readonly late: number;
  /** Malformed, with a wrong checksum, length or map. */
  readonly malformed: number;
  readonly timeOuts: number;
  /** Share of the used messages that answer the tick just before; null when none was used, and on CAN. */
  readonly oneStepShare: number | null;
}
