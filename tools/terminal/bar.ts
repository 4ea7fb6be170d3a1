import type { PressureSettings } from '../../runtime/watch-settings.js';
import { glyphsOf, type Span, type Style, span, type Tone } from './style.js';

export interface Mark {
  readonly at: number;
  readonly letter: string;
}

/** What each letter on a pressure's bar stands for; a later one covers an earlier one in the same place. */
export const markNames: readonly (readonly [keyof PressureSettings, string, string])[] = [
  ['precharge', 'p', 'precharge'],
  ['leastInlet', 'i', 'least inlet'],
  ['casePressure', 'c', 'case limit'],
  ['relief', 'R', 'relief'],
  ['maximumAllowable', 'M', 'maximum (PS)'],
];

export function marksOf(settings: PressureSettings): Mark[] {
  return markNames.flatMap(([key, letter]) => {
    const at = settings[key];
    return at === undefined ? [] : [{ at, letter }];
  });
}

/** Top of a pressure's scale, Pa: room above the highest setting. */
export function scaleMost(settings: PressureSettings, peak: number, ambient: number): number {
  const highest = Math.max(...Object.values(settings).filter(Number.isFinite), ambient);
  const gauge = highest - ambient;
  return gauge > 0 ? ambient + 1.12 * gauge : Math.max(peak, ambient + 1e5);
}

/** A value from `least` to `most` as a line of `columns` characters with letters at the marks. */
export function bar(
  value: number,
  least: number,
  most: number,
  columns: number,
  marks: readonly Mark[],
  tone: Tone,
  style: Style,
): Span[] {
  if (columns <= 0) return [];
  const { full, rest, end } = glyphsOf(style);
  const place = (at: number) => ((at - least) / (most - least)) * columns;
  const reach = Math.min(columns, Math.max(0, Number.isFinite(value) ? place(value) : 0));
  const cells: { text: string; on: boolean; mark: boolean }[] = [];
  for (let i = 0; i < columns; i += 1) {
    const share = reach - i;
    const text = share >= 0.75 ? full : share >= 0.25 ? end : rest;
    cells.push({ text, on: share >= 0.25, mark: false });
  }
  for (const { at, letter } of marks) {
    if (!Number.isFinite(place(at))) continue;
    const i = Math.min(columns - 1, Math.max(0, Math.floor(place(at))));
    cells[i] = { text: letter, on: cells[i].on, mark: true };
  }
  const spans: Span[] = [];
  for (const cell of cells) {
    const of: Tone = cell.mark ? 'strong' : cell.on ? tone : 'dim';
    const last = spans.at(-1);
    if (last !== undefined && last.tone === of) spans[spans.length - 1] = span(last.text + cell.text, of);
    else spans.push(span(cell.text, of));
  }
  return spans;
}
