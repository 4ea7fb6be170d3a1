import type { SignalInfo } from '../../../runtime/contract.js';
import { ambient } from './connection.js';
import { flowUnit, pressureUnit, speedUnit } from './preferences.js';

/** shown = si * factor + offset */
export interface Shown {
  readonly unit: string;
  readonly factor: number;
  readonly offset: number;
  readonly decimals: number;
}

const pressureFactor: Record<string, [number, number]> = {
  bar: [1e-5, 1],
  MPa: [1e-6, 2],
  psi: [1 / 6894.757293168, 0],
};
const speedFactor: Record<string, number> = { 'km/h': 3.6, 'm/s': 1, mph: 1 / 0.44704 };
const flowFactor: Record<string, [number, number]> = {
  'L/min': [60_000, 1],
  'L/s': [1000, 2],
  'gal/min': [60 / 3.785411784e-3, 1],
};
const fixed: Record<string, [string, number, number, number]> = {
  m3: ['L', 1000, 0, 2],
  'rad/s': ['1/min', 30 / Math.PI, 0, 0],
  rad: ['°', 180 / Math.PI, 0, 1],
  K: ['°C', 1, -273.15, 1],
  W: ['kW', 1e-3, 0, 2],
  J: ['kJ', 1e-3, 0, 1],
  N: ['kN', 1e-3, 0, 2],
  'N m': ['N m', 1, 0, 0],
  kg: ['kg', 1, 0, 3],
  'kg/s': ['kg/s', 1, 0, 3],
  '1': ['', 1, 0, 2],
  m: ['m', 1, 0, 2],
};

/** How a quantity is shown. Differences of pressure and temperature have no zero point: `difference`. */
export function shownAs(unit: string, difference = false): Shown {
  if (unit === 'Pa') {
    const [name, reference] = pressureUnit.value.split('(');
    const [factor, decimals] = pressureFactor[name];
    if (difference) return { unit: name, factor, offset: 0, decimals };
    return { unit: pressureUnit.value, factor, offset: reference.startsWith('g') ? -ambient() * factor : 0, decimals };
  }
  if (unit === 'm/s') return { unit: speedUnit.value, factor: speedFactor[speedUnit.value], offset: 0, decimals: 1 };
  if (unit === 'm3/s') {
    const [factor, decimals] = flowFactor[flowUnit.value];
    return { unit: flowUnit.value, factor, offset: 0, decimals };
  }
  if (unit === 's') return { unit: 's', factor: 1, offset: 0, decimals: 3 };
  if (unit === 'K' && difference) return { unit: 'K', factor: 1, offset: 0, decimals: 1 };
  const entry = fixed[unit];
  if (entry === undefined) return { unit, factor: 1, offset: 0, decimals: 3 };
  return { unit: entry[0], factor: entry[1], offset: entry[2], decimals: entry[3] };
}

export function isDifference(info: SignalInfo): boolean {
  return /differen|drop|margin|noise/i.test(info.about);
}
export function shownOf(info: SignalInfo): Shown {
  if (info.group === 'timing' && info.unit === 's') return { unit: 'µs', factor: 1e6, offset: 0, decimals: 0 };
  return shownAs(info.unit, isDifference(info));
}

export function number(value: number, decimals: number): string {
  if (!Number.isFinite(value)) return '–';
  const text = Math.abs(value) < 0.5 * 10 ** -decimals ? (0).toFixed(decimals) : value.toFixed(decimals);
  return text.replace('-', '−');
}
export function format(si: number, shown: Shown): string {
  return number(si * shown.factor + shown.offset, shown.decimals);
}
export function withUnit(si: number, shown: Shown): string {
  return shown.unit === '' ? format(si, shown) : `${format(si, shown)} ${shown.unit}`;
}

/** Ticks as m:ss.d or h:mm:ss */
export function clock(tick: number, step: number, decimals = 1): string {
  const seconds = tick * step;
  if (!(seconds >= 0)) return '–';
  const whole = Math.floor(seconds);
  const hours = Math.floor(whole / 3600);
  const minutes = Math.floor(whole / 60) % 60;
  const rest = (seconds - Math.floor(seconds / 60) * 60)
    .toFixed(decimals)
    .padStart(decimals > 0 ? 3 + decimals : 2, '0');
  return hours > 0 ? `${hours}:${String(minutes).padStart(2, '0')}:${rest}` : `${minutes}:${rest}`;
}
export function microseconds(seconds: number): string {
  const us = seconds * 1e6;
  return us >= 1000 ? `${number(us / 1000, us >= 10_000 ? 0 : 1)} ms` : `${number(us, 0)} µs`;
}
