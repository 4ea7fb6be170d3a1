import type { PressureSettings } from '../../runtime/watch-settings.js';

/** What the terminal shows at one moment. Plain data, values in SI, pressures absolute, times in s. */
export interface TerminalFrame {
  readonly bench: string;
  readonly scenario: string;
  readonly pace: 'live' | 'fast';
  /** `building`, `warming up`, `pre-roll`, `running`, `finished`, ... */
  readonly phase: string;
  /** Simulated time since tick 0, and its planned end. */
  readonly elapsed: number;
  readonly total: number;
  /** Simulated over wall time so far; shown at fast pace. */
  readonly realTimeFactor?: number;
  readonly step?: TerminalStep;
  readonly headlines: readonly TerminalHeadline[];
  readonly pressures: readonly TerminalPressure[];
  readonly charges: readonly TerminalCharge[];
  readonly links: readonly TerminalLink[];
  readonly timing?: TerminalTiming;
  /** Number of warnings that are present or not acknowledged, and what those that are present say. */
  readonly warnings: { readonly open: number; readonly present: readonly string[] };
}

export interface TerminalStep {
  /** Steps done, and all. */
  readonly done: number;
  readonly of: number;
  /** The last one, and the next with the time until then. */
  readonly name?: string;
  readonly next?: { readonly name: string; readonly in: number };
}

export interface TerminalHeadline {
  readonly label: string;
  readonly value: number;
  /** The unit to show it in: `km/h`, `%`, `1`. */
  readonly unit: string;
}

export interface TerminalPressure {
  readonly label: string;
  readonly value: number;
  readonly peak: number;
  /** Number of the level of the watch: see watchLevelNames. */
  readonly level: number;
  readonly timeToRelief?: number;
  readonly settings: PressureSettings;
}

/** An accumulator. */
export interface TerminalCharge {
  readonly label: string;
  /** 0 .. 1 */
  readonly charge: number;
  readonly gasTemperature?: number;
}

export interface TerminalLink {
  readonly name: string;
  readonly state: 'not heard yet' | 'alive' | 'silent';
  /** Since the oldest of the last messages. */
  readonly age: number;
  /** Messages taken per second, over about the last second. */
  readonly rate: number;
  /** Lost, late, malformed. */
  readonly missed: number;
}

export interface TerminalTiming {
  /** µs */
  readonly lateness: { readonly p50: number; readonly p99: number; readonly max: number };
  readonly step: { readonly p50: number; readonly p99: number; readonly max: number };
  readonly overruns: number;
  /** s */
  readonly drift: number;
}

/** Something that happened: scrolls by above the rest. */
export interface TerminalNote {
  /** s since tick 0 */
  readonly time: number;
  readonly severity: 'note' | 'warning' | 'alarm' | 'error';
  readonly text: string;
}
