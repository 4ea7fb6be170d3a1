import type { SignalInfo } from '../../runtime/contract.js';
import type { EventKind } from '../../runtime/journal.js';

/**
 * What the host process offers the live view. The server (server.ts) knows nothing else of a bench: no ring, no
 * plant, no file. All values are SI, pressures absolute; a tick is the count of counted ticks from 0.
 */
export interface LiveSource {
  readonly bench: BenchFacts;
  /** The recorded signals, in the order of a row. */
  readonly signals: readonly SignalInfo[];
  readonly events: EventNames;
  /** Rows and events go to `sink` whenever the host drains its ring, from now on; the answer detaches it. */
  attach(sink: LiveSink): () => void;
  /** Everything that is not a signal, as of now. Called at most ten times a second. */
  status(): LiveStatus;
  /** Present only when the bench was started with control. Never throws: a refusal is an acknowledgement with ok false. */
  command?(command: HandCommand, hand: Hand): Promise<Acknowledgement>;
}

/** Takes what the host drained. The arrays belong to the caller and are read before the call returns. */
export interface LiveSink {
  /** `count` rows: ticks ascending, values row after row. Ticks may be missing where the ring dropped rows. */
  rows(ticks: Float64Array, values: Float32Array, count: number): void;
  event(event: LiveEvent): void;
}

/** One event of the journal; `kind` and `subject` index EventNames. */
export interface LiveEvent {
  readonly tick: number;
  readonly kind: number;
  readonly subject: number;
  readonly a: number;
  readonly b: number;
  readonly c: number;
}
export interface EventNames {
  readonly kinds: readonly EventKind[];
  readonly subjects: readonly string[];
}

/** What does not change while a bench runs. */
export interface BenchFacts {
  readonly name: string;
  readonly about: string;
  /** Tick length, s. */
  readonly step: number;
  /** Absolute ambient pressure that gauge pressures are shown against, Pa. */
  readonly ambientPressure: number;
  /** True where the data behind the bench are invented. */
  readonly invented: boolean;
  readonly elements: readonly ElementFacts[];
  readonly pressures: readonly PressureFacts[];
  readonly accumulators: readonly AccumulatorFacts[];
  readonly messages: readonly MessageFacts[];
  readonly scenario: ScenarioFacts;
  readonly requirements: readonly RequirementFacts[];
  /** Powers of the ledger, W, for the picture of energy flows. */
  readonly powers: readonly PowerFacts[];
  /** What hands may touch. Empty without control. */
  readonly hands: readonly HandFacts[];
  /** Charts to begin with: groups of signal paths. */
  readonly charts: readonly ChartFacts[];
}

export interface ElementFacts {
  readonly name: string;
  readonly kind: string;
  readonly role: 'store' | 'branch';
  readonly about: string;
  readonly ports: readonly PortFacts[];
  readonly parameters: readonly ParameterFacts[];
  /** Signal paths worth showing in the circuit, most telling first. */
  readonly shows: readonly string[];
  /** A branch's flow, positive from its first connected port to its second. */
  readonly flow?: string;
  /** A signal from 0 (closed, open clutch) to 1 (open, closed clutch), with the words for both ends. */
  readonly position?: { readonly path: string; readonly zero: string; readonly one: string };
  /** Fault inputs: in fault while the value differs from `rest`. */
  readonly faults: readonly { readonly path: string; readonly rest: number; readonly about: string }[];
}
export interface PortFacts {
  readonly name: string;
  readonly kind: string;
  /** Branches: what it is tied to. */
  readonly store?: string;
  readonly storePort?: string;
  readonly ratio?: number;
}
export interface ParameterFacts {
  readonly name: string;
  readonly value: number;
  readonly unit: string;
  readonly about: string;
}

