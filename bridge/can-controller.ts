import { BlockLayout } from '../runtime/block.js';
import { frameSizes, identifierFlags, identifierWord, payloadAt, payloadRoom } from './can-frame.js';
import { CanReceiver } from './can-receiver.js';
import { CanSender } from './can-sender.js';
import { ControllerMirror, type ControllerModule } from './controller-side.js';
import { requireSoundMap } from './examine-map.js';
import { IdentifierTable } from './identifier-table.js';
import { heard, Station } from './j1939/station.js';
import { longestMessage } from './j1939/transport.js';
import { j1939Counts } from './link-counts.js';
import type { MessageMap } from './message-map.js';
import { makeCodec } from './payload-codec.js';
import { makeProtector } from './protection/make.js';
import { receptions } from './received-message.js';
import type { Transport } from './transport.js';

export interface CanControllerOptions {
  readonly map: MessageMap;
  /** The CAN links that the controller is on, all of one block of values. */
  readonly links: readonly string[];
  readonly controller: ControllerModule;
  /** Length of a tick, s; default 1 ms. Of use to the time-outs of SAE J1939 alone. */
  readonly step?: number;
  /** Sends the first `size` bytes on link number `link` of `links`; the bytes are used again afterwards. */
  readonly send: (link: number, frame: Uint8Array, size: number) => void;
  /** The message that the controller answers at once; default: of those with the shortest cycle the last in map order. */
  readonly trigger?: string;
}

/**
 * The controller's end of CAN links, without a socket: give it each frame that came, it steps the controller and sends
 * what is due, by the same codec, protection and schedule as the bench.
 *
 * CAN frames carry no tick. A process of its own counts its time by the trigger message, one cycle for each that came;
 * a module in the loop thread is told the tick by `step`. Allocates nothing after it is made.
 */
export class CanControllerEndpoint {
  readonly mirror: ControllerMirror;
  readonly read: Float64Array;
  readonly write: Float64Array;
  /** Frames that were not used, of whatever fault. */
  refused = 0;
  private readonly memory: Float64Array;
  private readonly initial: Float64Array;
  private readonly receivers: readonly CanReceiver[];
  private readonly senders: readonly CanSender[];
  /** Link number of each sender. */
  private readonly senderLinks: Int32Array;
  private readonly tables: readonly IdentifierTable[];
  /** Per link: receiver of each place of its table. */
  private readonly places: readonly Int32Array[];
  /** What it does by SAE J1939, per link; undefined where nothing on it is of that. */
  private readonly stations: readonly (Station | undefined)[];
  /** Place of each sender among those of its link. */
  private readonly senderPlaces: Int32Array;
  private readonly long = new Uint8Array(longestMessage);
  private readonly incoming = new Uint8Array(frameSizes.flexible);
  private readonly incomingPayload = this.incoming.subarray(payloadAt);
  private readonly outgoing = new Uint8Array(frameSizes.flexible);
  private readonly outgoingPayload = this.outgoing.subarray(payloadAt);
  private readonly came: Float64Array;
  private readonly trigger: number;
  private readonly triggerEvery: number;
  private tick = 0;

  constructor(private readonly options: CanControllerOptions) {
    const { map, links } = options;
    requireSoundMap(map);
    this.mirror = new ControllerMirror(map, links);
    const { inbound, outbound } = this.mirror;
    const layout = new BlockLayout();
    this.receivers = inbound.map((message) => new CanReceiver(makeCodec(message), makeProtector(message), layout));
    this.senders = outbound.map(
      (message) => new CanSender(makeCodec(message), makeProtector(message), layout, Number.NEGATIVE_INFINITY),
    );
    this.senderLinks = Int32Array.from(outbound, (message) => links.indexOf(message.link));
    this.tables = links.map((link) => new IdentifierTable(inbound.filter((message) => message.link === link)));
    this.places = links.map((link) =>
      Int32Array.from(inbound.flatMap((message, i) => (message.link === link ? [i] : []))),
    );
    const step = options.step ?? 1e-3;
    this.stations = links.map((link) => {
      const senders = this.senders.filter((sender) => sender.message.link === link);
      const receivers = this.receivers.filter((receiver) => receiver.message.link === link);
      if (![...senders, ...receivers].some(({ message }) => message.j1939)) return undefined;
      const slots = Object.fromEntries(Object.keys(j1939Counts).map((name) => [name, layout.add(`${link}.${name}`)]));
      return new Station(
        link,
        [],
        senders,
        receivers,
        layout,
        slots as Record<keyof typeof j1939Counts, number>,
        step,
        Number.NEGATIVE_INFINITY,
      );
    });
    this.senderPlaces = Int32Array.from(this.senders, (sender, i) =>
      this.senders
        .slice(0, i)
        .reduce((before, other) => before + (other.message.link === sender.message.link ? 1 : 0), 0),
    );
    this.memory = layout.create();
    this.initial = this.memory.slice();
    this.came = new Float64Array(inbound.length).fill(Number.NEGATIVE_INFINITY);
    this.read = new Float64Array(this.mirror.readPaths.length);
    this.write = new Float64Array(this.mirror.writePaths.length);
    this.substitute();
    this.trigger = this.findTrigger();
    this.triggerEvery = this.trigger < 0 ? 1 : Math.max(1, inbound[this.trigger].every);
  }

