import type { Section } from './section.js';
import { formatNumber, formatQuantity } from './units.js';

export interface TicksAsked {
  readonly required?: boolean;
  /** In ticks. */
  readonly least?: number;
  /** False: rounded to the nearest tick instead of refused. */
  readonly exact?: boolean;
}

/** A time in ticks; a problem when the step does not divide it. */
export function checkedTicks(section: Section, key: string, step: number, asked: TicksAsked = {}): number | undefined {
  const time = section.quantity(
    key,
    { unit: 's', least: (asked.least ?? 0) * step },
    { required: asked.required ?? false },
  );
  if (time === undefined) return undefined;
  const ticks = toTicks(time, step);
  if (ticks !== undefined) return ticks;
  if (asked.exact === false) return Math.round(time / step);
  const below = Math.floor(time / step);
  return section.fail(
    key,
    'not a multiple of the step',
    `use ${inMilliseconds(below * step)} or ${inMilliseconds((below + 1) * step)}`,
    {
      value: section.text(key) ?? formatQuantity(time, 's'),
      bound: `step ${inMilliseconds(step)}`,
    },
  );
}

/** Whole ticks in a time, or undefined when the step does not divide it (to rounding). */
export function toTicks(time: number, step: number): number | undefined {
  const ticks = Math.round(time / step);
  return Math.abs(time - ticks * step) <= 1e-9 * Math.max(step, Math.abs(time)) ? ticks : undefined;
}

function inMilliseconds(time: number): string {
  return `${formatNumber(time * 1000)} ms`;
}
