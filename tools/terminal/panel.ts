import { standardAtmosphere } from '../../configs/units.js';
import { watchLevelNames, watchLevels, watchSeverity } from '../../runtime/watch-levels.js';
import { bar, markNames, marksOf, scaleMost } from './bar.js';
import type { TerminalCharge, TerminalFrame, TerminalHeadline, TerminalLink, TerminalPressure } from './frame.js';
import { show, showClock, showIn, showMicroseconds, showTime } from './show.js';
import { draw, glyphsOf, type Line, type Span, type Style, span, type Tone } from './style.js';
import { left, right, width } from './text.js';

export interface PanelSize {
  readonly columns: number;
  /** Lines that it may take. */
  readonly rows: number;
}

/** Below this the words go short; bars are at least `leastBar` or not drawn. */
const leastBar = 8;
const mostBar = 48;
const labelColumn = 18;
const valueColumn = 13;
const wordColumns = { wide: 24, narrow: 18 } as const;
const detailColumn = 38;

/** The whole panel as lines no wider than the terminal and no more than fit. The most important stay. */
export function renderPanel(frame: TerminalFrame, size: PanelSize, style: Style): string[] {
  const columns = Math.max(1, size.columns);
  let lines: Line[] = [];
  for (const room of rooms) {
    lines = compose(frame, columns, style, room);
    if (lines.length <= size.rows) break;
  }
  return lines.slice(0, Math.max(0, size.rows)).map((line) => draw(line, columns, style));
}

/** From everything to the least, until it fits. */
interface Room {
  readonly blank: boolean;
  readonly legend: boolean;
  readonly charges: 'bars' | 'line' | 'none';
  readonly headlineRows: number;
  readonly pressures: number;
}
const rooms: readonly Room[] = [
  { blank: true, legend: true, charges: 'bars', headlineRows: 3, pressures: 8 },
  { blank: true, legend: true, charges: 'line', headlineRows: 3, pressures: 6 },
  { blank: true, legend: false, charges: 'line', headlineRows: 2, pressures: 5 },
  { blank: false, legend: false, charges: 'line', headlineRows: 2, pressures: 5 },
  { blank: false, legend: false, charges: 'line', headlineRows: 1, pressures: 3 },
  { blank: false, legend: false, charges: 'none', headlineRows: 1, pressures: 2 },
  { blank: false, legend: false, charges: 'none', headlineRows: 1, pressures: 1 },
];

function compose(frame: TerminalFrame, columns: number, style: Style, room: Room): Line[] {
  const gap: Line[] = room.blank ? [[]] : [];
  const pressures = byUrgency(frame.pressures, room.pressures);
  const hidden = frame.pressures.length - pressures.length;
  const bars = [
    ...pressures.map((one) => pressureLine(one, columns, style)),
    ...(hidden > 0 ? [[span(`${hidden} more`, 'dim')]] : []),
    ...(room.charges === 'bars' ? frame.charges.map((one) => chargeLine(one, columns, style)) : []),
    ...(room.charges === 'line' ? chargeSummary(frame.charges) : []),
    ...(room.legend ? legend(frame.pressures) : []),
  ];
  const heads = headlineLines(frame.headlines, columns).slice(0, room.headlineRows);
  return [
    titleLine(frame, columns, style),
    progressLine(frame, columns, style),
    ...stepLines(frame, columns),
    ...(heads.length > 0 ? [...gap, ...heads] : []),
    ...(bars.length > 0 ? [...gap, ...bars] : []),
    ...gap,
    ...frame.links.map((link) => linkLine(link, frame.links.length > 1, columns)),
    ...timingLines(frame, columns),
    warningLine(frame),
  ];
}

/** Two texts, one at each end. The left one gives way. */
function spread(leftText: string, rightText: string, columns: number, leftTone: Tone, rightTone: Tone): Line {
  const room = columns - width(rightText) - 2;
  if (room < 8) return [span(leftText, leftTone)];
  return [span(left(leftText, room), leftTone), span('  '), span(rightText, rightTone)];
}

function titleLine(frame: TerminalFrame, columns: number, style: Style): Line {
  const { dot } = glyphsOf(style);
  return spread(
    `${frame.bench} ${dot} ${frame.scenario}`,
    `${frame.pace} ${dot} ${frame.phase}`,
    columns,
    'strong',
    'plain',
  );
}

function progressLine(frame: TerminalFrame, columns: number, style: Style): Line {
  const elapsed = Math.min(Math.max(frame.elapsed, 0), Math.max(frame.total, 0));
  const share = frame.total > 0 ? elapsed / frame.total : 0;
  const before = `${showClock(elapsed)} `;
  const after = ` ${showClock(frame.total)}  ${right(`${Math.floor(share * 100 + 1e-9)} %`, 5)}`;
  const room = columns - width(before) - width(after);
  if (room < leastBar) return [span(`${showClock(elapsed)} of ${showClock(frame.total)}`)];
  return [span(before), ...bar(share, 0, 1, room, [], 'plain', style), span(after)];
}

