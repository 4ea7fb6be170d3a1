import type { EventKind } from '../../runtime/journal.js';
import { show, showIn, showTime } from './show.js';

/** An event as people read it: the places of its text filled in, with units. */
export function eventText(kind: EventKind, subject: string, a: number, b: number, c: number): string {
  const values = { a, b, c };
  return kind.text.replace(
    /\{(subject|[abc])(?::([^}]+))?\}/g,
    (_, place: 'subject' | 'a' | 'b' | 'c', unit?: string) => {
      if (place === 'subject') return subject;
      const value = values[place];
      if (unit === undefined) return showIn(value, '1');
      return unit === 's' ? showTime(value) : show(value, unit);
    },
  );
}
