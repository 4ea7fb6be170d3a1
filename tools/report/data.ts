import type { Severity } from '../../runtime/judge/formula.js';
import type { RequirementVerdict } from '../../runtime/judge/result.js';
import type { RunJudgement } from '../../runtime/verdict.js';

/** All that a report of one run shows, as plain data. SI throughout, pressures absolute, times in ticks or s as said. */
export interface RunReportData {
  /** Name of the run. */
  readonly run: string;
  /** Wall-clock time at the start, ISO 8601. */
  readonly created: string;
  readonly bench: { readonly name: string; readonly files: readonly FileMark[] };
  readonly scenario: { readonly name: string; readonly file?: FileMark } | null;
  /** What the run was made with: `oilspring 0.1.0`, `Node 20.20.0`, controller and its version as far as known. */
  readonly software: readonly Fact[];
  readonly machine: readonly Fact[];
  readonly seed: number;
  /** Tick length, s. */
  readonly step: number;
  readonly ticks: number;
  readonly pace: 'live' | 'fast';
  readonly judgement: RunJudgement;
  readonly requirements: readonly ReportedRequirement[];
  readonly warnings: readonly ReportedWarning[];
  readonly plots: readonly ReportedPlot[];
  readonly events: readonly ReportedEvent[];
  /** Events beyond those listed. */
  readonly eventsLeftOut: number;
  readonly timing: ReportedTiming | null;
  /** How well the drive was followed; absent or empty when there was none. */
  readonly drive?: readonly Fact[];
  readonly bus: readonly ReportedMessage[];
  readonly energy: ReportedEnergy | null;
  readonly derive: { readonly command: string; readonly recording: string; readonly stateHash: string };
}

export interface Fact {
  readonly name: string;
  readonly value: string;
}
export interface FileMark {
  readonly path: string;
  /** SHA-256 of the text, hexadecimal. */
  readonly digest: string;
}

export interface ReportedRequirement {
  readonly id: string;
  readonly text: string;
  /** As judged, from the formula. */
  readonly formula: string;
  readonly severity: Severity;
  readonly source?: string;
  readonly link?: string;
  readonly verdict: RequirementVerdict;
  /** SI; infinite where nothing was asked. */
  readonly margin: number;
  readonly unit: string;
  /** -1: none. */
  readonly tick: number;
  /** undefined: it has no trigger. */
  readonly triggers?: number;
  readonly open: boolean;
}

export interface ReportedWarning {
  readonly path: string;
  readonly level: string;
  /** Ticks; `until` null: it lasted to the end. */
  readonly since: number;
  readonly until: number | null;
  readonly peak: number;
  readonly setting: number;
  readonly unit: string;
  readonly times: number;
  readonly acknowledged: boolean;
  readonly meaning: string;
}

/** One picture: signals of one unit over a stretch of the run. */
export interface ReportedPlot {
  /** What it is about: `least margin of HP-1`. Plots with the same title stand under one heading, one below the other. */
  readonly title: string;
  /** Ids or paths that lead here, for links from the tables. */
  readonly subject: string;
  readonly unit: string;
  /** Pressures and temperatures that are differences. */
  readonly difference: boolean;
  readonly firstTick: number;
  readonly traces: readonly { readonly path: string; readonly values: ArrayLike<number> }[];
  readonly settings: readonly { readonly label: string; readonly value: number }[];
  readonly marks: readonly { readonly label: string; readonly tick: number }[];
}

export interface ReportedEvent {
  readonly tick: number;
  readonly severity: 'note' | 'warning' | 'alarm' | 'error';
  readonly text: string;
}

export interface ReportedTiming {
  readonly measures: readonly ReportedDuration[];
  readonly overruns: number;
  /** s */
  readonly drift: number;
  readonly collections: number;
}
export interface ReportedDuration {
  readonly name: string;
  /** µs */
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
  /** µs; past it the run does not count. */
  readonly budget?: number;
  /** Buckets in order, µs; empty ones may be left out. */
  readonly buckets: readonly { readonly from: number; readonly to: number; readonly count: number }[];
}

export interface ReportedMessage {
  readonly link: string;
  readonly message: string;
  readonly direction: 'to the controller' | 'from the controller';
  readonly count: number;
  /** How many were due; undefined where that is not known. */
  readonly due?: number;
  readonly lost: number;
  readonly late: number;
  readonly malformed: number;
  readonly timeOuts: number;
}

/** Energy over the whole run, J. */
export interface ReportedEnergy {
  readonly parts: readonly ReportedEnergyPart[];
  /** What is left over when everything is added up, as a share of the energy turned over, and its bound. */
  readonly residual: number;
  readonly bound?: number;
  /** Relative. */
  readonly oilResidual?: number;
  readonly oilBound?: number;
}
export interface ReportedEnergyPart {
  readonly element: string;
  /** Entered here from outside; negative: left. */
  readonly supplied: number;
  /** Stored at the end less stored at the start. */
  readonly stored: number;
  /** Dissipated to the surroundings; what is kept as heat in the oil counts as stored. */
  readonly lost: number;
}

/** Stands in every report. */
export const caution =
  'oilspring is not a safety device. A real bench has its own relief valves, interlocks and emergency stop, independent of it. ' +
  'Work on pressurised hydraulics follows local codes and belongs to people who are licensed for it where a licence is asked for. ' +
  'Numbers in this report come from a simulation and are no approval of any hardware.';
