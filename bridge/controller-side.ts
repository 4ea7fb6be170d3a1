import { BlockLayout } from '../runtime/block.js';
import { nearest } from '../runtime/signals.js';
import { requireSoundMap } from './examine-map.js';
import type { MessageMap, MessageSpec } from './message-map.js';
import { MessageReceiver } from './message-receiver.js';
import { MessageSender } from './message-sender.js';
import { receptions } from './received-message.js';
import type { Transport } from './transport.js';
import { Datagram, UdpCodec, UdpInbox, verdicts, writeControl } from './udp-codec.js';
import { header, kinds, mapChecksum } from './udp-layout.js';

/**
 * A controller in TypeScript: one function that reads what the bench sent and writes what it wants. Values in the units
 * of the map; `ControllerMirror` says which place holds what. What is written stays until it is written again.
 */
export interface ControllerModule {
  step(tick: number, read: Float64Array, write: Float64Array): void;
  /** The bench has started again: forget everything. */
  restart?(): void;
}

/**
 * The mirror of a map: what the bench sends on a link (or several) is what a controller reads, and the other way round.
 * `read` holds the signals of all messages in map order and then the age of each message in ticks, Infinity before it
 * came first. `write` holds the signals of all messages in map order; they begin with the substitutes.
 */
export class ControllerMirror {
  readonly inbound: readonly MessageSpec[];
  readonly outbound: readonly MessageSpec[];
  readonly readPaths: readonly string[];
  readonly writePaths: readonly string[];

  constructor(map: MessageMap, link: string | readonly string[]) {
    const links = typeof link === 'string' ? [link] : link;
    const own = map.messages.filter((message) => links.includes(message.link));
    if (own.length === 0)
      throw new Error(
        `the map has no messages on link ${links.join(' or ')}; its links: ${map.links.map((one) => one.name).join(', ')}`,
      );
    const paths = (messages: readonly MessageSpec[]): string[] =>
      messages.flatMap((message) => message.signals.map((signal) => `${message.name}.${signal.name}`));
    this.inbound = own.filter((message) => message.direction === 'sent');
    this.outbound = own.filter((message) => message.direction === 'received');
    this.readPaths = [...paths(this.inbound), ...this.inbound.map((message) => `${message.name}.age`)];
    this.writePaths = paths(this.outbound);
  }

  /** Place in `read` of `message.signal` or `message.age`. */
  readIndex(path: string): number {
    return place(this.readPaths, path, 'sends');
  }

  /** Place in `write` of `message.signal`. */
  writeIndex(path: string): number {
    return place(this.writePaths, path, 'receives');
  }
}

export interface ControllerEndpointOptions {
  readonly map: MessageMap;
  readonly link: string;
  readonly controller: ControllerModule;
  /** Sends the first `length` bytes to the bench; the bytes are used again afterwards. */
  readonly send: (bytes: Uint8Array, length: number) => void;
  /** `live`: answers each trigger message at once. `lockstep`: answers each `end`. */
  readonly mode: 'live' | 'lockstep';
  /** Live: the message that triggers; default: of those with the shortest cycle the last in map order. */
  readonly trigger?: string;
}

/**
 * The controller's end of a UDP link, without a socket: give it each datagram that came, it steps the controller and
 * sends what is due, by the same codec and the same schedule as the bench. One class for a module in the loop thread
 * and for a process of its own. Allocates nothing after it is made.
 */
export class ControllerEndpoint {
  readonly mirror: ControllerMirror;
  readonly read: Float64Array;
  readonly write: Float64Array;
  /** Datagrams that were not used, of whatever fault. */
  refused = 0;
  private readonly memory: Float64Array;
  private readonly initial: Float64Array;
  private readonly receivers: readonly MessageReceiver[];
  private readonly senders: readonly MessageSender[];
  private readonly inbox: UdpInbox;
  private readonly incoming: Datagram;
  private readonly outgoing: Datagram;
  private readonly checksum: number;
  private readonly came: Float64Array;
  private readonly trigger: number;
  /** The tick by which the controller goes: the bench's newest, or beyond it while nothing is heard. */
  private tick = Number.NEGATIVE_INFINITY;
  /** The newest tick that the bench has said, for the echo. */
  private heard = 0;
  /** Lockstep: the tick of the last barrier. */
  private ended = Number.NEGATIVE_INFINITY;
  private controlSequence = 0;

  constructor(private readonly options: ControllerEndpointOptions) {
    const { map, link } = options;
    requireSoundMap(map);
    this.mirror = new ControllerMirror(map, link);
    this.checksum = mapChecksum(map);
    const layout = new BlockLayout();
    const codec = (message: MessageSpec): UdpCodec => new UdpCodec(message, this.checksum);
    const inbound = this.mirror.inbound.map(codec);
    this.receivers = inbound.map((one) => new MessageReceiver(one, layout));
    this.senders = this.mirror.outbound.map(
      (message) => new MessageSender(codec(message), layout, Number.NEGATIVE_INFINITY),
    );
    this.inbox = new UdpInbox(inbound, this.checksum);
    this.incoming = new Datagram(this.inbox.capacity);
    this.outgoing = new Datagram(Math.max(64, ...this.senders.map((sender) => sender.codec.length)));
    this.memory = layout.create();
    this.initial = layout.create();
    this.came = new Float64Array(inbound.length).fill(Number.NEGATIVE_INFINITY);
    this.read = new Float64Array(this.mirror.readPaths.length);
    this.write = new Float64Array(this.mirror.writePaths.length);
    this.trigger = this.findTrigger();
    this.reset();
  }

