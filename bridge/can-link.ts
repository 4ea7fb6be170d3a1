import type { BlockLayout } from '../runtime/block.js';
import { type Journal, noJournal } from '../runtime/journal.js';
import { BusAdversary } from './bus-adversary.js';
import { useErrorFrame, useNote } from './can-bus-state.js';
import { CanCodec } from './can-codec.js';
import { frameSizes, identifierFlags, identifierMasks, identifierWord, payloadAt, payloadRoom } from './can-frame.js';
import { noteSize } from './can-notes.js';
import { CanReceiver } from './can-receiver.js';
import { CanSender } from './can-sender.js';
import type { CanFilter } from './can-socket.js';
import { IdentifierTable } from './identifier-table.js';
import { priorityBits } from './j1939/identifier.js';
import type { Link } from './link.js';
import { canLinkCounts } from './link-counts.js';
import type { LinkSpec, MessageSpec } from './message-map.js';
import { makeProtector } from './protection/make.js';
import { receptions } from './received-message.js';
import { noTransport, type Transport } from './transport.js';

type Slots = Readonly<Record<keyof typeof canLinkCounts, number> & Record<string, number>>;

/**
 * The bench's end of one CAN link, over whatever moves its frames: a raw socket, multicast datagrams, a queue in memory
 * or a record. Frames come and go as `struct can_frame` or `canfd_frame`; what else a transport has to say comes as notes
 * of can-notes.ts, and the state of the CAN controller as error frames.
 *
 * The work of a tick is bounded: at most `framesPerTick` are taken, the rest waits, so that a flood cannot delay a step.
 */
export class CanLink implements Link {
  transport: Transport = noTransport;
  journal: Journal = noJournal;
  readonly senders: readonly CanSender[];
  readonly receivers: readonly CanReceiver[];
  readonly slots: Slots;
  readonly awake: number;
  refusedSends = 0;
  /** What the bus does to frames on their way in and on their way out. */
  readonly adversaries: readonly BusAdversary[];
  private readonly fromBus: BusAdversary;
  private readonly toBus: BusAdversary;
  private readonly table: IdentifierTable;
  private readonly incoming = new Uint8Array(frameSizes.flexible);
  private readonly incomingPayload = this.incoming.subarray(payloadAt);
  private readonly outgoing = new Uint8Array(frameSizes.flexible);
  private readonly outgoingPayload = this.outgoing.subarray(payloadAt);

  constructor(
    readonly spec: LinkSpec,
    readonly number: number,
    messages: readonly MessageSpec[],
    layout: BlockLayout,
    firstTick: number,
    private readonly framesPerTick: number,
    /** Length of a tick, s, and the seed of what the adversaries leave to chance. */
    step: number,
    seed = 0,
  ) {
    const own = messages.filter((message) => message.link === spec.name);
    const received = own.filter((message) => message.direction === 'received');
    this.receivers = received.map((message) => new CanReceiver(new CanCodec(message), makeProtector(message), layout));
    this.senders = own
      .filter((message) => message.direction === 'sent')
      .map((message) => new CanSender(new CanCodec(message), makeProtector(message), layout, firstTick));
    this.table = new IdentifierTable(received);
    const slots = {} as Record<keyof typeof canLinkCounts, number> & Record<string, number>;
    for (const name of Object.keys(canLinkCounts) as (keyof typeof canLinkCounts)[])
      slots[name] = layout.add(`${spec.name}.${name}`);
    this.fromBus = new BusAdversary(spec.name, 'received', layout, step, seed, 2000 + 2 * number);
    this.toBus = new BusAdversary(spec.name, 'sent', layout, step, seed, 2001 + 2 * number);
    this.adversaries = [this.fromBus, this.toBus];
    for (const { way, counts } of this.adversaries)
      for (const [name, slot] of Object.entries(counts)) slots[`${way}${name}`] = slot;
    this.slots = slots;
    this.awake = layout.add(`${spec.name}.awake`);
  }

