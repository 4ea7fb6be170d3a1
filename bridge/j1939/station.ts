import type { BlockLayout } from '../../runtime/block.js';
import { frameSizes, identifierFlags, payloadAt } from '../can-frame.js';
import type { CanReceiver } from '../can-receiver.js';
import type { CanSender } from '../can-sender.js';
import type { j1939Counts } from '../link-counts.js';
import { receptions } from '../received-message.js';
import { partsOf } from './identifier.js';
import { type AddressedUnit, compareNames, nameBytes } from './name.js';
import {
  controls,
  longestMessage,
  parameterGroups,
  protocolFrame,
  TransportReceiver,
  TransportSender,
  transportVerdicts,
} from './transport.js';

type Slots = Readonly<Record<keyof typeof j1939Counts, number>>;

/** Time after a claim in which an address of 128 to 247 may still be contested, s (SAE J1939-81). */
const contest = 0.25;
const nobody = 254;
const everybody = 255;
/** Requests that wait for `not available` at once; more are forgotten. */
const mostRefusals = 8;

/**
 * What one end of a link does by SAE J1939 of its own accord: answers requests for parameter groups (J1939-21, 5.4),
 * carries messages of more than 8 bytes (5.10), claims the addresses of its control units and defends them (J1939-81).
 * A unit that loses its address says that it cannot claim one and sends nothing more.
 */
export class Station {
  /** Place of the receiver whose long message was used last. */
  lastUsed = -1;
  private readonly addresses: Int32Array;
  private readonly groups: Int32Array;
  private readonly sources: Int32Array;
  private readonly transportSenders: readonly (TransportSender | undefined)[];
  private readonly transportReceivers: readonly (TransportReceiver | undefined)[];
  private readonly names: readonly Uint8Array[];
  /** Per unit, slots: tick in which its claim goes, tick from which it may send, 1 when it lost its address. */
  private readonly claims: Int32Array;
  private readonly free: Int32Array;
  private readonly lost: Int32Array;
  private readonly refusals: number;
  private readonly refusalCount: number;
  private readonly long = new Uint8Array(longestMessage);

  constructor(
    link: string,
    private readonly units: readonly AddressedUnit[],
    private readonly senders: readonly CanSender[],
    private readonly receivers: readonly CanReceiver[],
    layout: BlockLayout,
    private readonly slots: Slots,
    private readonly step: number,
    firstTick: number,
  ) {
    const parts = senders.map(({ message }) => partsOf(message.identifier));
    this.groups = Int32Array.from(senders, ({ message }, i) => (message.j1939 ? parts[i].pgn : -1));
    this.sources = Int32Array.from(parts, ({ source }) => source);
    const directed = receivers.flatMap(({ message }) => {
      const { destination } = partsOf(message.identifier);
      return message.j1939 && destination !== undefined && destination !== everybody ? [destination] : [];
    });
    const own = senders.flatMap(({ message }, i) => (message.j1939 ? [parts[i].source] : []));
    this.addresses = Int32Array.from(new Set([...units.map((unit) => unit.address), ...own, ...directed]));
    const long = (message: { readonly bytes?: number }): boolean => (message.bytes ?? 8) > 8;
    this.transportSenders = senders.map(({ message }) =>
      message.j1939 && long(message)
        ? new TransportSender(message.identifier, message.name, message.bytes!, layout, step)
        : undefined,
    );
    this.transportReceivers = receivers.map(({ message }) =>
      message.j1939 && long(message)
        ? new TransportReceiver(message.identifier, message.name, message.bytes!, layout, step)
        : undefined,
    );
    this.names = units.map((unit) => nameBytes(unit.name));
    this.claims = Int32Array.from(units, ({ unit }) => layout.add(`${link}.${unit}.claim`, firstTick));
    this.free = Int32Array.from(units, ({ unit }) => layout.add(`${link}.${unit}.free`, Infinity));
    this.lost = Int32Array.from(units, ({ unit }) => layout.add(`${link}.${unit}.lost`));
    this.refusals = layout.addMany(`${link}.refusals`, 3 * mostRefusals);
    this.refusalCount = layout.add(`${link}.refusalCount`);
  }

