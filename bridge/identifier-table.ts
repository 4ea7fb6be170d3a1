import { identifierFlags } from './can-frame.js';
import type { MessageSpec } from './message-map.js';

/** Finds the message of an identifier: sorted words and a search by halves. Nothing is allocated in a call. */
export class IdentifierTable {
  private readonly words: Int32Array;
  private readonly places: Int32Array;

  constructor(messages: readonly MessageSpec[]) {
    const all = messages
      .map((message, place) => ({
        word: message.identifier | (message.extended ? identifierFlags.extended : 0),
        place,
      }))
      .sort((a, b) => a.word - b.word);
    this.words = Int32Array.from(all, ({ word }) => word);
    this.places = Int32Array.from(all, ({ place }) => place);
  }

  /** Place of the message with this identifier word (identifier and the flag of 29 bits), or -1. */
  find(word: number): number {
    const { words } = this;
    let low = 0;
    let high = words.length - 1;
    while (low <= high) {
      const middle = (low + high) >> 1;
      const other = words[middle];
      if (other === word) return this.places[middle];
      if (other < word) low = middle + 1;
      else high = middle - 1;
    }
    return -1;
  }
}
