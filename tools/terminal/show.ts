import { fromSI, parseUnit, tradeUnit } from '../../configs/units.js';

/** Decimals in which people read a unit on a bench. */
const decimals: Readonly<Record<string, number>> = {
  'bar(g)': 1,
  'bar(a)': 1,
  bar: 1,
  'km/h': 1,
  rpm: 0,
  '%': 0,
  degC: 0,
  'N m': 0,
  kN: 1,
  'L/min': 1,
  kW: 1,
  kg: 0,
  L: 1,
  K: 1,
  m: 0,
};

/** Below this a pressure has another decimal, bar. */
const lowPressure = 50;

/** Where people read another unit than the one for files: gauge pressures on a bench. */
function peoplesUnit(unit: string): string {
  return unit === 'Pa' ? 'bar(g)' : tradeUnit(unit);
}

/** An SI value in the unit that people read it in, fixed decimals: `251.3 bar(g)`, `34.2 km/h`, `3`. */
export function show(value: number, unit: string): string {
  return showIn(value, peoplesUnit(unit));
}

/** An SI value in a unit: `%`, `rpm`, `bar(g)`. `1` and whole numbers have no unit. */
export function showIn(value: number, unit: string): string {
  if (!Number.isFinite(value)) return `${Number.isNaN(value) ? 'no number' : value > 0 ? 'endless' : '-endless'}`;
  if (unit === '1') return Number.isInteger(value) ? String(value) : fixed(value, significant(value));
  const number = fromSI(value, parseUnit(unit));
  const extra = /^bar/.test(unit) && Math.abs(number) < lowPressure ? 1 : 0;
  const text = fixed(number, (decimals[unit] ?? significant(number)) + extra);
  return `${text} ${unit === 'degC' ? '°C' : unit}`;
}

/** For numbers of any size: four significant digits at most. */
function significant(value: number): number {
  const size = Math.abs(value);
  if (size === 0) return 0;
  return Math.min(9, Math.max(0, 3 - Math.floor(Math.log10(size))));
}

/** No minus before zeros. */
function fixed(value: number, digits: number): string {
  const text = value.toFixed(digits);
  return /^-0(\.0*)?$/.test(text) ? text.slice(1) : text;
}

/** J -> `812 kJ`, `1.46 MJ` */
export function showEnergy(joules: number): string {
  const size = Math.abs(joules);
  if (size >= 1e6) return `${fixed(joules / 1e6, 2)} MJ`;
  if (size >= 1e3) return `${fixed(joules / 1e3, size >= 1e5 ? 0 : 1)} kJ`;
  return `${fixed(joules, size >= 100 ? 0 : 1)} J`;
}

/** µs -> `45 µs`, `1.21 ms`, `2.5 s` */
export function showMicroseconds(time: number): string {
  if (time < 1000) return `${fixed(time, time < 10 ? 1 : 0)} µs`;
  if (time < 1e6) return `${fixed(time / 1e3, time < 1e4 ? 2 : 1)} ms`;
  return `${fixed(time / 1e6, 2)} s`;
}

/** s -> `0.125 s`, `7 ms` */
export function showTime(time: number): string {
  const size = Math.abs(time);
  if (size !== 0 && size < 0.0995) return `${fixed(time * 1000, size < 0.00995 ? 1 : 0)} ms`;
  return `${fixed(time, size < 10 ? 2 : 1)} s`;
}

/** s -> `01:02`; hours when there are any. */
export function showClock(time: number): string {
  const seconds = Math.max(0, Math.floor(time + 1e-9));
  const two = (value: number) => String(value).padStart(2, '0');
  const hours = Math.floor(seconds / 3600);
  return `${hours > 0 ? `${hours}:` : ''}${two(Math.floor(seconds / 60) % 60)}:${two(seconds % 60)}`;
}

/** A share that may be tiny: `3.1e-7`, `0`. */
export function showShare(share: number): string {
  return share === 0 ? '0' : share.toExponential(1);
}
