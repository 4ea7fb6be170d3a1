import type { WatchLevel } from './contract.js';
import { watchLevelNumber } from './watch-levels.js';

/** A true signal and what the watch compares it to. Plain data; pressures absolute, SI throughout. */
export interface WatchInput {
  readonly path: string;
  readonly unit: string;
  readonly limits: readonly WatchInputLimit[];
  /** The relief valve that protects this pressure and its cracking pressure, Pa. */
  readonly relief?: { readonly valve: string; readonly setting: number };
  /** `near relief` begins this share of the gauge setting below the setting. */
  readonly vicinity: number;
  /** ... and when the setting will be reached within this time at the present rate, s; 0: never. */
  readonly lookAhead: number;
}
export interface WatchInputLimit {
  readonly level: WatchLevel;
  readonly side: 'above' | 'below';
  readonly setting: number;
  /** What it would mean on a vehicle. */
  readonly meaning: string;
  /** Where the setting comes from: `highLine.maximumAllowable`. */
  readonly from: string;
}

/** One level of one side of a signal. */
export interface WatchRung {
  readonly level: WatchLevel;
  readonly number: number;
  /** The level begins beyond this ... */
  readonly begins: number;
  /** ... and is over when the value is back behind this. */
  readonly ends: number;
  /** What people compare the value to. `near relief` begins before its setting. */
  readonly setting: number;
  readonly meaning: string;
  readonly from: string;
}

/** The levels of a signal to one side, least urgent first: what one warning climbs. */
export interface WatchLadder {
  readonly path: string;
  readonly unit: string;
  readonly side: 'above' | 'below';
  readonly rungs: readonly WatchRung[];
  readonly relief?: { readonly setting: number; readonly lookAhead: number };
}

/**
 * A level ends when the value is back by this share of the setting (pressures: of the gauge setting, at least 10 mbar);
 * temperatures: by 1 K. It keeps a value that trembles at its setting from ringing.
 */
const hysteresis = 0.01;
const leastPressureHysteresis = 1000;
const temperatureHysteresis = 1;

const reliefMeanings = {
  'near relief': 'little is left until the relief valve opens and turns the work into heat',
  'relief passing': 'the relief valve passes oil: energy is lost and the oil heats up quickly',
} as const;

/** The ladders of a signal, above before below. `ambient`: what a gauge reads as zero, Pa. */
export function laddersOf(input: WatchInput, ambient: number): WatchLadder[] {
  const limits = withRelief(input, ambient);
  const relief = reliefSetting(input);
  return (['above', 'below'] as const).flatMap((side) => {
    const rungs = rungsOf(
      limits.filter((limit) => limit.side === side),
      input.unit,
      side,
      ambient,
    );
    if (rungs.length === 0) return [];
    return [
      {
        path: input.path,
        unit: input.unit,
        side,
        rungs,
        ...(side === 'above' && relief !== undefined
          ? { relief: { setting: relief, lookAhead: input.lookAhead } }
          : {}),
      },
    ];
  });
}

/** The setting that `near relief` refers to: the valve's cracking pressure, or what the limits say of one. */
function reliefSetting(input: WatchInput): number | undefined {
  return (
    input.relief?.setting ??
    input.limits.find((limit) => limit.level === 'relief passing' && limit.side === 'above' && input.unit === 'Pa')
      ?.setting
  );
}

interface Limit extends WatchInputLimit {
  readonly begins: number;
}

/** The limits as given and, for a pressure with a relief valve, `near relief` and `relief passing`. */
function withRelief(input: WatchInput, ambient: number): Limit[] {
  const limits: Limit[] = input.limits.map((limit) => ({ ...limit, begins: limit.setting }));
  const setting = reliefSetting(input);
  if (setting === undefined) return limits;
  const from = input.relief ? `${input.relief.valve}.cracking` : `relief setting of ${input.path}`;
  const all = limits.map((limit) =>
    limit.level === 'near relief' && limit.side === 'above' ? { ...limit, setting } : limit,
  );
  for (const level of ['near relief', 'relief passing'] as const) {
    const begins = level === 'near relief' ? setting - input.vicinity * (setting - ambient) : setting;
    const meaning = limits.find((limit) => limit.level === level)?.meaning ?? reliefMeanings[level];
    all.push({ level, side: 'above', setting, begins, meaning, from });
  }
  return all;
}

/** One rung for each level, by the more cautious limit where several say the same. */
function rungsOf(limits: readonly Limit[], unit: string, side: 'above' | 'below', ambient: number): WatchRung[] {
  const sign = side === 'above' ? 1 : -1;
  const chosen = new Map<WatchLevel, Limit>();
  for (const limit of limits) {
    const other = chosen.get(limit.level);
    if (!other || sign * limit.begins < sign * other.begins) chosen.set(limit.level, limit);
  }
  return [...chosen.values()]
    .map(({ level, begins, setting, meaning, from }) => ({
      level,
      number: watchLevelNumber(level),
      begins,
      ends: begins - sign * back(begins, unit, ambient),
      setting,
      meaning,
      from,
    }))
    .sort((a, b) => a.number - b.number);
}

function back(begins: number, unit: string, ambient: number): number {
  if (unit === 'K') return temperatureHysteresis;
  if (unit === 'Pa') return Math.max(leastPressureHysteresis, hysteresis * Math.abs(begins - ambient));
  return hysteresis * Math.abs(begins);
}
