import type { BlockLayout } from '../runtime/block.js';
import { type Journal, noJournal } from '../runtime/journal.js';
import { BusAdversary, type linkFaults } from './bus-adversary.js';
import { reportBusOff, useErrorFrame, useNote } from './can-bus-state.js';
import { frameSizes, identifierFlags, identifierMasks, identifierWord, payloadAt, payloadRoom } from './can-frame.js';
import { noteSize } from './can-notes.js';
import { CanReceiver } from './can-receiver.js';
import { CanSender } from './can-sender.js';
import type { CanFilter } from './can-socket.js';
import { IdentifierTable } from './identifier-table.js';
import { priorityBits } from './j1939/identifier.js';
import { heard, Station } from './j1939/station.js';
import { longestMessage, parameterGroups } from './j1939/transport.js';
import type { Link } from './link.js';
import { canLinkCounts, j1939Counts } from './link-counts.js';
import type { LinkSpec, MessageSpec } from './message-map.js';
import { makeCodec } from './payload-codec.js';
import { makeProtector } from './protection/make.js';
import { receptions } from './received-message.js';
import { noTransport, type Transport } from './transport.js';

type Slots = Readonly<Record<keyof typeof canLinkCounts | keyof typeof j1939Counts, number> & Record<string, number>>;

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
  /** Slots of the commands of the link as a whole, by the names of `linkFaults`. */
  readonly faults: Readonly<Record<keyof typeof linkFaults, number>>;
  private readonly isOff: number;
  private readonly table: IdentifierTable;
  /** What it does by SAE J1939; undefined where nothing on it is of that. */
  private readonly station: Station | undefined;
  private readonly long = new Uint8Array(longestMessage);
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
    this.receivers = received.map((message) => new CanReceiver(makeCodec(message), makeProtector(message), layout));
    this.senders = own
      .filter((message) => message.direction === 'sent')
      .map((message) => new CanSender(makeCodec(message), makeProtector(message), layout, firstTick));
    this.table = new IdentifierTable(received);
    const slots: Record<string, number> = {};
    for (const name of Object.keys({ ...canLinkCounts, ...j1939Counts }))
      slots[name] = layout.add(`${spec.name}.${name}`);
    this.fromBus = new BusAdversary(spec.name, 'received', layout, step, seed, 2000 + 2 * number);
    this.toBus = new BusAdversary(spec.name, 'sent', layout, step, seed, 2001 + 2 * number);
    this.adversaries = [this.fromBus, this.toBus];
    for (const { way, counts } of this.adversaries)
      for (const [name, slot] of Object.entries(counts)) slots[`${way}${name}`] = slot;
    this.slots = slots as Slots;
    const speaksJ1939 = own.some((message) => message.j1939) || (spec.units ?? []).length > 0;
    this.station = speaksJ1939
      ? new Station(spec.name, spec.units ?? [], this.senders, this.receivers, layout, this.slots, step, firstTick)
      : undefined;
    this.awake = layout.add(`${spec.name}.awake`);
    this.faults = { reportBusOff: layout.add(`${spec.name}.reportBusOff`) };
    this.isOff = layout.add(`${spec.name}.isOff`);
  }

  /** Takes what waits. Each frame goes to the journal before anything is believed of it. */
  take(block: Float64Array, tick: number): void {
    const { incoming } = this;
    for (let i = 0; i < this.receivers.length; i += 1) this.receivers[i].grow(block);
    this.station?.grow(block, tick);
    const off = block[this.faults.reportBusOff] >= 0.5;
    if (off !== (block[this.isOff] === 1)) {
      block[this.isOff] = off ? 1 : 0;
      reportBusOff(block, this.slots, off);
    }
    let taken = 0;
    let frames = 0;
    this.fromBus.beginFlood(block);
    while (taken < this.framesPerTick) {
      const size = this.fromBus.nextFlood(block, incoming);
      if (size < 0) break;
      taken += 1;
      frames += 1;
      if (!off) this.judge(block, tick, size);
    }
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
        (off || this.fromBus.acts(block))
      ) {
        if (off) this.fromBus.lose(block);
        else this.fromBus.push(block, tick, incoming, whole);
      } else this.judge(block, tick, whole);
      for (
        let size = this.fromBus.next(block, tick, incoming);
        size >= 0;
        size = this.fromBus.next(block, tick, incoming)
      )
        this.judge(block, tick, size);
    }
    for (
      let size = this.fromBus.next(block, tick, incoming);
      size >= 0;
      size = this.fromBus.next(block, tick, incoming)
    )
      this.judge(block, tick, size);
    block[this.slots.received] += frames;
    if (taken === this.framesPerTick) block[this.slots.floods] += 1;
  }

  send(block: Float64Array, tick: number, index: number, values: Float64Array, from: number): void {
    const { outgoing, station } = this;
    const sender = this.senders[index];
    if (station === undefined || sender.message.j1939 !== true) {
      const size = sender.write(block, tick, values, from, outgoing, this.outgoingPayload);
      if (size >= 0) this.leave(block, tick, size);
      return;
    }
    if (!station.maySend(block, tick, index)) return;
    const length = sender.fill(block, tick, values, from, this.long);
    if (length < 0) return;
    if (length > 8) station.begin(block, tick, index, this.long, length);
    else {
      for (let i = 0; i < length; i += 1) this.outgoingPayload[i] = this.long[i];
      this.leave(block, tick, sender.frame(outgoing, length));
    }
  }

  /** After all messages of a tick: what the protocol sends by itself, and what the bus held back. */
  flush(block: Float64Array, tick: number): void {
    const { outgoing, station, toBus } = this;
    if (station !== undefined)
      for (let i = 0; i < mostProtocolFrames; i += 1) {
        const size = station.next(block, tick, outgoing);
        if (size < 0) break;
        this.leave(block, tick, size);
      }
    toBus.beginFlood(block);
    for (let size = toBus.nextFlood(block, outgoing); size >= 0; size = toBus.nextFlood(block, outgoing))
      if (block[this.isOff] === 0) this.pass(size);
    if (!toBus.acts(block)) return;
    for (let next = toBus.next(block, tick, outgoing); next >= 0; next = toBus.next(block, tick, outgoing))
      this.pass(next);
  }

  /** A frame of the bench on its way to the bus. */
  private leave(block: Float64Array, tick: number, size: number): void {
    const { outgoing, toBus } = this;
    if (block[this.isOff] === 1) {
      toBus.lose(block);
      return;
    }
    if (!toBus.acts(block)) {
      this.pass(size);
      return;
    }
    toBus.push(block, tick, outgoing, size);
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
    block[slots.requests] = 0;
    block[slots.longMessages] = 0;
    block[slots.transportFailures] = 0;
    block[slots.transportBusy] = 0;
    block[slots.addressesLost] = 0;
    this.fromBus.clearCounts(block);
    this.toBus.clearCounts(block);
    for (const receiver of this.receivers) receiver.clearCounts(block);
    for (const sender of this.senders) sender.clearCounts(block);
  }

  private pass(size: number): void {
    if (this.transport.send(this.outgoing, size) < 0) this.refusedSends += 1;
  }

  private judge(block: Float64Array, tick: number, size: number): void {
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
    if (this.station !== undefined) {
      const outcome = this.station.hear(block, tick, word, this.incomingPayload, length);
      if (outcome === heard.used) {
        block[this.awake] = 1;
        block[slots.replies] += 1;
      }
      if (outcome !== heard.none) return;
    }
    const index = this.table.find(word);
    if (index < 0) {
      block[slots.unknown] += 1;
      return;
    }
    const receiver = this.receivers[index];
    if (flexible !== (receiver.message.flexibleDataRate === true) || !receiver.codec.fits(length)) {
      block[slots.wrongLength] += 1;
      receiver.refuseLength(block);
      return;
    }
    if (receiver.accept(block, this.incomingPayload, length) > receptions.saturated) return;
    block[this.awake] = 1;
    block[slots.replies] += 1;
  }
}

/** Frames of the protocol that leave in one tick at most. */
const mostProtocolFrames = 8;

/** The kernel filters that let through what the bench receives on a link and nothing else. */
export function kernelFilters(messages: readonly MessageSpec[], link: string): CanFilter[] {
  const own = messages.filter((message) => message.link === link);
  const protocol = own.some((message) => message.j1939)
    ? Object.values(parameterGroups).map((pgn) => ({
        identifier: (pgn << 8) | identifierFlags.extended,
        // the parameter group alone: not the priority, the destination, the source
        mask: 0x03ff0000 | identifierFlags.extended | identifierFlags.remote,
      }))
    : [];
  return own
    .filter((message) => message.direction === 'received')
    .map((message) => ({
      identifier: message.identifier | (message.extended ? identifierFlags.extended : 0),
      mask:
        ((message.extended ? identifierMasks.extended : identifierMasks.standard) &
          (message.anyPriority ? ~priorityBits : -1)) |
        identifierFlags.extended |
        identifierFlags.remote,
    }))
    .concat(protocol);
}

/** Whether a link needs CAN FD. */
export function needsFlexibleDataRate(messages: readonly MessageSpec[], link: string): boolean {
  return messages.some((message) => message.link === link && message.flexibleDataRate === true);
}