/** A watched pressure node and its settings, Pa absolute. */
export interface PressureFacts {
  readonly name: string;
  readonly path: string;
  readonly precharge?: number;
  readonly workingLeast?: number;
  readonly workingMost?: number;
  /** Cracking pressure of the relief valve. */
  readonly relief?: number;
  /** Maximum allowable pressure, PS. */
  readonly maximumAllowable?: number;
  readonly leastInlet?: number;
  /** Top of the scale. */
  readonly scaleMost: number;
  /** Signal with the predicted time to relief, s, where the watch records it; else the page extrapolates. */
  readonly timeToRelief?: string;
}

export interface AccumulatorFacts {
  readonly name: string;
  /** Signal paths: gas pressure Pa, gas volume m3, gas temperature K. */
  readonly pressure: string;
  readonly volume: string;
  readonly temperature?: string;
  /** Pa absolute, K, m3 of gas at precharge. */
  readonly precharge: number;
  readonly prechargeTemperature: number;
  readonly gasVolume: number;
  readonly maximumAllowable?: number;
  /** Curves of the bench's own gas law; where absent the page draws ideal gas and says so. */
  readonly curves?: readonly {
    readonly name: string;
    readonly volume: readonly number[];
    readonly pressure: readonly number[];
  }[];
}

export interface MessageFacts {
  readonly name: string;
  readonly about: string;
  readonly link: string;
  /** Seen from the bench. */
  readonly direction: 'sent' | 'received';
  /** s */
  readonly period: number;
  /** Received: s without it after which the substitutes count. */
  readonly timeout?: number;
}
export interface ScenarioFacts {
  readonly name: string;
  readonly about: string;
  readonly steps: readonly { readonly name: string; readonly about: string; readonly at?: number }[];
}
export interface RequirementFacts {
  readonly name: string;
  readonly text: string;
  /** Unit of the margin, SI. */
  readonly unit: string;
  /** A margin that counts as comfortable: the full length of the bar. */
  readonly comfortable?: number;
}
export interface PowerFacts {
  readonly name: string;
  readonly path: string;
  readonly role: 'supply' | 'stored' | 'kept loss' | 'leaving loss' | 'residual';
}
export interface ChartFacts {
  readonly name: string;
  readonly paths: readonly string[];
}

/** Something a hand may set. */
export interface HandFacts {
  readonly path: string;
  readonly name: string;
  readonly kind: 'pedal' | 'gear' | 'valve' | 'displacement' | 'fault' | 'supply' | 'key';
  readonly unit: string;
  readonly least: number;
  readonly most: number;
  readonly rest: number;
  readonly increment?: number;
  /** Names for values. */
  readonly choices?: readonly { readonly name: string; readonly value: number }[];
  /** s after the last renewal at which the hand lets go; absent: it stays where it was put. */
  readonly deadMan?: number;
}

