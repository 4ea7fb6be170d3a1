import type { WatchLevel } from './contract.js';
import type { EventKind } from './journal.js';

/**
 * The levels of the watch, least urgent first. A level's number in signals, events and the block is its place here; 0 is
 * `nothing to say`, so that the larger of two numbers is the one to look at.
 */
export const watchLevels: readonly WatchLevel[] = [
  'near relief',
  'not following',
  'level low',
  'end of travel',
  'below precharge',
  'relief passing',
  'over temperature',
  'locked',
  'below least inlet',
  'case pressure',
  'over speed',
  'above maximum',
  'above 1.1 maximum',
];

/** Names by number, for readers of `watch.*.level`. */
export const watchLevelNames: readonly string[] = ['nothing to say', ...watchLevels];

export function watchLevelNumber(level: WatchLevel): number {
  return watchLevels.indexOf(level) + 1;
}

/** What a level says, for people. */
export const watchLevelWords: Readonly<Record<WatchLevel, string>> = {
  'near relief': 'close to the relief setting',
  'not following': 'not following its request',
  'level low': 'level low',
  'end of travel': 'at the end of its travel',
  'below precharge': 'below precharge',
  'relief passing': 'relief valve passing',
  'over temperature': 'too hot',
  locked: 'locked',
  'below least inlet': 'below the least inlet pressure',
  'case pressure': 'case pressure too high',
  'over speed': 'over speed',
  'above maximum': 'above the maximum allowable pressure PS',
  'above 1.1 maximum': 'above 1.1 times the maximum allowable pressure PS',
};

const alarms: readonly WatchLevel[] = ['case pressure', 'over speed', 'above maximum', 'above 1.1 maximum'];

/** An alarm is something that would stop a vehicle on a road; the rest are warnings. */
export function watchSeverity(level: WatchLevel): EventKind['severity'] {
  return alarms.includes(level) ? 'alarm' : 'warning';
}
