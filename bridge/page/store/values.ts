import { signal } from '@preact/signals';
import { useEffect } from 'preact/hooks';
import type { Frame } from '../../live/wire.js';
import { floatsOf } from '../../live/wire.js';
import { askHistory, onFrame, onReset, send, subject, tick } from './connection.js';

/** Rises with every frame; reading it makes a component follow the display rate. */
export const pulse = signal(0);
/** Rises five times a second at most, for numbers that people read. */
export const beat = signal(0);

let last = new Float32Array(0);
let least = new Float32Array(0);
let most = new Float32Array(0);
let subscribed: number[] = [];
let subscription = 0;
/** Signals of the newest subscriptions. */
const orders = new Map<number, readonly number[]>();
const wanted = new Map<number, number>();
let scheduled = false;
let lastBeat = 0;

/** The newest value of a path, SI; NaN while unknown. */
export function newest(path: string | undefined): number {
  const at = path === undefined ? undefined : subject.value?.index.get(path);
  return at === undefined ? Number.NaN : last[at];
}
/** Least and greatest value in the newest frame. */
export function rangeOf(path: string): [number, number] {
  const at = subject.value?.index.get(path);
  return at === undefined ? [Number.NaN, Number.NaN] : [least[at], most[at]];
}
/**
 * The signals that a frame carries, in its order. A frame that was under way when the subscription changed still has the
 * order of the one before; undefined where that is no longer known.
 */
export function signalsOf(frame: Frame): readonly number[] | undefined {
  return orders.get(frame.subscription);
}

/** Has the paths sent for as long as the component shows. */
export function usePaths(paths: readonly (string | undefined)[]): void {
  const known = subject.value;
  const key = paths.join('\n');
  // the key stands for the paths
  useEffect(() => {
    const indices = paths
      .map((path) => (path === undefined ? undefined : known?.index.get(path)))
      .filter((at) => at !== undefined);
    for (const at of indices) wanted.set(at, (wanted.get(at) ?? 0) + 1);
    schedule();
    return () => {
      for (const at of indices) {
        const count = (wanted.get(at) ?? 1) - 1;
        if (count <= 0) wanted.delete(at);
        else wanted.set(at, count);
      }
      schedule();
    };
  }, [key, known]);
}

function schedule(): void {
  if (scheduled) return;
  scheduled = true;
  queueMicrotask(() => {
    scheduled = false;
    subscribe();
  });
}
function subscribe(): void {
  const size = subject.value?.signals.length ?? 0;
  subscribed = [...wanted.keys()].filter((at) => at < size).sort((a, b) => a - b);
  if (last.length !== size) {
    last = new Float32Array(size).fill(Number.NaN);
    least = last.slice();
    most = last.slice();
  }
  if (subject.value?.recording !== undefined) {
    showMoment(tick.value);
    return;
  }
  subscription += 1;
  orders.set(subscription, subscribed);
  orders.delete(subscription - 8);
  send({ type: 'subscribe', subscription, signals: subscribed });
}

/** Values of a recording at a tick, in place of a frame. */
export function showMoment(at: number): void {
  const signals = subscribed;
  if (signals.length === 0) return;
  const parts: number[][] = [];
  for (let i = 0; i < signals.length; i += 64) parts.push(signals.slice(i, i + 64));
  void Promise.all(
    parts.map(async (part) => {
      const history = await askHistory(part, at, at, 1);
      if (history.ticks.length === 0) return;
      part.forEach((index, i) => {
        const bins = history.ticks.length;
        least[index] = history.least[i * bins];
        most[index] = history.most[i * bins];
        last[index] = history.most[i * bins];
      });
    }),
  )
    .then(() => {
      pulse.value += 1;
      beat.value += 1;
    })
    .catch(() => undefined);
}

function take(frame: Frame): void {
  if (frame.subscription !== subscription) return;
  const lasts = floatsOf(frame.last);
  const lows = floatsOf(frame.least);
  const highs = floatsOf(frame.most);
  const bins = lasts.length === 0 ? 0 : lows.length / lasts.length;
  subscribed.forEach((at, i) => {
    last[at] = lasts[i];
    let low = Number.POSITIVE_INFINITY;
    let high = Number.NEGATIVE_INFINITY;
    for (let bin = i * bins; bin < (i + 1) * bins; bin += 1) {
      if (lows[bin] < low) low = lows[bin];
      if (highs[bin] > high) high = highs[bin];
    }
    least[at] = low;
    most[at] = high;
  });
  pulse.value += 1;
  const now = performance.now();
  if (now - lastBeat > 190) {
    lastBeat = now;
    beat.value += 1;
  }
}
onFrame(take);
onReset(() => {
  last.fill(Number.NaN);
  schedule();
});
