import type { EventCatalogue } from './journal.js';

/** Events that answer a hand carry its request number as c. */
export interface HandEvents {
  /** By target. a: value. */
  readonly sets: Int32Array;
  readonly renews: number;
  readonly releases: number;
  /** a: time since the last renewal, s. Answers no request. */
  readonly lapses: number;
  /** By action. */
  readonly scenario: Int32Array;
  readonly acknowledges: number;
  readonly notes: number;
  /** A hand lets go of what it no longer held. */
  readonly letGoAlready: number;
  readonly refusesFull: number;
  readonly refusesFree: number;
  readonly refusesUnknown: number;
  readonly subjects: Int32Array;
  readonly scenarioSubject: number;
  readonly noteSubject: number;
}

export const handEventNames = {
  sets: 'hand sets',
  renews: 'hand renewed',
  releases: 'hand lets go',
  lapses: 'hand not renewed',
  acknowledges: 'hand acknowledged a warning',
  notes: 'note by hand',
  refusals: 'hand refused',
  letGoAlready: 'hand refused: it had let go already',
} as const;

/** Kinds that only answer a hand: what they say is said by another event, or by nothing new. */
export const quietHandEvents: readonly string[] = [
  handEventNames.renews,
  handEventNames.acknowledges,
  handEventNames.letGoAlready,
];

/** Whether an event of this kind says that a hand acted. */
export function isHandAct(kind: string): boolean {
  return (
    kind === handEventNames.renews ||
    kind === handEventNames.acknowledges ||
    kind === handEventNames.notes ||
    kind === handEventNames.releases ||
    kind.startsWith(handEventNames.sets) ||
    /^scenario (held|continued|ended) by hand$/.test(kind)
  );
}

export function declareHandEvents(
  events: EventCatalogue,
  targets: readonly { readonly path: string; readonly unit: string }[],
  scenario: string,
): HandEvents {
  const note = (name: string, text: string) => events.kind({ name, severity: 'note', text });
  const refusal = (why: string) =>
    events.kind({ name: `${handEventNames.refusals}: ${why}`, severity: 'warning', text: `by hand: refused, ${why}` });
  return {
    sets: Int32Array.from(targets, ({ unit }) =>
      note(`${handEventNames.sets}, ${unit}`, `by hand: {subject} = {a:${unit}}`),
    ),
    renews: note(handEventNames.renews, 'by hand: {subject} held on'),
    releases: note(handEventNames.releases, 'by hand: {subject} let go'),
    lapses: events.kind({
      name: handEventNames.lapses,
      severity: 'warning',
      text: '{subject} let go by itself: its hand was not renewed for {a:s}',
    }),
    scenario: Int32Array.from([
      -1,
      note('scenario held by hand', 'by hand: scenario {subject} held'),
      note('scenario continued by hand', 'by hand: scenario {subject} goes on'),
      note('scenario ended by hand', 'by hand: scenario {subject} ended'),
    ]),
    acknowledges: note(handEventNames.acknowledges, 'by hand: warning of {subject} acknowledged'),
    notes: note(handEventNames.notes, 'note: {subject}'),
    letGoAlready: refusal('it had let go already'),
    refusesFull: refusal('too many hands hold something already'),
    refusesFree: refusal('there is nothing to be done: it is so already'),
    refusesUnknown: refusal('it was not understood'),
    subjects: Int32Array.from(targets, ({ path }) => events.subject(path)),
    scenarioSubject: events.subject(scenario),
    noteSubject: events.subject('written by hand'),
  };
}