function stepLines(frame: TerminalFrame, columns: number): Line[] {
  const { step } = frame;
  if (step === undefined || step.of === 0) return [];
  const now = `step ${step.done} of ${step.of}${step.name === undefined ? '' : `  ${step.name}`}`;
  const next = step.next && `next in ${Math.max(0, step.next.in).toFixed(1)} s: ${step.next.name}`;
  if (next === undefined || width(next) > 0.55 * columns) return [[span(now)]];
  return [spread(now, next, columns, 'plain', 'dim')];
}

/** A grid: numbers stay in their places. */
function headlineLines(headlines: readonly TerminalHeadline[], columns: number): Line[] {
  const gap = 3;
  const across = Math.max(1, Math.floor((columns + gap) / (24 + gap)));
  const cell = Math.min(34, Math.floor((columns + gap) / across) - gap);
  const lines: Line[] = [];
  for (let i = 0; i < headlines.length; i += across) {
    const line = headlines.slice(i, i + across).flatMap(({ label, value, unit }, j) => {
      const text = showIn(value, unit);
      const room = Math.max(0, cell - width(text) - 1);
      return [span(`${j > 0 ? ' '.repeat(gap) : ''}${left(label, room)} `, 'dim'), span(right(text, cell - room - 1))];
    });
    lines.push(line);
  }
  return lines;
}

/**
 * The most urgent of them, then those with most settings, in the order of the bench. Readings beside an element's own
 * pressure (`highAccumulator.gasPressure`) come last.
 */
function byUrgency(pressures: readonly TerminalPressure[], most: number): TerminalPressure[] {
  const weight = ({ level, label, settings }: TerminalPressure) =>
    100 * level + Object.keys(settings).length - (label.includes('.') ? 50 : 0);
  const chosen = [...pressures].sort((a, b) => weight(b) - weight(a)).slice(0, most);
  return pressures.filter((one) => chosen.includes(one));
}

function pressureLine(one: TerminalPressure, columns: number, style: Style): Line {
  const { words, tone } = pressureWords(one);
  const value = show(one.value, 'Pa');
  const detail = columns >= 110 ? pressureDetail(one) : '';
  const most = scaleMost(one.settings, one.peak, standardAtmosphere);
  const drawn = (room: number) => bar(one.value, standardAtmosphere, most, room, marksOf(one.settings), tone, style);
  return barLine(one.label, value, drawn, words, tone, detail, columns);
}

/** Label, value, bar, words, and on wide terminals the numbers behind the marks. */
function barLine(
  label: string,
  value: string,
  drawn: (room: number) => Line,
  words: string,
  tone: Tone,
  detail: string,
  columns: number,
): Line {
  const wordColumn = columns < 76 ? wordColumns.narrow : wordColumns.wide;
  const labelled = left(label, Math.min(labelColumn, Math.max(6, columns - valueColumn - wordColumn - 1)));
  const room = columns - width(labelled) - valueColumn - wordColumn - 3 - (columns >= 110 ? detailColumn : 0);
  const middle = room >= leastBar ? [span('  '), ...drawn(Math.min(room, mostBar)), span(' ')] : [span(' ')];
  return [
    span(labelled, 'dim'),
    span(right(value, valueColumn)),
    ...middle,
    span(detail === '' ? words : left(words, wordColumn), tone),
    ...(detail === '' ? [] : [span(detail, 'dim')]),
  ];
}

function pressureDetail(one: TerminalPressure): string {
  const { relief, maximumAllowable } = one.settings;
  const number = (value: number) => show(value, 'Pa').replace(' bar(g)', '');
  return [
    ` peak ${right(number(one.peak), 6)}`,
    relief === undefined ? '' : `relief ${right(number(relief), 6)}`,
    maximumAllowable === undefined ? '' : `PS ${right(number(maximumAllowable), 6)}`,
  ]
    .filter((text) => text !== '')
    .join('  ');
}

/** Short words for a row; the scrolling notes say them in full. */
const shortWords: Readonly<Record<string, string>> = {
  'above maximum': 'above PS',
  'above 1.1 maximum': 'above 1.1 PS',
  'case pressure': 'case pressure high',
};

function pressureWords(one: TerminalPressure): { words: string; tone: Tone } {
  const name = watchLevelNames[one.level] ?? '';
  if (one.level === 0 || name === '') return { words: '  in range', tone: 'plain' };
  const tone = toneOf(one.level);
  const time = one.timeToRelief;
  const soon = name === 'near relief' && time !== undefined && time > 0 && time < 10 ? `, in ${showTime(time)}` : '';
  return { words: `${tone === 'alarm' ? '!!' : '! '}${shortWords[name] ?? name}${soon}`, tone };
}

function toneOf(level: number): Tone {
  return watchSeverity(watchLevels[level - 1]) === 'alarm' ? 'alarm' : 'warning';
}