  /** The controller begins anew, as after a break of its supply. */
  restart(): void {
    this.memory.set(this.initial);
    this.came.fill(Number.NEGATIVE_INFINITY);
    this.substitute();
    this.options.controller.restart?.();
  }

  /** One frame of 16 or 72 bytes that came on link number `link`. Answers it when it is the trigger message. */
  receive(link: number, frame: Uint8Array, size: number): void {
    const index = this.use(link, frame, size);
    if (index < 0) return;
    if (index === this.trigger) {
      this.tick += this.triggerEvery;
      this.came[index] = this.tick;
      this.answer(this.triggerEvery);
    } else this.came[index] = this.tick;
  }

  /** Takes all that waits on link number `link`, without answering. */
  pump(link: number, transport: Transport): void {
    for (;;) {
      const size = transport.poll(this.incoming);
      if (size < 0) return;
      const index = this.use(link, this.incoming, size);
      if (index >= 0) this.came[index] = this.tick;
    }
  }

  /** The tick is `tick`: what is pumped from now on came in it. */
  setTick(tick: number): void {
    this.tick = tick;
  }

  /** Steps the controller and sends, once, each message that fell due in the last `ticks` ticks. */
  answer(ticks: number): void {
    const { memory, read, write, tick } = this;
    let at = 0;
    for (let i = 0; i < this.receivers.length; i += 1) {
      const receiver = this.receivers[i];
      for (let k = 0; k < receiver.codec.count; k += 1) read[at + k] = memory[receiver.values + k];
      at += receiver.codec.count;
    }
    for (let i = 0; i < this.receivers.length; i += 1) read[at + i] = tick - this.came[i];
    this.options.controller.step(tick, read, write);
    let from = 0;
    for (let i = 0; i < this.senders.length; i += 1) {
      const sender = this.senders[i];
      for (let due = tick - ticks + 1; due <= tick; due += 1) {
        const size = this.compose(i, due, from);
        if (size < 0) continue;
        if (size > 0) this.options.send(this.senderLinks[i], this.outgoing, size);
        break;
      }
      from += sender.count;
    }
    for (let l = 0; l < this.stations.length; l += 1) {
      const station = this.stations[l];
      if (station === undefined) continue;
      station.grow(memory, tick);
      for (
        let size = station.next(memory, tick, this.outgoing);
        size >= 0;
        size = station.next(memory, tick, this.outgoing)
      )
        this.options.send(l, this.outgoing, size);
    }
  }

  /** Sender `i` in tick `due`: size of a frame to send, 0 when it goes in packets, or what SentMessage says. */
  private compose(i: number, due: number, from: number): number {
    const { memory, write } = this;
    const sender = this.senders[i];
    if (sender.message.j1939 !== true)
      return sender.write(memory, due, write, from, this.outgoing, this.outgoingPayload);
    const length = sender.fill(memory, due, write, from, this.long);
    if (length < 0) return length;
    if (length > 8) {
      this.stations[this.senderLinks[i]]!.begin(memory, this.tick, this.senderPlaces[i], this.long, length);
      return 0;
    }
    for (let k = 0; k < length; k += 1) this.outgoingPayload[k] = this.long[k];
    return sender.frame(this.outgoing, length);
  }

  /** When nothing came for a while by the controller's own clock: time goes on by `ticks`, and what is due is sent. */
  elapse(ticks: number): void {
    this.tick += ticks;
    this.answer(ticks);
  }

  private substitute(): void {
    let at = 0;
    for (const message of this.mirror.outbound)
      for (const signal of message.signals) this.write[at++] = signal.substitute;
  }

  /** Index of the message that a frame carried and that was used, or -1. */
  private use(link: number, frame: Uint8Array, size: number): number {
    const room = payloadRoom(size);
    if (room < 0 || frame[4] > room) {
      this.refused += 1;
      return -1;
    }
    const word = identifierWord(frame);
    if ((word & (identifierFlags.error | identifierFlags.remote)) !== 0) return -1;
    const station = this.stations[link];
    if (frame !== this.incoming) for (let i = 0; i < size; i += 1) this.incoming[i] = frame[i];
    if (station !== undefined) {
      const outcome = station.hear(this.memory, this.tick, word, this.incomingPayload, frame[4]);
      if (outcome === heard.used) return this.places[link][station.lastUsed];
      if (outcome !== heard.none) return -1;
    }
    const place = this.tables[link].find(word);
    if (place < 0) return -1;
    const index = this.places[link][place];
    const receiver = this.receivers[index];
    if (
      (size === frameSizes.flexible) !== (receiver.message.flexibleDataRate === true) ||
      receiver.accept(this.memory, this.incomingPayload, this.incoming[4]) > receptions.saturated
    ) {
      this.refused += 1;
      return -1;
    }
    return index;
  }

  private findTrigger(): number {
    const { inbound } = this.mirror;
    if (this.options.trigger !== undefined) {
      const index = inbound.findIndex((message) => message.name === this.options.trigger);
      if (index < 0)
        throw new Error(
          `the bench sends no message ${this.options.trigger}; it sends: ${inbound.map((one) => one.name).join(', ')}`,
        );
      return index;
    }
    let best = -1;
    inbound.forEach((message, i) => {
      if (message.every > 0 && (best < 0 || message.every <= inbound[best].every)) best = i;
    });
    return best;
  }
}
