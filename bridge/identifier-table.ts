import { identifierFlags } from './can-frame.js';
import { priorityBits } from './j1939/identifier.js';
import type { MessageSpec } from './message-map.js';

/** Finds the message of an identifier: sorted words and a search by halves. Nothing is allocated in a call. */
export class IdentifierTable {
  private readonly exact: Words;
  /** Those whose priority is not looked at, without it; undefined where there are none. */
  private readonly groups: Words | undefined;

  constructor(messages: readonly MessageSpec[]) {
    const places = messages.map((message, place) => ({ message, place }));
    const groups = places.filter(({ message }) => message.anyPriority);
    this.exact = wordsOf(places.filter(({ message }) => !message.anyPriority));
    this.groups = groups.length > 0 ? wordsOf(groups) : undefined;
  }

  /** Place of the message with this identifier word (identifier and the flag of 29 bits), or -1. */
  find(word: number): number {
    const place = search(this.exact, word);
    if (place >= 0 || this.groups === undefined || (word & identifierFlags.extended) === 0) return place;
    return search(this.groups, word & ~priorityBits);
  }
}

interface Words {
  readonly words: Int32Array;
  readonly places: Int32Array;
}

function wordsOf(all: readonly { readonly message: MessageSpec; readonly place: number }[]): Words {
  const sorted = all
    .map(({ message, place }) => ({
      word:
        (message.identifier & (message.anyPriority ? ~priorityBits : -1)) |
        (message.extended ? identifierFlags.extended : 0),
      place,
    }))
    .sort((a, b) => a.word - b.word);
  return { words: Int32Array.from(sorted, ({ word }) => word), places: Int32Array.from(sorted, ({ place }) => place) };
}

function search({ words, places }: Words, word: number): number {
  let low = 0;
  let high = words.length - 1;
  while (low <= high) {
    const middle = (low + high) >> 1;
    const other = words[middle];
    if (other === word) return places[middle];
    if (other < word) low = middle + 1;
    else high = middle - 1;
  }
  return -1;
}
