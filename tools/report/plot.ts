import { formatNumber } from '../../configs/units.js';
import type { ReportedPlot } from './data.js';
import { drawnSamples } from './decimate.js';
import { escaped, shownUnit, ticksOf, time } from './text.js';

/** Units of the drawing; it scales to the width of the page. */
export const frame = { width: 720, height: 194, left: 58, right: 146, top: 18, bottom: 22 } as const;
const inner = { width: frame.width - frame.left - frame.right, height: frame.height - frame.top - frame.bottom };
/** Different strokes as well as colours: a report may be printed in grey. */
const dashes = ['', '7 3', '2 3', '9 3 2 3', '4 2', '1 2'];

/** What the script needs to draw a stretch of the plot anew. */
export interface PlotSamples {
  readonly unit: string;
  readonly least: number;
  readonly greatest: number;
  readonly from: number;
  readonly to: number;
  readonly traces: readonly { readonly path: string; readonly t: readonly number[]; readonly y: readonly number[] }[];
}

/** SVG of one plot and the samples for zooming (at most about 4000 a trace, spikes kept). */
export function plotSvg(
  plot: ReportedPlot,
  step: number,
  number: number,
): { readonly svg: string; readonly samples: PlotSamples } {
  const unit = shownUnit(plot.unit, plot.difference);
  const length = plot.traces.reduce((most, trace) => Math.max(most, trace.values.length), 0);
  const from = plot.firstTick * step;
  const to = (plot.firstTick + Math.max(1, length - 1)) * step;
  const values = plot.traces.map((trace) => Array.from(trace.values, unit.from));
  const settings = plot.settings.map((setting) => ({ ...setting, value: unit.from(setting.value) }));
  let least = Infinity;
  let greatest = -Infinity;
  for (const all of values) {
    for (const value of all) {
      if (!Number.isFinite(value)) continue;
      if (value < least) least = value;
      if (value > greatest) greatest = value;
    }
  }
  // A setting far away would flatten the curve: it is then named at the edge instead.
  const reach = Math.max(greatest - least, Math.abs(greatest) * 1e-3, 1e-9);
  for (const { value } of settings) {
    if (value < least && least - value <= 3 * reach) least = value;
    if (value > greatest && value - greatest <= 3 * reach) greatest = value;
  }
  if (!(greatest >= least)) [least, greatest] = [0, 1];
  const air = Math.max((greatest - least) * 0.07, Math.abs(greatest) * 1e-4, 1e-9);
  least -= air;
  greatest += air;

  const x = (seconds: number) => frame.left + ((seconds - from) / (to - from)) * inner.width;
  const y = (value: number) => frame.top + (1 - (value - least) / (greatest - least)) * inner.height;
  const parts: string[] = [];
  for (const at of ticksOf(least, greatest, 5)) {
    parts.push(`<path class="grid" d="M${frame.left} ${y(at).toFixed(1)}h${inner.width}"/>`);
    parts.push(
      `<text class="axis" x="${frame.left - 6}" y="${(y(at) + 3.5).toFixed(1)}" text-anchor="end">${formatNumber(at, 6)}</text>`,
    );
  }
  const bottom = frame.top + inner.height;
  for (const at of ticksOf(from, to, 7)) {
    parts.push(`<path class="grid" d="M${x(at).toFixed(1)} ${frame.top}v${inner.height}"/>`);
    parts.push(
      `<text class="axis" x="${x(at).toFixed(1)}" y="${bottom + 14}" text-anchor="middle">${formatNumber(at, 7)}</text>`,
    );
  }
  parts.push(`<text class="axis" x="${frame.left + inner.width + 6}" y="${bottom + 14}">s</text>`);
  parts.push(`<text class="axis unit" x="${frame.left - 6}" y="9" text-anchor="end">${escaped(unit.text)}</text>`);

  const labels: { y: number; text: string; kind: string }[] = [];
  for (const { label, value } of settings) {
    const inside = value >= least && value <= greatest;
    const place = inside ? y(value) : value > greatest ? frame.top : bottom;
    const arrow = inside ? '' : value > greatest ? '↑ ' : '↓ ';
    if (inside) parts.push(`<path class="setting" d="M${frame.left} ${place.toFixed(1)}h${inner.width}"/>`);
    labels.push({ y: place, text: `${arrow}${label}`, kind: 'settingText' });
  }
  for (const { label, tick } of plot.marks) {
    const at = x(tick * step);
    if (!(at >= frame.left - 0.5 && at <= frame.left + inner.width + 0.5)) continue;
    const anchor = at > frame.left + inner.width * 0.7 ? 'end' : 'start';
    parts.push(`<path class="mark" d="M${at.toFixed(1)} ${frame.top}v${inner.height}"/>`);
    parts.push(
      `<text class="markText" x="${(at + (anchor === 'start' ? 4 : -4)).toFixed(1)}" y="${frame.top + 9}" text-anchor="${anchor}">${escaped(label)}</text>`,
    );
  }

  const lines = plot.traces.map((trace, i) => {
    const drawn = drawnSamples(values[i]!, inner.width);
    const path = drawn.map((index, n) => {
      const broken = n === 0 || gap(values[i]!, drawn[n - 1]!, index);
      return `${broken ? 'M' : 'L'}${x((plot.firstTick + index) * step).toFixed(1)} ${y(values[i]![index]!).toFixed(1)}`;
    });
    const last = drawn[drawn.length - 1];
    if (last !== undefined) labels.push({ y: y(values[i]![last]!), text: trace.path, kind: `name t${i % 6}` });
    return `<path class="trace t${i % 6}" stroke-dasharray="${dashes[i % 6]}" d="${path.join('')}"/>`;
  });
  spread(labels);
  for (const label of labels) {
    parts.push(
      `<text class="${label.kind}" x="${frame.left + inner.width + 6}" y="${(label.y + 3.5).toFixed(1)}">${escaped(fitted(label.text))}<title>${escaped(label.text)}</title></text>`,
    );
  }

  const described = `${plot.title}: ${plot.traces.map((trace) => trace.path).join(', ')} from ${time(plot.firstTick, step)} to ${to.toFixed(3)} s`;
  const svg =
    `<svg class="plot" data-plot="${number}" viewBox="0 0 ${frame.width} ${frame.height}" role="img" aria-label="${escaped(described)}">` +
    `<rect class="field" x="${frame.left}" y="${frame.top}" width="${inner.width}" height="${inner.height}"/>` +
    `${parts.join('')}<g class="traces">${lines.join('')}</g></svg>`;
  const traces = plot.traces.map((trace, i) => {
    const kept = drawnSamples(values[i]!, 1000);
    return {
      path: trace.path,
      t: kept.map((index) => round((plot.firstTick + index) * step)),
      y: kept.map((index) => round(values[i]![index]!)),
    };
  });
  return { svg, samples: { unit: unit.text, least, greatest, from, to, traces } };
}

/** Whether nothing but values that are no number stands between two samples that are not neighbours. */
function gap(values: readonly number[], before: number, after: number): boolean {
  for (let i = before + 1; i < after; i += 1) if (!Number.isFinite(values[i]!)) return true;
  return false;
}

function round(value: number): number {
  return Number(value.toPrecision(7));
}

function fitted(text: string): string {
  return text.length > 23 ? `${text.slice(0, 22)}…` : text;
}

/** Moves labels apart so that none covers another. */
function spread(labels: { y: number }[]): void {
  const apart = 11;
  labels.sort((a, b) => a.y - b.y);
  for (let i = 1; i < labels.length; i += 1) labels[i]!.y = Math.max(labels[i]!.y, labels[i - 1]!.y + apart);
  const over = labels.length > 0 ? labels[labels.length - 1]!.y - (frame.height - 6) : 0;
  if (over > 0)
    for (let i = labels.length - 1; i >= 0; i -= 1)
      labels[i]!.y = Math.min(labels[i]!.y, frame.height - 6 - apart * (labels.length - 1 - i));
}
