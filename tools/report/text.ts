import { formatNumber, fromSI, parseUnit, tradeUnit } from '../../configs/units.js';

/** Text for HTML and XML, element content and quoted attributes alike; characters that XML 1.0 forbids become U+FFFD. */
export function escaped(text: string): string {
  return text
    .replace(/(?![\t\n\r])\p{Cc}|\p{Cs}|[\ufffe\uffff]/gu, '\ufffd')
    .replace(/&/g, '&amp;')
    .replace(/</g, '&lt;')
    .replace(/>/g, '&gt;')
    .replace(/"/g, '&quot;')
    .replace(/'/g, '&#39;');
}

/** A link that a reader may follow: http, https or mailto, else undefined. */
export function safeLink(link: string | undefined): string | undefined {
  if (link === undefined) return undefined;
  try {
    const url = new URL(link);
    return ['http:', 'https:', 'mailto:'].includes(url.protocol) ? url.href : undefined;
  } catch {
    return undefined;
  }
}

/** The unit in which people read an SI quantity; units that are none stay as they are. */
export function shownUnit(
  unit: string,
  difference: boolean,
): { readonly text: string; readonly from: (value: number) => number } {
  const text = tradeUnit(unit, difference);
  try {
    const parsed = parseUnit(text);
    return { text: text === '1' ? '' : text, from: (value) => fromSI(value, parsed) };
  } catch {
    return { text: unit, from: (value) => value };
  }
}

/** `328.4 bar(a)`. */
export function quantity(value: number, unit: string, difference = false, digits = 4): string {
  const shown = shownUnit(unit, difference);
  const number = Number.isFinite(value) ? formatNumber(shown.from(value), digits) : String(value);
  return shown.text === '' ? number : `${number} ${shown.text}`;
}

/** A margin with its sign: `+4.2 bar`, `-0.3 km/h`; nothing where nothing was asked. */
export function marginText(value: number, unit: string): string {
  if (!Number.isFinite(value)) return '–';
  const text = quantity(value, unit, true);
  return value > 0 || Object.is(value, 0) ? `+${text}` : text.replace(/^-/, '−').replace(/^0/, '−0');
}

/** Seconds of a tick: `12.345 s`. */
export function time(tick: number, step: number): string {
  return `${(tick * step).toFixed(step < 1e-3 ? 4 : 3)} s`;
}

/** `12.3 kJ`, for energies over several orders. */
export function energyText(joule: number): string {
  const size = Math.abs(joule);
  const [factor, unit] = size >= 1e6 ? [1e6, 'MJ'] : size >= 1e3 ? [1e3, 'kJ'] : [1, 'J'];
  return `${formatNumber(joule / factor, 4)} ${unit}`;
}

/** Round numbers that divide a range, at most `most`. */
export function ticksOf(least: number, greatest: number, most: number): number[] {
  const span = greatest - least;
  if (!(span > 0) || !Number.isFinite(span)) return [least];
  const rough = span / Math.max(1, most);
  const power = 10 ** Math.floor(Math.log10(rough));
  const step = [1, 2, 5, 10].map((factor) => factor * power).find((size) => size >= rough * (1 - 1e-9)) ?? 10 * power;
  const ticks: number[] = [];
  for (let i = Math.ceil(least / step - 1e-9); i * step <= greatest + step * 1e-9; i += 1)
    ticks.push(Number((i * step).toPrecision(12)));
  return ticks;
}