  /** Time-outs of messages that are being received. */
  grow(block: Float64Array, tick: number): void {
    for (let i = 0; i < this.transportReceivers.length; i += 1) {
      const receiver = this.transportReceivers[i];
      if (receiver !== undefined && receiver.grow(block, tick) === transportVerdicts.failed)
        block[this.slots.transportFailures] += 1;
    }
  }

  /**
   * A frame with 29 bits. `none` when it is nothing of the protocol and a message may be in it, `taken` when it was, or
   * the outcome of a long message that it completed.
   */
  hear(block: Float64Array, tick: number, word: number, payload: Uint8Array, length: number): number {
    const group = (word >> 8) & 0x3ff00;
    const destination = (word >> 8) & 0xff;
    const source = word & 0xff;
    if ((word & identifierFlags.extended) === 0) return heard.none;
    switch (group) {
      case parameterGroups.request:
        if (length < 3 || !(destination === everybody || this.isOwn(destination))) return heard.none;
        this.request(block, tick, payload[0] | (payload[1] << 8) | (payload[2] << 16), destination, source);
        return heard.taken;
      case parameterGroups.addressClaim:
        if (length !== 8) return heard.none;
        this.claimHeard(block, tick, source, payload);
        return heard.taken;
      case parameterGroups.connection:
        if (length !== 8 || !(destination === everybody || this.isOwn(destination))) return heard.none;
        return this.connection(block, tick, payload, destination, source);
      case parameterGroups.data:
        if (length !== 8 || !(destination === everybody || this.isOwn(destination))) return heard.none;
        return this.data(block, tick, payload, destination, source);
      default:
        return heard.none;
    }
  }

  /** Whether the unit that a sender speaks for may send now. */
  maySend(block: Float64Array, tick: number, sender: number): boolean {
    for (let u = 0; u < this.units.length; u += 1)
      if (this.units[u].address === this.sources[sender] && this.groups[sender] >= 0)
        return block[this.lost[u]] === 0 && tick >= block[this.free[u]];
    return true;
  }

  /** Sends a long message; false when the one before is still on its way or the sender has no room for it. */
  begin(block: Float64Array, tick: number, sender: number, bytes: Uint8Array, length: number): void {
    if (this.transportSenders[sender]?.begin(block, tick, bytes, length) !== true) block[this.slots.transportBusy] += 1;
  }

  /** The next frame of the protocol that goes in this tick, into `frame`; its size, or -1. */
  next(block: Float64Array, tick: number, frame: Uint8Array): number {
    if (this.writeClaim(block, tick, frame) || this.writeRefusal(block, frame)) return frameSizes.classic;
    for (let i = 0; i < this.transportReceivers.length; i += 1)
      if (this.transportReceivers[i]?.write(block, frame) === true) return frameSizes.classic;
    for (let i = 0; i < this.transportSenders.length; i += 1)
      if (this.transportSenders[i]?.write(block, tick, frame) === true) return frameSizes.classic;
    return -1;
  }

  private isOwn(address: number): boolean {
    for (let i = 0; i < this.addresses.length; i += 1) if (this.addresses[i] === address) return true;
    return false;
  }

  private request(block: Float64Array, tick: number, pgn: number, destination: number, source: number): void {
    block[this.slots.requests] += 1;
    if (pgn === parameterGroups.addressClaim) {
      for (let u = 0; u < this.units.length; u += 1)
        if (destination === everybody || this.units[u].address === destination) block[this.claims[u]] = tick;
      return;
    }
    let found = false;
    for (let i = 0; i < this.senders.length; i += 1)
      if (this.groups[i] === pgn && (destination === everybody || this.sources[i] === destination)) {
        found = true;
        this.senders[i].request(block);
      }
    // Only a request to one unit is refused, never one to everybody.
    if (found || destination === everybody) return;
    const waiting = block[this.refusalCount];
    if (waiting >= mostRefusals) return;
    const at = this.refusals + 3 * waiting;
    block[at] = pgn;
    block[at + 1] = destination;
    block[at + 2] = source;
    block[this.refusalCount] = waiting + 1;
  }

  private claimHeard(block: Float64Array, tick: number, source: number, payload: Uint8Array): void {
    for (let u = 0; u < this.units.length; u += 1) {
      if (this.units[u].address !== source || block[this.lost[u]] === 1) continue;
      if (compareNames(this.names[u], payload) <= 0) block[this.claims[u]] = tick;
      else {
        block[this.lost[u]] = 1;
        block[this.claims[u]] = tick;
        block[this.slots.addressesLost] += 1;
      }
    }
  }