function chargeLine(one: TerminalCharge, columns: number, style: Style): Line {
  const value = `${showIn(one.charge, '%')} full`;
  const drawn = (room: number) => bar(one.charge, 0, 1, room, [], 'plain', style);
  const gas = one.gasTemperature === undefined ? '' : `  gas ${showIn(one.gasTemperature, 'degC')}`;
  return barLine(one.label, value, drawn, gas, 'plain', '', columns);
}

function chargeSummary(charges: readonly TerminalCharge[]): Line[] {
  if (charges.length === 0) return [];
  const parts = charges.map(({ label, charge, gasTemperature }) => {
    const gas = gasTemperature === undefined ? '' : `, gas ${showIn(gasTemperature, 'degC')}`;
    return `${label} ${showIn(charge, '%')} full${gas}`;
  });
  return [[span(left('charge', labelColumn + 1), 'dim'), span(parts.join('   '))]];
}

function legend(pressures: readonly TerminalPressure[]): Line[] {
  const used = markNames.filter(([key]) => pressures.some((one) => one.settings[key] !== undefined));
  if (used.length === 0) return [];
  return [[span(used.map(([, letter, name]) => `${letter} ${name}`).join('   '), 'dim')]];
}

const nameColumn = 13;
const field = (name: string) => span(left(name, nameColumn), 'dim');

/** As many of the parts as fit whole, the first always. */
function fitting(name: string, parts: readonly Span[], columns: number): Line {
  const line: Span[] = [field(name)];
  let used = nameColumn;
  for (const [i, part] of parts.entries()) {
    const gap = i === 0 ? 0 : 3;
    used += gap + width(part.text);
    if (i > 0 && used > columns) break;
    line.push(span(' '.repeat(gap)), part);
  }
  return line;
}

function linkLine(link: TerminalLink, named: boolean, columns: number): Line {
  const name = named ? [span(link.name, 'dim')] : [];
  if (link.state === 'not heard yet')
    return fitting('controller', [span('not heard yet', 'warning'), ...name], columns);
  const alive = link.state === 'alive';
  const parts = [
    span(alive ? 'alive   ' : '! silent', alive ? 'good' : 'warning'),
    span(`last message ${right(showTime(link.age), 7)} ago`),
    span(`missed ${link.missed}`, link.missed > 0 ? 'warning' : 'plain'),
    span(`${right(link.rate.toFixed(0), 4)} a second`),
    ...name,
  ];
  return fitting('controller', parts, columns);
}

function timingLines(frame: TerminalFrame, columns: number): Line[] {
  const { timing } = frame;
  if (frame.pace === 'fast') {
    const factor = frame.realTimeFactor;
    return factor === undefined
      ? []
      : [[field('pace'), span(`${factor.toFixed(factor < 10 ? 1 : 0)} times real time`)]];
  }
  if (timing === undefined) return [];
  const { lateness, step, overruns } = timing;
  const parts = [
    span(`99 % late by ${right(showMicroseconds(lateness.p99), 7)} at most`),
    span(`overruns ${overruns}`, overruns > 0 ? 'warning' : 'plain'),
    span(`worst ${right(showMicroseconds(lateness.max), 7)}`),
    span(`step ${right(showMicroseconds(step.p50), 6)}`),
  ];
  return [fitting('timing', parts, columns)];
}

function warningLine(frame: TerminalFrame): Line {
  const { open, present } = frame.warnings;
  if (open === 0) return [field('warnings'), span('none')];
  const over = open - present.length;
  const said = over > 0 ? `${over} over, not acknowledged` : '';
  if (present.length === 0) return [field('warnings'), span(said)];
  return [field('warnings'), span(present.join(', '), 'warning'), span(said === '' ? '' : `   ${said}`)];
}

/** The same in one line, where nothing can be drawn again. */
export function renderPlain(frame: TerminalFrame): string {
  const level = (one: TerminalPressure) => (one.level === 0 ? '' : ` (${watchLevelNames[one.level] ?? one.level})`);
  const parts = [
    `${showClock(frame.elapsed)} of ${showClock(frame.total)}`,
    ...(frame.phase === 'running' ? [] : [frame.phase]),
    ...frame.headlines.slice(0, 1).map(({ label, value, unit }) => `${label} ${showIn(value, unit)}`),
    ...byUrgency(frame.pressures, 2).map((one) => `${one.label} ${show(one.value, 'Pa')}${level(one)}`),
    ...frame.links.map((link) => `controller ${link.state}`),
    ...(frame.timing && frame.pace === 'live'
      ? [`late by ${showMicroseconds(frame.timing.lateness.p99)} at 99 %`, `overruns ${frame.timing.overruns}`]
      : []),
    ...(frame.pace === 'fast' && frame.realTimeFactor !== undefined
      ? [`${frame.realTimeFactor.toFixed(0)} times real time`]
      : []),
    ...(frame.warnings.open > 0 ? [`warnings ${frame.warnings.open}`] : []),
  ];
  return parts.join(' | ');
}
