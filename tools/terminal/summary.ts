import type { RunSummary } from '../../runtime/run-summary.js';
import type { Invalidity } from '../../runtime/verdict.js';
import { watchLevelWords, watchSeverity } from '../../runtime/watch-levels.js';
import type { WatchWarning } from '../../runtime/watch-log.js';
import { driveSentence } from '../report/drive-trace.js';
import { show, showClock, showEnergy, showMicroseconds, showShare, showTime } from './show.js';
import { cautionLines } from './start-up.js';
import { draw, type Line, type Style, span, type Tone } from './style.js';
import { left, right, wrap } from './text.js';

const verdictTone: Readonly<Record<RunSummary['verdict'], Tone>> = {
  pass: 'good',
  fail: 'alarm',
  'not exercised': 'warning',
  'not valid': 'alarm',
};
/** Peaks and warnings beyond these are in the recording and in `--json`. */
const most = 12;

/** What a run says at its end, for people. `derive`: the command that derives it again. Ends with a line end. */
export function renderSummary(summary: RunSummary, columns: number, style: Style, derive?: string): string {
  const lines: Line[] = [
    ...verdictLines(summary, columns),
    ...requirementLines(summary, columns),
    ...(summary.drive ? field('drive', columns, driveSentence(summary.drive)) : []),
    [],
    ...field('run', columns, runText(summary)),
    ...timingLines(summary, columns),
    ...linkLines(summary, columns),
    [],
    ...peakLines(summary),
    ...warningLines(summary.warnings, columns),
    [],
    ...energyLines(summary, columns),
    ...ledgerLines(summary, columns),
    [],
  ];
  const text = (some: readonly Line[], room: number) => some.map((line) => `${draw(line, room, style)}\n`).join('');
  // Never folded: these are there to be copied.
  const whole = text(recordingLines(summary, derive), Number.POSITIVE_INFINITY);
  return text(lines, columns) + whole + text([[], ...cautionLines(columns)], columns);
}

const indent = 12;

function field(name: string, columns: number, text: string, tone: Tone = 'plain'): Line[] {
  return wrap(text, Math.max(20, columns - indent)).map((line, i) => [
    span(left(i === 0 ? name : '', indent), 'dim'),
    span(line, tone),
  ]);
}

function verdictLines(summary: RunSummary, columns: number): Line[] {
  const head: Line = [
    span(left('verdict', indent), 'dim'),
    span(summary.verdict.toUpperCase(), verdictTone[summary.verdict]),
    span(`  ${summary.bench}, ${summary.scenario}`),
  ];
  return [
    head,
    ...field('', columns, summary.verdictText),
    ...summary.reasons.flatMap((reason) => field('', columns, reasonText(reason))),
  ];
}

/** `lateness, 99th percentile, is past its bound: 412 µs, bound 250 µs` */
function reasonText({ what, value, bound, unit }: Invalidity): string {
  const told = (number: number) =>
    unit === undefined || unit === '1'
      ? String(Number(number.toPrecision(3)))
      : unit === 's'
        ? showMicroseconds(number * 1e6)
        : show(number, unit);
  const compared = value === undefined ? '' : `: ${told(value)}${bound === undefined ? '' : `, bound ${told(bound)}`}`;
  return `- ${what}${compared}`;
}

function requirementLines(summary: RunSummary, columns: number): Line[] {
  const urgency = ['fail', 'undecided', 'not exercised', 'pass'];
  const sorted = [...summary.requirements].sort((a, b) => urgency.indexOf(a.verdict) - urgency.indexOf(b.verdict));
  const lines = sorted.slice(0, most).flatMap(({ id, text, verdict, margin, unit }) => {
    const room = margin === null ? '' : `, margin ${showMargin(margin, unit)}`;
    const tone: Tone = verdict === 'fail' ? 'alarm' : 'plain';
    return field('', columns, `- ${id} ${verdict}${room}: ${text}`, tone);
  });
  if (sorted.length <= most) return lines;
  return [
    ...lines,
    ...field('', columns, `- and ${sorted.length - most} more that hold, in \`--json\` and the report`),
  ];
}

/** Margins of pressures and temperatures are differences. */
function showMargin(margin: number, unit: string): string {
  if (unit === 'Pa') return `${Number((margin * 1e-5).toPrecision(4))} bar`;
  if (unit === 'K') return `${Number(margin.toPrecision(4))} K`;
  return show(margin, unit);
}

function runText(summary: RunSummary): string {
  const { pace, simulated, planned, realTimeFactor, seed } = summary;
  const length = simulated < planned ? `${showClock(simulated)} of ${showClock(planned)}` : showClock(simulated);
  const speed =
    pace === 'live' ? 'in real time' : `at ${realTimeFactor.toFixed(realTimeFactor < 10 ? 1 : 0)} times real time`;
  const { loop, all } = summary.processor;
  return `${length} ${speed}, seed ${seed}; processor time ${loop.toFixed(2)} s in the loop, ${all.toFixed(2)} s in all`;
}

