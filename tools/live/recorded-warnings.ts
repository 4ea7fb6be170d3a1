import type { EventNames, LiveEvent, WarningStatus } from '../../bridge/live/source.js';
import type { WatchedSignal } from '../../configs/bench-spec.js';

/** The warnings of the watch as they stood at `tick`, from its events (runtime/watch-events.ts). */
export function warningsAt(
  events: readonly LiveEvent[],
  names: EventNames,
  watched: readonly WatchedSignal[],
  tick: number,
): WarningStatus[] {
  const open = new Map<string, WarningStatus>();
  for (const event of events) {
    if (event.tick > tick) break;
    const kind = names.kinds[event.kind];
    const path = names.subjects[event.subject] ?? '';
    const signal = watched.find((candidate) => candidate.path === path);
    if (kind === undefined || signal === undefined) continue;
    const known = open.get(path);
    if (kind.name.startsWith('warning over')) {
      if (known?.acknowledged) open.delete(path);
      else if (known !== undefined) open.set(path, { ...known, active: false, peak: event.a });
    } else if (kind.name.startsWith('warning acknowledged')) {
      if (known !== undefined && !known.active) open.delete(path);
      else if (known !== undefined) open.set(path, { ...known, acknowledged: true });
    } else if (kind.name.includes(`: ${path}`)) {
      const level = kind.name.slice(0, kind.name.indexOf(`: ${path}`));
      const meaning = signal.limits.find((limit) => limit.level === level)?.meaning ?? '';
      open.set(path, {
        identifier: event.subject,
        path,
        level,
        severity: kind.severity,
        unit: signal.unit,
        setting: event.b,
        peak: known?.active ? Math.max(known.peak, event.a) : event.a,
        sinceTick: known?.active ? known.sinceTick : event.tick,
        active: true,
        acknowledged: false,
        meaning,
      });
    }
  }
  return [...open.values()];
}
