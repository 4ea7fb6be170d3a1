import type { WatchInput } from './watch-ladders.js';

/** What people compare a pressure to, Pa absolute. */
export interface PressureSettings {
  readonly precharge?: number;
  readonly leastInlet?: number;
  readonly relief?: number;
  /** Maximum allowable pressure, PS. */
  readonly maximumAllowable?: number;
  /** Greatest pressure in a case. */
  readonly casePressure?: number;
}

/** The settings among a pressure's limits; an empty object for anything that is not a pressure. */
export function pressureSettings(input: WatchInput): PressureSettings {
  if (input.unit !== 'Pa') return {};
  const of = (level: string) => input.limits.find((limit) => limit.level === level)?.setting;
  const settings = {
    precharge: of('below precharge'),
    leastInlet: of('below least inlet'),
    relief: input.relief?.setting ?? of('relief passing'),
    maximumAllowable: of('above maximum'),
    casePressure: of('case pressure'),
  };
  return Object.fromEntries(Object.entries(settings).filter(([, setting]) => setting !== undefined));
}