function timingLines(summary: RunSummary, columns: number): Line[] {
  const { timing, scheduling } = summary;
  if (!timing.measured) return field('timing', columns, 'fast pace: nothing waits for a clock');
  const durations = (name: string, of: { p50: number; p99: number; p999: number; max: number }): Line => [
    span(left('', indent)),
    span(left(name, 10), 'dim'),
    ...[of.p50, of.p99, of.p999, of.max].map((time) => span(right(showMicroseconds(time), 11))),
  ];
  return [
    [
      span(left('timing', indent), 'dim'),
      span(left('', 10)),
      ...['half', '99 %', '99.9 %', 'at most'].map((name) => span(right(name, 11), 'dim')),
    ],
    durations('lateness', timing.lateness),
    durations('step', timing.step),
    durations('period', timing.period),
    ...field(
      '',
      columns,
      `overruns ${timing.overruns}, drift ${showTime(timing.drift)}, garbage collections ${timing.collections}, heap growth ${Number(timing.heapGrowth.toPrecision(2))} B a tick, ${scheduling.policy}`,
    ),
  ];
}

function linkLines(summary: RunSummary, columns: number): Line[] {
  return summary.links.flatMap(({ name, received, sent, lost, late, malformed, timeOuts, oneStepShare }) => {
    const next =
      oneStepShare === null ? '' : `, ${(100 * oneStepShare).toFixed(2)} % of the replies used in the next step`;
    return field(
      'controller',
      columns,
      `${name}: ${received} messages taken, ${sent} sent; lost ${lost}, late ${late}, malformed ${malformed}, time-outs ${timeOuts}${next}`,
    );
  });
}

/** Pressures first, each against what it has to stay below. */
function peakLines(summary: RunSummary): Line[] {
  const pressures = Object.entries(summary.peaks).filter(([path]) => summary.settings[path] !== undefined);
  if (pressures.length === 0) return [];
  const number = (value: number | undefined) => (value === undefined ? '' : show(value, 'Pa').replace(' bar(g)', ''));
  const row = (name: string, cells: readonly string[], first: string, tone: Tone): Line => [
    span(left(first, indent), 'dim'),
    span(left(name, 28), tone),
    ...cells.map((cell) => span(right(cell, 10), tone)),
  ];
  return [
    row('bar(g)', ['peak', 'relief', 'PS', 'of relief'], 'peaks', 'dim'),
    ...pressures.slice(0, most).map(([path, peak]) => {
      const { relief, maximumAllowable } = summary.settings[path];
      const share = relief === undefined ? '' : `${((100 * (peak - gaugeZero)) / (relief - gaugeZero)).toFixed(0)} %`;
      return row(path, [number(peak), number(relief), number(maximumAllowable), share], '', 'plain');
    }),
  ];
}
const gaugeZero = 101325;

function warningLines(warnings: readonly WatchWarning[], columns: number): Line[] {
  if (warnings.length === 0) return field('warnings', columns, 'none');
  const shown = warnings.slice(0, most);
  const lines = shown.flatMap((one, i) => {
    const end = one.until === null ? 'to the end' : `to ${one.until.toFixed(3)} s`;
    const times = one.times > 1 ? `, ${one.times} times` : '';
    const text = `${one.path} ${watchLevelWords[one.level]}, ${one.since.toFixed(3)} s ${end}${times}: peak ${show(one.peak, one.unit)}, setting ${show(one.setting, one.unit)}`;
    const tone: Tone = watchSeverity(one.level) === 'alarm' ? 'alarm' : 'plain';
    const meaning = one.meaning === '' ? [] : field('', columns, `  ${one.meaning}`, 'dim');
    return [...field(i === 0 ? 'warnings' : '', columns, text, tone), ...meaning];
  });
  return warnings.length > most
    ? [...lines, ...field('', columns, `and ${warnings.length - most} more in the recording`)]
    : lines;
}

function energyLines(summary: RunSummary, columns: number): Line[] {
  const parts = summary.energies.map(({ about, value }) => `${about} ${showEnergy(value)}`);
  if (summary.fuel !== null)
    parts.push(`fuel ${(1000 * summary.fuel.mass).toFixed(0)} g (${showEnergy(summary.fuel.energy)})`);
  return parts.length === 0 ? [] : field('energy', columns, parts.join(', '));
}

function ledgerLines(summary: RunSummary, columns: number): Line[] {
  const { energyResidual, oilResidual, turnover, energyBound, oilBound } = summary.ledger;
  const energy = `energy closes to ${showShare(energyResidual)} of the ${showEnergy(turnover)} turned over (bound ${showShare(energyBound)})`;
  const oil = `oil to ${showShare(oilResidual)} of the oil (bound ${showShare(oilBound)})`;
  const fine = energyResidual <= energyBound && oilResidual <= oilBound;
  return field('balance', columns, `${fine ? '' : 'PAST ITS BOUND: '}${energy}, ${oil}`, fine ? 'plain' : 'alarm');
}

function recordingLines(summary: RunSummary, derive: string | undefined): Line[] {
  const row = (name: string, text: string): Line => [span(left(name, indent), 'dim'), span(text)];
  const lost = summary.rowsLost > 0 ? `; ${summary.rowsLost} ticks are missing in it` : '';
  return [
    row('recording', summary.recording === null ? 'none' : `${summary.recording}${lost}`),
    ...(summary.recording === null ? [] : [row('again with', derive ?? `oilspring rederive ${summary.recording}`)]),
    row('state', `${summary.stateHash} after ${summary.simulated} s`),
  ];
}