export interface LiveStatus {
  readonly run: RunStatus;
  readonly scenario: ScenarioStatus;
  readonly warnings: readonly WarningStatus[];
  readonly messages: readonly MessageStatus[];
  readonly timing: TimingStatus;
  readonly requirements: readonly RequirementStatus[];
}
export interface RunStatus {
  /** As the bench's life names it: `supply off`, `boot window`, `running`, `at rest`, `ended`, ... */
  readonly phase: string;
  readonly pace: 'live' | 'fast' | 'lockstep' | 'recording';
  readonly tick: number;
  /** Wall clock paired with `tick`, ms since 1970; 0 where unknown. */
  readonly wallClock: number;
  /** Why the run does not count; empty while it does. */
  readonly notValid: readonly string[];
  /** Hands that touched this run so far. */
  readonly hands: number;
  /** Rows that the ring to the host dropped. */
  readonly droppedRows: number;
}
export interface ScenarioStatus {
  readonly state: 'not started' | 'running' | 'held' | 'ended';
  /** Index into the facts' steps, -1 before the first. */
  readonly step: number;
  readonly sinceTick: number;
}
/** A warning of the watch; stays until it is acknowledged and its cause is gone. */
export interface WarningStatus {
  readonly identifier: number;
  /** Signal path. */
  readonly path: string;
  /** A level of the watch (WatchLevel). */
  readonly level: string;
  readonly severity: 'note' | 'warning' | 'alarm' | 'error';
  readonly unit: string;
  readonly setting: number;
  readonly peak: number;
  readonly sinceTick: number;
  readonly active: boolean;
  readonly acknowledged: boolean;
  /** What it would mean on a vehicle. */
  readonly meaning: string;
}
/** In the order of the facts' messages. */
export interface MessageStatus {
  /** s since the last; negative: never. */
  readonly age: number;
  /** 1/s, over the last second */
  readonly rate: number;
  readonly count: number;
  readonly lost: number;
  readonly late: number;
  readonly malformed: number;
  readonly timedOut: boolean;
}
export interface Histogram {
  /** Upper edges, s; the last bucket is open. */
  readonly edges: readonly number[];
  readonly counts: readonly number[];
  readonly most: number;
  /** s; past it a run does not count. 0: none. */
  readonly budget: number;
}
export interface TimingStatus {
  readonly lateness: Histogram;
  readonly stepTime: Histogram;
  readonly overruns: number;
  /** NaN while they are not known: a run counts them at its end. */
  readonly collections: number;
  /** Sum of re-phasings, s. */
  readonly drift: number;
}
/** In the order of the facts' requirements. */
export interface RequirementStatus {
  readonly verdict: 'holds so far' | 'violated' | 'not yet judged';
  /** Least margin so far, SI; NaN while not judged. */
  readonly margin: number;
  readonly atTick: number;
}

/** Everything that a hand can do; each goes into the record with its tick. */
export type HandCommand =
  | { readonly kind: 'set'; readonly path: string; readonly value: number }
  | { readonly kind: 'release'; readonly path: string; readonly reason: string }
  | { readonly kind: 'scenario'; readonly action: 'start' | 'hold' | 'continue' | 'end' }
  | { readonly kind: 'acknowledge'; readonly warning: number }
  | { readonly kind: 'note'; readonly text: string };

/** Who and when. `who` is what the person typed and proves nothing; `address` is the peer's. */
export interface Hand {
  readonly who: string;
  readonly address: string;
  /** ms since 1970, host clock. */
  readonly at: number;
}
export interface Acknowledgement {
  readonly ok: boolean;
  /** Tick at which it took effect, -1 when it did not. */
  readonly tick: number;
  readonly text: string;
}

/** The least and greatest value of signals over intervals of ticks. */
export interface History {
  /** First tick of each interval. */
  readonly ticks: Float64Array;
  /** Signal after signal, `ticks.length` values each; NaN where there is nothing. */
  readonly least: Float32Array;
  readonly most: Float32Array;
}

/** Recordings on disk, for looking back in the same page. The host adapts the recording reader to it. */
export interface RecordingShelf {
  list(): Promise<readonly RecordingEntry[]>;
  /** `name` is one that `list` gave: the server checks that. */
  open(name: string): Promise<RecordingView>;
}
export interface RecordingEntry {
  readonly name: string;
  readonly bench: string;
  readonly scenario: string;
  /** ms since 1970 */
  readonly startedAt: number;
  /** s */
  readonly length: number;
  readonly verdict: string;
}
export interface RecordingView {
  readonly bench: BenchFacts;
  readonly signals: readonly SignalInfo[];
  readonly events: EventNames;
  readonly firstTick: number;
  readonly lastTick: number;
  /** At most `bins` intervals over [from, to], none of which hides a one-tick spike. */
  history(signals: readonly number[], from: number, to: number, bins: number): Promise<History>;
  /** Events in [from, to], at most `most` of them, the newest. */
  eventsIn(from: number, to: number, most: number): Promise<readonly LiveEvent[]>;
  /** The status as it stood at `tick`. */
  statusAt(tick: number): Promise<LiveStatus>;
  close(): Promise<void>;
}
