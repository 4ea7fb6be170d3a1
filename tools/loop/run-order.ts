import type { EnergyPart } from '../../runtime/energy-parts.js';
import type { RequirementResult } from '../../runtime/judge/result.js';
import type { CodeReport } from '../../runtime/realtime/code-watch.js';
import type { RingHandle } from '../../runtime/ring.js';
import type { ScriptSpec } from '../../runtime/script.js';
import type { BoardHandle } from '../../runtime/status-board.js';
import type { WatchWarning } from '../../runtime/watch-log.js';

/** What the host tells the loop thread to run: plain data, sent once. */
export interface RunOrder {
  /** The bench's files by path, the bench file first: exactly what the recording carries. */
  readonly sources: readonly { readonly path: string; readonly text: string }[];
  readonly script: ScriptSpec;
  readonly seed: number;
  readonly pace: 'live' | 'fast';
  /** Counted ticks. */
  readonly ticks: number;
  /** Folder of the bench on the disk, for a controller's module. */
  readonly folder: string;
  /**
   * Who answers: a module in the loop thread, a process over UDP (in lockstep at fast pace), or nobody.
   */
  readonly controller:
    | { readonly kind: 'module'; readonly file: string }
    | { readonly kind: 'udp' }
    | { readonly kind: 'none' };
  readonly ring: RingHandle;
  readonly control: SharedArrayBuffer;
  /** Where hands come from; undefined: none may act. */
  readonly hands: RingHandle | undefined;
  readonly timing: SharedArrayBuffer;
  /** Patterns of the paths recorded in every row; `*` stands for any run of letters. */
  readonly patterns: readonly string[];
  /** Paths whose largest values are kept. */
  readonly peaks: readonly string[];
  /** Measure each stage of the tick. */
  readonly profile: boolean;
  readonly core: number | undefined;
  /** When the host gave the order, ms since 1970. */
  readonly ordered: number;
}

/** What the loop thread says when the bench is built, before the first tick. */
export interface RunReady {
  readonly kind: 'ready';
  /** What is recorded, in the order of the rows. */
  readonly signals: readonly {
    readonly path: string;
    readonly unit: string;
    readonly about: string;
    readonly group: string;
  }[];
  /** Paths of all signals, in the order of `last`. */
  readonly paths: readonly string[];
  readonly events: {
    readonly kinds: readonly {
      readonly name: string;
      readonly severity: 'note' | 'warning' | 'alarm' | 'error';
      readonly text: string;
    }[];
    readonly subjects: readonly string[];
  };
  /** Names of what inputs come from: the links, then `hands`, then `life`. */
  readonly links: readonly string[];
  /** What a hand may take hold of, in the order of the numbers by which hands name it. */
  readonly hands: readonly { readonly path: string; readonly unit: string }[];
  readonly board: BoardHandle;
  readonly block: readonly string[];
  /** What the loop thread got of scheduling, in words. */
  readonly scheduling: readonly string[];
  readonly policy: string;
  /** s, by part. */
  readonly startUp: StartUp;
}

/** What happens before the first tick, s, by part. */
export interface StartUp {
  /** From the order to the loaded modules of the loop thread. */
  readonly load: number;
  readonly build: number;
  readonly warmUp: number;
  /** Links, scheduling, locked memory, a clean heap. */
  readonly attach: number;
  readonly preRoll: number;
  /** Ticks of the dry run, processor time of one of its last, s, and whether that had settled. */
  readonly dryTicks: number;
  readonly dryTick: number;
  readonly settled: boolean;
}

/** What it says at the end. */
export interface RunDone {
  readonly kind: 'done';
  readonly ticks: number;
  readonly stopped: boolean;
  readonly failure: string | null;
  readonly wall: number;
  readonly processor: number;
  readonly hash: string;
  readonly peaks: Readonly<Record<string, number>>;
  readonly ledger: {
    readonly energyResidual: number;
    readonly oilResidual: number;
    readonly turnover: number;
    readonly stuffs: Readonly<Record<string, number>>;
  };
  /** Whether the code of the loop stayed what it was at the first counted tick. */
  readonly code: CodeReport;
  readonly collections: number;
  readonly longestCollection: number;
  readonly heapGrowth: number;
  readonly refined: number;
  readonly replaced: number;
  readonly overflows: number;
  readonly dropped: number;
  readonly stages: readonly {
    readonly stage: string;
    readonly p50: number;
    readonly p99: number;
    readonly max: number;
  }[];
  /** Last values of all signals. */
  readonly last: Float64Array;
  readonly warnings: readonly WatchWarning[];
  readonly requirements: readonly RequirementResult[];
  readonly energy: readonly EnergyPart[];
  /** Speed that the driver was to follow and that it had, one value every `driveStride` ticks; null without a driver. */
  readonly drive: { readonly wanted: Float64Array; readonly had: Float64Array } | null;
}

export interface RunFailed {
  readonly kind: 'failed';
  readonly what: string;
  /** 2 for bad input, 5 for what could not be finished. */
  readonly code: number;
}
export type LoopMessage = RunReady | RunDone | RunFailed;