  private connection(block: Float64Array, tick: number, payload: Uint8Array, own: number, source: number): number {
    const control = payload[0];
    const pgn = payload[5] | (payload[6] << 8) | (payload[7] << 16);
    if (control === controls.announce || control === controls.request) {
      if ((control === controls.announce) !== (own === everybody)) return heard.taken;
      const length = payload[1] | (payload[2] << 8);
      for (let i = 0; i < this.receivers.length; i += 1) {
        const receiver = this.transportReceivers[i];
        if (receiver === undefined || receiver.pgn !== pgn || receiver.source !== source) continue;
        const fits = this.receivers[i].codec.fits(length);
        if (!fits) this.receivers[i].refuseLength(block);
        if (receiver.open(block, tick, payload, own, fits) === transportVerdicts.failed)
          block[this.slots.transportFailures] += 1;
      }
      return heard.taken;
    }
    for (let i = 0; i < this.transportSenders.length; i += 1) {
      const sender = this.transportSenders[i];
      if (sender !== undefined && sender.pgn === pgn && sender.source === own && sender.destination === source)
        sender.hear(block, tick, payload);
    }
    if (control === controls.abort)
      for (let i = 0; i < this.transportReceivers.length; i += 1) {
        const receiver = this.transportReceivers[i];
        if (receiver !== undefined && receiver.pgn === pgn && receiver.source === source)
          if (receiver.aborted(block) === transportVerdicts.failed) block[this.slots.transportFailures] += 1;
      }
    return heard.taken;
  }

  private data(block: Float64Array, tick: number, payload: Uint8Array, own: number, source: number): number {
    for (let i = 0; i < this.transportReceivers.length; i += 1) {
      const receiver = this.transportReceivers[i];
      if (receiver === undefined || receiver.source !== source) continue;
      const verdict = receiver.take(block, tick, payload, own);
      if (verdict === transportVerdicts.failed) block[this.slots.transportFailures] += 1;
      if (verdict !== transportVerdicts.complete) continue;
      block[this.slots.longMessages] += 1;
      const length = receiver.read(block, this.long);
      if (this.receivers[i].accept(block, this.long, length) > receptions.saturated) return heard.taken;
      this.lastUsed = i;
      return heard.used;
    }
    return heard.taken;
  }

  private writeClaim(block: Float64Array, tick: number, frame: Uint8Array): boolean {
    for (let u = 0; u < this.units.length; u += 1) {
      if (tick < block[this.claims[u]]) continue;
      block[this.claims[u]] = Infinity;
      const { address } = this.units[u];
      const isLost = block[this.lost[u]] === 1;
      protocolFrame(frame, 6, parameterGroups.addressClaim, everybody, isLost ? nobody : address);
      for (let i = 0; i < 8; i += 1) frame[payloadAt + i] = this.names[u][i];
      // Addresses that industry groups assign may be used at once, the free ones only when nobody objected.
      const wait = address >= 128 && address <= 247 ? Math.ceil(contest / this.step) : 0;
      if (block[this.free[u]] === Infinity) block[this.free[u]] = tick + wait;
      return true;
    }
    return false;
  }

  /** Acknowledgement, control byte 1: not available. */
  private writeRefusal(block: Float64Array, frame: Uint8Array): boolean {
    const waiting = block[this.refusalCount];
    if (waiting === 0) return false;
    const at = this.refusals;
    const pgn = block[at] | 0;
    protocolFrame(frame, 6, parameterGroups.acknowledgement, everybody, block[at + 1] | 0);
    frame[payloadAt] = 1;
    frame[payloadAt + 4] = block[at + 2];
    frame[payloadAt + 5] = pgn;
    frame[payloadAt + 6] = pgn >> 8;
    frame[payloadAt + 7] = pgn >> 16;
    for (let i = 0; i < 3 * (waiting - 1); i += 1) block[at + i] = block[at + 3 + i];
    block[this.refusalCount] = waiting - 1;
    return true;
  }
}

/** What `hear` says of a frame. */
export const heard = { none: 0, taken: 1, used: 2 } as const;
