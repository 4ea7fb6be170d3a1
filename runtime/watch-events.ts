import type { EventCatalogue } from './journal.js';
import type { WatchLadder } from './watch-ladders.js';
import { watchLevelWords, watchSeverity } from './watch-levels.js';

/** Numbers of the watch's events. Those by rung stand in the order of the ladders and their rungs. */
export interface WatchEvents {
  /** a: value, b: setting, c: number of the level. */
  readonly begins: Int32Array;
  /** The same, when a warning that is on climbs. */
  readonly rises: Int32Array;
  /** a: value, b: relief setting, c: predicted time to reach it, s. By ladder, -1 without relief. */
  readonly predicted: Int32Array;
  /** By ladder. a: peak, b: setting of the worst level, c: how long it was on this time, s. */
  readonly ends: Int32Array;
  /** By ladder. a: peak, b: setting of the worst level, c: time since it began, s. */
  readonly acknowledged: Int32Array;
  readonly subjects: Int32Array;
}

export function declareWatchEvents(events: EventCatalogue, ladders: readonly WatchLadder[]): WatchEvents {
  const begins: number[] = [];
  const rises: number[] = [];
  const predicted: number[] = [];
  for (const ladder of ladders) {
    const { unit, path } = ladder;
    const compared = `{a:${unit}}, setting {b:${unit}}`;
    let early = -1;
    for (const { level, meaning } of ladder.rungs) {
      const severity = watchSeverity(level);
      const name = `${level}: ${path}`;
      const said = meaning === '' ? '' : `; ${meaning.replace(/[{}]/g, '')}`;
      begins.push(events.kind({ name, severity, text: `{subject} ${watchLevelWords[level]}: ${compared}${said}` }));
      rises.push(
        events.kind({
          name: `${name}, risen`,
          severity,
          text: `{subject} now ${watchLevelWords[level]}: ${compared}${said}`,
        }),
      );
      if (level === 'near relief' && ladder.relief) {
        early = events.kind({
          name: `${name}, predicted`,
          severity,
          text: `{subject} will reach the relief setting in {c:s} at the present rate: ${compared}${said}`,
        });
      }
    }
    predicted.push(early);
  }
  const over = ladders.map(({ unit }) =>
    events.kind({
      name: `warning over, ${unit}`,
      severity: 'note',
      text: `{subject} back behind its settings after {c:s}: peak {a:${unit}}, setting {b:${unit}}`,
    }),
  );
  const seen = ladders.map(({ unit }) =>
    events.kind({
      name: `warning acknowledged, ${unit}`,
      severity: 'note',
      text: `{subject} acknowledged {c:s} after it began: peak {a:${unit}}, setting {b:${unit}}`,
    }),
  );
  return {
    begins: Int32Array.from(begins),
    rises: Int32Array.from(rises),
    predicted: Int32Array.from(predicted),
    ends: Int32Array.from(over),
    acknowledged: Int32Array.from(seen),
    subjects: Int32Array.from(ladders, (ladder) => events.subject(ladder.path)),
  };
}
