/**
 * What the tick hands over as evidence. Implementations: a ring to the host thread (live and fast runs), memory
 * (tests), nothing (checks). None may allocate in a tick and none may wait when live.
 */
export interface Journal {
  /** One tick's signals and the hash of the block after the tick. May be dropped when live and full, then counted. */
  row(tick: number, signals: Float64Array, hash: Int32Array): void;
  /** One datagram or frame as taken at `tick`, from link number `link`. Never dropped. */
  input(tick: number, link: number, bytes: Uint8Array, length: number): void;
  /** A coded event: see EventCatalogue. Never dropped. */
  event(tick: number, code: number, subject: number, a: number, b: number, c: number): void;
  /** The whole block after `tick`, once a second. Never dropped. */
  snapshot(tick: number, block: Float64Array): void;
}

export const noJournal: Journal = {
  row() {},
  input() {},
  event() {},
  snapshot() {},
};

/** An event kind: `text` has the places {subject}, {a}, {b}, {c}; a place may carry a unit, `{a:Pa}`, for the reader. */
export interface EventKind {
  readonly name: string;
  readonly severity: 'note' | 'warning' | 'alarm' | 'error';
  readonly text: string;
}

/** All kinds and subjects of events of a bench, by number; filled while it is built. */
export class EventCatalogue {
  readonly kinds: EventKind[] = [];
  readonly subjects: string[] = [];
  private readonly subjectNumbers = new Map<string, number>();

  kind(kind: EventKind): number {
    const known = this.kinds.findIndex((other) => other.name === kind.name);
    if (known >= 0) return known;
    this.kinds.push(kind);
    return this.kinds.length - 1;
  }

  subject(name: string): number {
    let number = this.subjectNumbers.get(name);
    if (number === undefined) {
      number = this.subjects.length;
      this.subjects.push(name);
      this.subjectNumbers.set(name, number);
    }
    return number;
  }
}
