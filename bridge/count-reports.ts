import type { BlockLayout } from '../runtime/block.js';
import type { EventCatalogue, EventKind, Journal } from '../runtime/journal.js';

/**
 * Turns counts that stand in the block into events, each at most once per `interval` ticks: the first rise at once,
 * what follows summed up. A flood of bad datagrams thus cannot flood the record.
 */
export class CountReports {
  private readonly counts: number[] = [];
  private readonly seen: number[] = [];
  private readonly next: number[] = [];
  private readonly kinds: number[] = [];
  private readonly subjects: number[] = [];

  constructor(
    private readonly layout: BlockLayout,
    private readonly events: EventCatalogue,
    private readonly interval: number,
  ) {}

  /** The event gets a = rise since the last report, b = the count. */
  watch(count: number, kind: EventKind, subject: string): void {
    const path = `${this.layout.path(count)}.reported`;
    this.counts.push(count);
    this.seen.push(this.layout.add(path));
    this.next.push(this.layout.add(`${path}Next`, Number.NEGATIVE_INFINITY));
    this.kinds.push(this.events.kind(kind));
    this.subjects.push(this.events.subject(subject));
  }

  report(block: Float64Array, tick: number, journal: Journal): void {
    for (let i = 0; i < this.counts.length; i += 1) {
      const count = block[this.counts[i]];
      const seen = block[this.seen[i]];
      if (count === seen) continue;
      // A count may fall when a datagram taken for lost turns up late.
      if (count < seen) block[this.seen[i]] = count;
      else if (tick >= block[this.next[i]]) {
        journal.event(tick, this.kinds[i], this.subjects[i], count - seen, count, 0);
        block[this.seen[i]] = count;
        block[this.next[i]] = tick + this.interval;
      }
    }
  }

  /** After the counts were set to zero. */
  clear(block: Float64Array): void {
    for (let i = 0; i < this.counts.length; i += 1) block[this.seen[i]] = 0;
  }
}
