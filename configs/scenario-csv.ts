import { type Expected, parseQuantity, QuantityError, shown } from './quantity.js';
import type { Section } from './section.js';
import { suggestion } from './section.js';
import { toTicks } from './ticks.js';
import { fits, parseUnit, type Unit } from './units.js';

/** Most points of one trace. */
const most = 500_000;

/**
 * A measured trace from a CSV file: comma or semicolon between the cells, a heading with the unit of each column in
 * square brackets, `time [s],speed [km/h]`. Lines that begin with # are remarks. Points in SI, times in ticks, rising.
 * Adds what is wrong to the section's problems, with the line of the CSV file.
 */
export function csvPoints(
  section: Section,
  key: string,
  file: string,
  text: string,
  asked: {
    readonly time: string;
    readonly column: string | undefined;
    readonly expected: Expected;
    readonly step: number | undefined;
  },
): [number, number][] {
  const fail = (line: number, column: number, what: string, remedy: string, value?: string) =>
    section.problems.add(
      { file, line, column },
      section.inner(key),
      what,
      remedy,
      value === undefined ? {} : { value: shown(value) },
    );
  const lines = text.split(/\r?\n/);
  const points: [number, number][] = [];
  let head: { time: Column; value: Column; separator: string } | undefined;
  for (let i = 0; i < lines.length; i += 1) {
    const line = lines[i]!;
    if (line.trim() === '' || line.startsWith('#')) continue;
    if (!head) {
      const separator = line.includes(';') ? ';' : ',';
      const columns = line.split(separator).map(columnOf);
      const names = columns.map((one) => one.name);
      const time = columns.find((one) => one.name === asked.time);
      const rest = columns.filter((one) => one !== time);
      const value =
        asked.column === undefined
          ? rest.length === 1
            ? rest[0]
            : undefined
          : columns.find((one) => one.name === asked.column);
      if (!time) fail(i + 1, 1, `no column \`${asked.time}\``, suggestion(asked.time, names));
      if (!value)
        fail(
          i + 1,
          1,
          asked.column === undefined ? 'more than one column that could be meant' : `no column \`${asked.column}\``,
          `name it with column:, one of ${names.join(', ')}`,
        );
      if (!time || !value) return [];
      for (const [one, unit] of [
        [time, asked.step === undefined ? 'm' : 's'],
        [value, asked.expected.unit],
      ] as const) {
        if (!one.unit) {
          fail(i + 1, 1, `column ${one.name} says no unit`, `write it in brackets: ${one.name} [${unit}]`);
          return [];
        }
        if (!fits(one.unit, parseUnit(unit))) {
          fail(i + 1, 1, `column ${one.name} in ${one.text} where ${unit} belongs`, 'give it a unit of that kind');
          return [];
        }
      }
      head = {
        time: { ...time, at: columns.indexOf(time) },
        value: { ...value, at: columns.indexOf(value) },
        separator,
      };
      continue;
    }
    const cells = line.split(head.separator);
    const time = cell(cells, head.time, { unit: asked.step === undefined ? 'm' : 's' });
    const value = cell(cells, head.value, asked.expected);
    if (typeof time === 'string' || typeof value === 'string') {
      fail(i + 1, 1, typeof time === 'string' ? time : String(value), 'write plain numbers', line);
      return points;
    }
    const at = asked.step === undefined ? time : (toTicks(time, asked.step) ?? Math.round(time / asked.step));
    if (points.length > 0 && at <= points.at(-1)![0]) {
      fail(i + 1, 1, 'time does not rise', 'sort the lines by time, one line for each time', line);
      return points;
    }
    if (points.length === most) {
      fail(i + 1, 1, `more than ${most} lines`, 'thin it out');
      return points;
    }
    points.push([at, value]);
  }
  if (points.length === 0) fail(1, 1, 'no line with values', 'write a heading and lines below it');
  return points;
}

interface Column {
  readonly name: string;
  readonly text: string;
  readonly unit: Unit | undefined;
  readonly at?: number;
}

function columnOf(heading: string): Column {
  const match = /^\s*"?([^[\]"]*?)\s*(?:\[([^\]]*)\])?"?\s*$/.exec(heading);
  const text = match?.[2] ?? '';
  let unit: Unit | undefined;
  try {
    unit = text === '' ? undefined : parseUnit(text);
  } catch {
    unit = undefined;
  }
  return { name: match?.[1] ?? heading.trim(), text, unit };
}

function cell(cells: readonly string[], column: Column, expected: Expected): number | string {
  const text = cells[column.at!]?.trim().replace(/^"|"$/g, '');
  if (text === undefined || !/^[-+]?(\d+\.?\d*|\.\d+)([eE][-+]?\d+)?$/.test(text))
    return `no number in column ${column.name}`;
  try {
    return parseQuantity(`${text} ${column.text}`, expected).value;
  } catch (error) {
    if (error instanceof QuantityError) return `${column.name}: ${error.what}`;
    throw error;
  }
}
