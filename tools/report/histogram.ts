import { formatNumber } from '../../configs/units.js';
import type { ReportedDuration } from './data.js';
import { escaped, ticksOf } from './text.js';

const width = 720;
const height = 128;
const left = 44;
const bottom = 24;
const bars = 96;

/** Durations over a logarithmic axis, counts too: one late tick among a million still shows. */
export function histogramSvg(measure: ReportedDuration): string {
  const filled = measure.buckets.filter((bucket) => bucket.count > 0);
  if (filled.length === 0) return `<p>${escaped(measure.name)}: nothing recorded.</p>`;
  const least = Math.max(0.1, Math.min(...filled.map((bucket) => Math.max(bucket.from, 0.1))));
  const most = Math.max(...filled.map((bucket) => bucket.to), measure.budget ?? 0, least * 1.05);
  const low = Math.log10(least) - 0.01;
  const high = Math.log10(most) + 0.03 * (Math.log10(most) - low) + 0.001;
  const x = (duration: number) =>
    left + ((Math.log10(Math.max(duration, 10 ** low)) - low) / (high - low)) * (width - left - 8);
  const counts = new Float64Array(bars);
  for (const { from, to, count } of filled) {
    const place = (duration: number) =>
      Math.min(
        bars - 1,
        Math.max(0, Math.floor(((Math.log10(Math.max(duration, 10 ** low)) - low) / (high - low)) * bars)),
      );
    // A bucket wider than a bar is spread over all that it covers.
    const begin = place(from);
    const end = Math.max(begin, place(to * (1 - 1e-9)));
    for (let i = begin; i <= end; i += 1) counts[i]! += count / (end - begin + 1);
  }
  const greatest = Math.max(...counts);
  const ceiling = Math.max(1, Math.ceil(Math.log10(greatest + 1)));
  const base = height - bottom;
  const y = (count: number) => base - (Math.log10(count + 1) / ceiling) * (base - 10);
  const parts: string[] = [];
  for (let power = 0; power <= ceiling; power += 1) {
    const at = y(10 ** power - (power === 0 ? 1 : 0)).toFixed(1);
    parts.push(
      `<path class="grid" d="M${left} ${at}H${width - 8}"/><text class="axis" x="${left - 5}" y="${Number(at) + 3.5}" text-anchor="end">${power === 0 ? 0 : formatNumber(10 ** power)}</text>`,
    );
  }
  for (const duration of axisDurations(10 ** low, 10 ** high)) {
    const at = x(duration).toFixed(1);
    parts.push(
      `<path class="grid" d="M${at} 8V${base}"/><text class="axis" x="${at}" y="${base + 14}" text-anchor="middle">${durationText(duration)}</text>`,
    );
  }
  const wide = (width - left - 8) / bars;
  for (let i = 0; i < bars; i += 1) {
    if (counts[i] === 0) continue;
    const top = y(counts[i]!);
    parts.push(
      `<rect class="bar" x="${(left + i * wide).toFixed(1)}" y="${top.toFixed(1)}" width="${(wide - 0.8).toFixed(1)}" height="${(base - top).toFixed(1)}"/>`,
    );
  }
  if (measure.budget !== undefined) {
    const at = x(measure.budget);
    const anchor = at > width * 0.7 ? 'end' : 'start';
    parts.push(
      `<path class="setting" d="M${at.toFixed(1)} 6V${base}"/><text class="settingText" x="${(at + (anchor === 'start' ? 4 : -4)).toFixed(1)}" y="14" text-anchor="${anchor}">budget ${durationText(measure.budget)}</text>`,
    );
  }
  return `<svg class="histogram" viewBox="0 0 ${width} ${height}" role="img" aria-label="Histogram of ${escaped(measure.name)}">${parts.join('')}</svg>`;
}

/** Powers of ten over a wide axis, round numbers over one of less than a power and a half. */
function axisDurations(least: number, most: number): number[] {
  if (most / least < 30) return ticksOf(least, most, 6);
  const found: number[] = [];
  for (let power = Math.ceil(Math.log10(least)); 10 ** power <= most; power += 1) found.push(10 ** power);
  return found;
}

/** µs as people say it. */
export function durationText(microseconds: number): string {
  if (microseconds >= 1e6) return `${formatNumber(microseconds / 1e6, 3)} s`;
  if (microseconds >= 1e3) return `${formatNumber(microseconds / 1e3, 3)} ms`;
  return `${formatNumber(microseconds, 3)} µs`;
}
