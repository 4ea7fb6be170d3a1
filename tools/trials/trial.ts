import type { Place } from './place.js';

/** Something that goes wrong around a run, on purpose, and what must hold all the same. */
export interface Trial {
  readonly name: string;
  readonly about: string;
  /** Rounds of the long version. */
  readonly rounds: number;
  /** Why it cannot be done on this computer; '' when it can. */
  readonly why?: () => string;
  /** One round; a note for the table. Throws Broken when something did not hold. */
  round(place: Place): Promise<string>;
}

/** What did not hold. */
export class Broken extends Error {
  override readonly name = 'Broken';
}

export function demand(condition: boolean, what: () => string): asserts condition {
  if (!condition) throw new Broken(what());
}
