import { formatQuantity, tradeUnit } from '../../configs/units.js';
import type { ElementKind, ParameterDeclaration } from '../../runtime/contract.js';

/** One element as a page of Markdown, from its declaration. */
export function elementSheet(kind: ElementKind): string {
  const lines = [`## ${kind.kind}`, '', `${kind.about}. A ${kind.role}.`, '', `Law: ${kind.source}.`];
  if (kind.valid !== undefined) lines.push('', `Valid: ${kind.valid}.`);
  section(
    lines,
    'Ports',
    ['name', 'kind'],
    Object.entries(kind.ports).map(([name, type]) => [
      name,
      type + (kind.optionalPorts?.includes(name) ? ' (may stay open)' : ''),
    ]),
  );
  section(
    lines,
    'Parameters',
    ['name', 'unit', 'default', 'allowed', 'usual', 'what it is'],
    Object.entries(kind.parameters).map(parameterRow),
  );
  section(
    lines,
    'At the start',
    ['name', 'unit', 'default', 'allowed', 'usual', 'what it is'],
    Object.entries(kind.starts).map(parameterRow),
  );
  section(
    lines,
    'Commands',
    ['name', 'unit', 'at rest', 'range', 'what it is'],
    Object.entries(kind.commands).map(([name, one]) => [
      name,
      one.unit,
      number(one.rest),
      bounds(one.least, one.most),
      one.about + (one.fault ? ' (fault)' : ''),
    ]),
  );
  section(
    lines,
    'States',
    ['name', 'unit', 'what it is'],
    [...Object.entries(kind.states), ...Object.entries(kind.memory)].map(([name, one]) => [name, one.unit, one.about]),
  );
  section(
    lines,
    'Readings',
    ['name', 'unit', 'what it is'],
    Object.entries(kind.readings).map(([name, one]) => [name, one.unit, one.about]),
  );
  section(
    lines,
    'Watched',
    ['reading', 'level', 'setting', 'what it means'],
    kind.limits.map((limit) => [
      limit.reading,
      limit.level,
      `${limit.side} ${limit.share === undefined || limit.share === 1 ? '' : `${limit.share} x `}${limit.parameter}`,
      limit.meaning,
    ]),
  );
  return lines.join('\n');
}

function parameterRow([name, one]: [string, ParameterDeclaration]): string[] {
  const choices = one.choices ? one.choices.join(', ') : bounds(one.least, one.most, one);
  const usual = one.usual ? `${shown(one.usual[0], one)} .. ${shown(one.usual[1], one)}` : '';
  const usualDefault =
    one.default === undefined ? 'required' : one.choices ? (one.choices[one.default] ?? '') : shown(one.default, one);
  return [name, one.unit, usualDefault, choices, usual, one.about];
}

function section(lines: string[], title: string, head: readonly string[], rows: readonly (readonly string[])[]): void {
  if (rows.length === 0) return;
  lines.push('', `### ${title}`, '', `| ${head.join(' | ')} |`, `|${head.map(() => '---').join('|')}|`);
  for (const row of rows) lines.push(`| ${row.map((cell) => cell.replaceAll('|', '\\|')).join(' | ')} |`);
}

function bounds(least: number | undefined, most: number | undefined, one?: ParameterDeclaration): string {
  const side = (value: number | undefined) => (value === undefined ? '' : one ? shown(value, one) : number(value));
  return least === undefined && most === undefined ? '' : `${side(least)} .. ${side(most)}`;
}

function shown(value: number, one: ParameterDeclaration): string {
  try {
    return formatQuantity(value, tradeUnit(one.unit, one.difference ?? false), 4);
  } catch {
    return `${number(value)} ${one.unit}`;
  }
}

function number(value: number): string {
  return String(Number(value.toPrecision(6)));
}