  /** Takes what waits. Each frame goes to the journal before anything is believed of it. */
  take(block: Float64Array, tick: number): void {
    const { incoming } = this;
    for (let i = 0; i < this.receivers.length; i += 1) this.receivers[i].grow(block);
    let taken = 0;
    let frames = 0;
    while (taken < this.framesPerTick) {
      const whole = this.transport.poll(incoming);
      if (whole < 0) break;
      const size = Math.min(whole, incoming.length);
      this.journal.input(tick, this.number, incoming, size);
      taken += 1;
      if (whole !== noteSize) frames += 1;
      // Notes and error frames are the computer's own; what is no frame has no way on a bus.
      if (
        payloadRoom(whole) > 0 &&
        incoming[4] <= payloadRoom(whole) &&
        (identifierWord(incoming) & identifierFlags.error) === 0 &&
        this.fromBus.acts(block)
      )
        this.fromBus.push(block, tick, incoming, whole);
      else this.judge(block, whole);
      for (
        let size = this.fromBus.next(block, tick, incoming);
        size >= 0;
        size = this.fromBus.next(block, tick, incoming)
      )
        this.judge(block, size);
    }
    for (
      let size = this.fromBus.next(block, tick, incoming);
      size >= 0;
      size = this.fromBus.next(block, tick, incoming)
    )
      this.judge(block, size);
    block[this.slots.received] += frames;
    if (taken === this.framesPerTick) block[this.slots.floods] += 1;
  }

  send(block: Float64Array, tick: number, index: number, values: Float64Array, from: number): void {
    const { outgoing, toBus } = this;
    const size = this.senders[index].write(block, tick, values, from, outgoing, this.outgoingPayload);
    if (!toBus.acts(block)) {
      if (size >= 0) this.pass(size);
      return;
    }
    if (size >= 0) toBus.push(block, tick, outgoing, size);
    for (let next = toBus.next(block, tick, outgoing); next >= 0; next = toBus.next(block, tick, outgoing))
      this.pass(next);
  }

  /** CAN has no word for it: a controller sees the first frames. */
  hello(_tick: number): void {}

  clearCounts(block: Float64Array): void {
    const slots = this.slots;
    block[slots.received] = 0;
    block[slots.replies] = 0;
    block[slots.unknown] = 0;
    block[slots.remote] = 0;
    block[slots.malformed] = 0;
    block[slots.wrongLength] = 0;
    block[slots.floods] = 0;
    block[slots.errorFrames] = 0;
    block[slots.warnings] = 0;
    block[slots.passives] = 0;
    block[slots.busOffs] = 0;
    block[slots.restarts] = 0;
    block[slots.downs] = 0;
    block[slots.deletions] = 0;
    block[slots.ups] = 0;
    block[slots.dropped] = 0;
    block[slots.queueFull] = 0;
    block[slots.unsent] = 0;
    this.fromBus.clearCounts(block);
    this.toBus.clearCounts(block);
    for (const receiver of this.receivers) receiver.clearCounts(block);
    for (const sender of this.senders) sender.clearCounts(block);
  }

  private pass(size: number): void {
    if (this.transport.send(this.outgoing, size) < 0) this.refusedSends += 1;
  }

  private judge(block: Float64Array, size: number): void {
    const { slots, incoming } = this;
    if (size === noteSize) {
      if (!useNote(block, slots, incoming)) block[slots.malformed] += 1;
      return;
    }
    const flexible = size === frameSizes.flexible;
    const length = incoming[4];
    if ((!flexible && size !== frameSizes.classic) || length > (flexible ? 64 : 8)) {
      block[slots.malformed] += 1;
      return;
    }
    const word = identifierWord(incoming);
    if ((word & identifierFlags.error) !== 0) {
      useErrorFrame(block, slots, word, incoming);
      return;
    }
    if ((word & identifierFlags.remote) !== 0) {
      block[slots.remote] += 1;
      return;
    }
    const index = this.table.find(word);
    if (index < 0) {
      block[slots.unknown] += 1;
      return;
    }
    const receiver = this.receivers[index];
    if (flexible !== (receiver.message.flexibleDataRate === true) || length !== receiver.codec.length) {
      block[slots.wrongLength] += 1;
      receiver.refuseLength(block);
      return;
    }
    if (receiver.accept(block, this.incomingPayload, length) > receptions.saturated) return;
    block[this.awake] = 1;
    block[slots.replies] += 1;
  }
}

/** The kernel filters that let through what the bench receives on a link and nothing else. */
export function kernelFilters(messages: readonly MessageSpec[], link: string): CanFilter[] {
  return messages
    .filter((message) => message.link === link && message.direction === 'received')
    .map((message) => ({
      identifier: message.identifier | (message.extended ? identifierFlags.extended : 0),
      mask:
        ((message.extended ? identifierMasks.extended : identifierMasks.standard) &
          (message.anyPriority ? ~priorityBits : -1)) |
        identifierFlags.extended |
        identifierFlags.remote,
    }));
}

/** Whether a link needs CAN FD. */
export function needsFlexibleDataRate(messages: readonly MessageSpec[], link: string): boolean {
  return messages.some((message) => message.link === link && message.flexibleDataRate === true);
}