  /** Says `I have just started`; to be repeated until something comes. */
  hello(): void {
    this.control(kinds.hello, 0);
  }

  /** Drains a transport through `receive`. */
  pump(transport: Transport): void {
    for (;;) {
      const length = transport.poll(this.incoming.bytes);
      if (length < 0) return;
      this.judge(Math.min(length, this.incoming.capacity));
    }
  }

  /** One datagram from the bench, as it came. */
  receive(bytes: Uint8Array, length: number): void {
    const kept = Math.min(length, this.incoming.capacity);
    for (let i = 0; i < kept; i += 1) this.incoming.bytes[i] = bytes[i];
    this.judge(kept);
  }

  /**
   * Live, when nothing came for a while by the controller's own clock: as if the bench had gone on by `ticks` without a
   * word. Ages grow, the controller steps once, and what would be due is sent, as a control unit on its own timer does.
   */
  elapse(ticks: number): void {
    this.tick = (this.tick === Number.NEGATIVE_INFINITY ? 0 : this.tick) + ticks;
    this.answer(ticks);
  }

  private judge(length: number): void {
    if (this.inbox.inspect(this.incoming, length) !== verdicts.sound) {
      this.refused += 1;
      return;
    }
    const view = this.incoming.view;
    const tick = view.getInt32(header.tick, true);
    const kind = view.getUint8(header.kind);
    if (kind === kinds.hello) this.restart();
    else if (kind === kinds.end) {
      this.tick = tick;
      this.heard = tick;
      if (this.options.mode === 'lockstep') {
        // One barrier may stand for several ticks: what fell due in any of them goes out. The first stands for its own.
        const passed = this.ended === Number.NEGATIVE_INFINITY ? 1 : tick - this.ended;
        this.ended = tick;
        this.answer(passed > 0 && passed < longestBarrier ? passed : 1);
        this.control(kinds.done, tick);
      }
    } else if (kind === kinds.message) this.use(tick);
  }

  private use(tick: number): void {
    const index = this.inbox.index(this.incoming);
    const reception = this.receivers[index].accept(
      this.memory,
      this.incoming,
      this.incoming.view.getInt32(header.sequence, true),
    );
    if (reception > receptions.saturated) {
      this.refused += 1;
      return;
    }
    // The bench went back in time without a hello that arrived: it is another run.
    if (tick < this.tick - backwards) this.restart();
    this.came[index] = tick;
    if (tick > this.tick) this.tick = tick;
    this.heard = tick;
    if (this.options.mode === 'live' && index === this.trigger) this.answer(1);
  }

  /** Steps the controller and sends, once, each message that fell due in the last `ticks` ticks. */
  private answer(ticks: number): void {
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
        const length = sender.write(memory, due, write, from, this.outgoing, this.heard);
        if (length < 0) continue;
        this.options.send(this.outgoing.bytes, length);
        break;
      }
      from += sender.codec.count;
    }
  }

  private control(kind: number, tick: number): void {
    this.options.send(
      this.outgoing.bytes,
      writeControl(this.outgoing, kind, this.controlSequence, tick, this.checksum),
    );
    this.controlSequence = (this.controlSequence + 1) | 0;
  }

  private restart(): void {
    this.reset();
    this.options.controller.restart?.();
  }

  /** As at the start. The own sequences go on: the bench sees no jump. */
  private reset(): void {
    const { memory, initial } = this;
    for (let i = 0; i < this.receivers.length; i += 1) {
      this.receivers[i].expectRestart(memory);
      for (let k = 0; k < this.receivers[i].codec.count; k += 1)
        memory[this.receivers[i].values + k] = initial[this.receivers[i].values + k];
      this.came[i] = Number.NEGATIVE_INFINITY;
    }
    for (let i = 0; i < this.senders.length; i += 1) this.senders[i].forget(memory);
    let at = 0;
    for (let i = 0; i < this.senders.length; i += 1) {
      const signals = this.senders[i].message.signals;
      for (let k = 0; k < signals.length; k += 1) this.write[at + k] = signals[k].substitute;
      at += signals.length;
    }
    this.tick = Number.NEGATIVE_INFINITY;
    this.heard = 0;
    this.ended = Number.NEGATIVE_INFINITY;
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

/** Ticks that one barrier of lockstep stands for at most; a wider step of the tick is another run. */
const longestBarrier = 256;

/** Ticks by which a message may carry an older tick than one before it and still be of the same run. */
const backwards = 1024;

function place(paths: readonly string[], path: string, does: string): number {
  const index = paths.indexOf(path);
  if (index < 0)
    throw new Error(`the bench ${does} no ${path}; near: ${nearest(path, paths, 3).join(', ') || paths.join(', ')}`);
  return index;
}
