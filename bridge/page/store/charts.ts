import { effect, signal } from '@preact/signals';
import type { ChartFacts } from '../../live/source.js';
import { subject, tick } from './connection.js';
import { read, write } from './preferences.js';

/** What all charts show: the newest `seconds`, or a range of ticks that stands still. */
export type ChartView =
  | { readonly live: true; readonly seconds: number }
  | { readonly live: false; readonly from: number; readonly to: number };
export const chartView = signal<ChartView>({ live: true, seconds: 30 });
/** Where the shared cursor stands, in ticks. */
export const cursorTick = signal<number | undefined>(undefined);
export const windows: readonly [number, string][] = [
  [10, '10 s'],
  [30, '30 s'],
  [120, '2 min'],
  [600, '10 min'],
  [1800, '30 min'],
];

function step(): number {
  return subject.peek()?.bench.step ?? 0.001;
}
/** First and last tick that the charts show. */
export function visibleRange(view: ChartView, now: number): [number, number] {
  if (!view.live) return [view.from, view.to];
  return [now - view.seconds / step(), now];
}
export function pause(): void {
  const [from, to] = visibleRange(chartView.peek(), tick.peek());
  chartView.value = { live: false, from: Math.max(0, Math.round(from)), to: Math.max(1, Math.round(to)) };
}
export function live(): void {
  const view = chartView.peek();
  const seconds = view.live ? view.seconds : (view.to - view.from) * step();
  const fitting = windows.find((entry) => entry[0] >= seconds * 0.99) ?? windows[windows.length - 1];
  chartView.value = { live: true, seconds: fitting[0] };
  cursorTick.value = undefined;
}
/** By `factor` about the middle, or the end while live. */
export function zoom(factor: number): void {
  const view = chartView.peek();
  if (view.live) {
    const at = windows.findIndex((entry) => entry[0] === view.seconds);
    const next = windows[Math.min(windows.length - 1, Math.max(0, at + (factor > 1 ? 1 : -1)))];
    chartView.value = { live: true, seconds: next[0] };
    return;
  }
  const middle = cursorTick.peek() ?? (view.from + view.to) / 2;
  const from = Math.max(0, Math.round(middle - (middle - view.from) * factor));
  const to = Math.round(middle + (view.to - middle) * factor);
  if (to - from >= 20) chartView.value = { live: false, from, to };
}
/** By a share of the visible width. */
export function move(share: number): void {
  const [from, to] = visibleRange(chartView.peek(), tick.peek());
  const by = Math.max(-from, Math.round((to - from) * share));
  chartView.value = { live: false, from: Math.round(from + by), to: Math.round(to + by) };
}

/** The charts that are shown, kept per bench in the browser. */
export const charts = signal<readonly ChartFacts[]>([]);
effect(() => {
  const bench = subject.value?.bench;
  if (bench === undefined) return;
  const kept = read(`charts.${bench.name}`);
  try {
    charts.value = kept === undefined ? bench.charts : (JSON.parse(kept) as ChartFacts[]);
  } catch {
    charts.value = bench.charts;
  }
  const recording = subject.value?.recording;
  chartView.value =
    recording === undefined
      ? { live: true, seconds: 30 }
      : { live: false, from: recording.firstTick, to: Math.max(recording.firstTick + 20, recording.lastTick) };
});
export function changeCharts(next: readonly ChartFacts[]): void {
  charts.value = next;
  const bench = subject.peek()?.bench;
  if (bench !== undefined) write(`charts.${bench.name}`, JSON.stringify(next));
}
