import { computed, effect, signal } from '@preact/signals';
import type { PressureFacts, WarningStatus } from '../../live/source.js';
import { askHistory, onReset, stale, status, subject, tick } from './connection.js';
import { beat, newest, pulse, rangeOf } from './values.js';

/** Tones of the page, quiet to loud; each has its colour, its pattern and its shape. */
export type Tone = 'fine' | 'low' | 'near' | 'passing' | 'above' | 'severe' | 'unknown';
export interface LevelLook {
  readonly tone: Tone;
  readonly rank: number;
  /** Short enough for letters a twentieth of the window high. */
  readonly words: string;
  readonly shape: string;
}
const looks: Record<string, LevelLook> = {
  'near relief': { tone: 'near', rank: 2, words: 'Near relief', shape: '▲' },
  'relief passing': { tone: 'passing', rank: 4, words: 'Relief passing', shape: '◆' },
  'above maximum': { tone: 'above', rank: 5, words: 'Above PS', shape: '■' },
  'above 1.1 maximum': { tone: 'severe', rank: 6, words: 'Above 1.1 PS', shape: '✖' },
  'below precharge': { tone: 'low', rank: 3, words: 'Below precharge', shape: '▼' },
  'below least inlet': { tone: 'low', rank: 3, words: 'Inlet too low', shape: '▼' },
  'case pressure': { tone: 'passing', rank: 4, words: 'Case pressure', shape: '◆' },
};
const bySeverity: Record<string, LevelLook> = {
  note: { tone: 'fine', rank: 0, words: '', shape: '●' },
  warning: { tone: 'near', rank: 2, words: '', shape: '▲' },
  alarm: { tone: 'passing', rank: 4, words: '', shape: '◆' },
  error: { tone: 'above', rank: 5, words: '', shape: '■' },
};
export const fine: LevelLook = { tone: 'fine', rank: 0, words: 'Within settings', shape: '●' };
const unknown: LevelLook = { tone: 'unknown', rank: 7, words: 'Not up to date', shape: '?' };

export function lookOf(warning: WarningStatus): LevelLook {
  return (
    looks[warning.level] ?? {
      ...bySeverity[warning.severity],
      words: warning.level.charAt(0).toUpperCase() + warning.level.slice(1),
    }
  );
}

/** Words of a look in the middle of a sentence: PS stays PS. */
export function midSentence({ words }: LevelLook): string {
  return words.charAt(0).toLowerCase() + words.slice(1);
}

/** The most severe warning that is active; if none, that waits for an acknowledgement. */
export function worst(warnings: readonly WarningStatus[]): WarningStatus | undefined {
  let best: WarningStatus | undefined;
  const weight = (warning: WarningStatus) => (warning.active ? 100 : 0) + lookOf(warning).rank;
  for (const warning of warnings) if (best === undefined || weight(warning) > weight(best)) best = warning;
  return best;
}
/** Warnings of pressures only: what the large letters speak of. */
export const pressureWarnings = computed(() =>
  (status.value?.warnings ?? []).filter((warning) => warning.unit === 'Pa'),
);

export const banner = computed<{ look: LevelLook; warning: WarningStatus | undefined; past: boolean }>(() => {
  if (stale.value !== undefined || status.value === undefined)
    return { look: unknown, warning: undefined, past: false };
  const warning = worst(pressureWarnings.value);
  if (warning === undefined) return { look: fine, warning: undefined, past: false };
  return warning.active ? { look: lookOf(warning), warning, past: false } : { look: fine, warning, past: true };
});

export function nameOfPath(path: string): string {
  return subject.value?.bench.pressures.find((pressure) => pressure.path === path)?.name ?? path;
}

/** Peaks since the page met the bench or since they were reset. */
export const peaks = signal<ReadonlyMap<string, number>>(new Map());
const rates = new Map<string, { ticks: number[]; values: number[] }>();

export function resetPeaks(): void {
  peaks.value = new Map();
}
effect(() => {
  pulse.value;
  const now = tick.peek();
  let changed: Map<string, number> | undefined;
  for (const { path } of subject.peek()?.bench.pressures ?? []) {
    const high = rangeOf(path)[1];
    if (high > ((changed ?? peaks.peek()).get(path) ?? Number.NEGATIVE_INFINITY))
      (changed ??= new Map(peaks.peek())).set(path, high);
    let rate = rates.get(path);
    if (rate === undefined) rates.set(path, (rate = { ticks: [], values: [] }));
    const value = newest(path);
    if (Number.isFinite(value) && now !== rate.ticks.at(-1)) {
      rate.ticks.push(now);
      rate.values.push(value);
      if (rate.ticks.length > 20) {
        rate.ticks.shift();
        rate.values.shift();
      }
    }
  }
  if (changed !== undefined) peaks.value = changed;
});
onReset(() => {
  rates.clear();
  peaks.value = new Map();
  const known = subject.peek();
  const pressures = known?.bench.pressures ?? [];
  const indices = pressures.map(({ path }) => known?.index.get(path)).filter((at) => at !== undefined);
  if (indices.length === 0 || known?.recording !== undefined) return;
  // peaks of what the bench still remembers
  void askHistory(indices, 0, 2 ** 40, 1)
    .then((history) => {
      const bins = history.ticks.length;
      const found = new Map(peaks.peek());
      pressures.forEach(({ path }, i) => {
        for (let bin = 0; bin < bins; bin += 1) {
          const value = history.most[i * bins + bin];
          if (value > (found.get(path) ?? Number.NEGATIVE_INFINITY)) found.set(path, value);
        }
      });
      peaks.value = found;
    })
    .catch(() => undefined);
});

/**
 * Seconds until the relief setting at the present rate, undefined when it falls, stands, or needs more than a minute.
 * The watch's own prediction where it is recorded; else a straight line (least squares) through the last 0.8 s.
 */
export function timeToRelief(pressure: PressureFacts): number | undefined {
  beat.value;
  if (pressure.relief === undefined) return undefined;
  const value = newest(pressure.path);
  if (!(value < pressure.relief)) return undefined;
  let seconds: number;
  if (pressure.timeToRelief !== undefined) seconds = newest(pressure.timeToRelief);
  else {
    const rate = rates.get(pressure.path);
    const step = subject.value?.bench.step ?? 0.001;
    if (rate === undefined || rate.ticks.length < 8) return undefined;
    const n = rate.ticks.length;
    const meanTick = rate.ticks.reduce((a, b) => a + b, 0) / n;
    const meanValue = rate.values.reduce((a, b) => a + b, 0) / n;
    let top = 0;
    let bottom = 0;
    for (let i = 0; i < n; i += 1) {
      top += (rate.ticks[i] - meanTick) * (rate.values[i] - meanValue);
      bottom += (rate.ticks[i] - meanTick) ** 2;
    }
    const slope = top / bottom / step;
    if (!(slope > 0)) return undefined;
    seconds = (pressure.relief - value) / slope;
  }
  return seconds >= 0 && seconds < 60 ? seconds : undefined;
}
