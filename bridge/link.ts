import type { Journal } from '../runtime/journal.js';
import type { BusAdversary, linkFaults } from './bus-adversary.js';
import type { LinkSpec } from './message-map.js';
import type { ReceivedMessage } from './received-message.js';
import type { SentMessage } from './sent-message.js';
import type { Transport } from './transport.js';

/**
 * The bench's end of one link, of whatever kind. All that it remembers stands in the block that each call is given; no
 * call waits and none allocates.
 */
export interface Link {
  transport: Transport;
  journal: Journal;
  readonly spec: LinkSpec;
  /** Place in the map's list of links: the number under which the record holds its inputs. */
  readonly number: number;
  readonly receivers: readonly ReceivedMessage[];
  readonly senders: readonly SentMessage[];
  /** Slots by the names of link-counts.ts. */
  readonly slots: Readonly<Record<string, number>>;
  /** What the bus does to frames, where the link can have it done: way in, way out. */
  readonly adversaries?: readonly BusAdversary[];
  /** Commands of the link as a whole, where it has any: slots by the names of `linkFaults`. */
  readonly faults?: Readonly<Record<keyof typeof linkFaults, number>>;
  /** Slot: 1 once a message was used. */
  readonly awake: number;
  /** Sends that the transport did not accept. It depends on the machine and not on inputs: not part of the block. */
  readonly refusedSends: number;
  /** Drains the transport into the receivers. The work is bounded: a flood waits in the transport. */
  take(block: Float64Array, tick: number): void;
  /** Writes sender number `index` with values[from ..] when it is due, and sends it. */
  send(block: Float64Array, tick: number, index: number, values: Float64Array, from: number): void;
  /** After all messages of a tick have been sent. */
  flush(block: Float64Array, tick: number): void;
  /** The bench starts: says so where the link has a word for it. */
  hello(tick: number): void;
  clearCounts(block: Float64Array): void;
}
