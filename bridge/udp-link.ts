import type { BlockLayout } from '../runtime/block.js';
import { type Journal, noJournal } from '../runtime/journal.js';
import type { Link } from './link.js';
import { udpLinkCounts } from './link-counts.js';
import type { LinkSpec, MessageSpec } from './message-map.js';
import { MessageReceiver } from './message-receiver.js';
import { MessageSender } from './message-sender.js';
import { receptions } from './received-message.js';
import { noTransport, type Transport } from './transport.js';
import { Datagram, UdpCodec, UdpInbox, verdicts, writeControl } from './udp-codec.js';
import { header, kinds } from './udp-layout.js';

/**
 * The bench's end of one UDP link: drains the transport into the receivers, writes what is due. The work of a tick is
 * bounded: at most `datagramsPerTick` are taken, the rest waits in the transport, so that a flood cannot delay a step.
 */
export class UdpLink implements Link {
  transport: Transport = noTransport;
  journal: Journal = noJournal;
  readonly senders: readonly MessageSender[];
  readonly receivers: readonly MessageReceiver[];
  readonly slots: Readonly<Record<keyof typeof udpLinkCounts, number>>;
  /** Slot: 1 once a message was used. */
  readonly awake: number;
  /** Sends that the transport did not accept. It depends on the machine and not on inputs: not part of the block. */
  refusedSends = 0;
  private readonly inbox: UdpInbox;
  private readonly incoming: Datagram;
  private readonly outgoing: Datagram;

  constructor(
    readonly spec: LinkSpec,
    readonly number: number,
    messages: readonly MessageSpec[],
    private readonly mapChecksum: number,
    layout: BlockLayout,
    firstTick: number,
    private readonly datagramsPerTick: number,
  ) {
    const own = messages.filter((message) => message.link === spec.name);
    const codecs = own.map((message) => new UdpCodec(message, mapChecksum));
    const received = codecs.filter((codec) => codec.message.direction === 'received');
    this.receivers = received.map((codec) => new MessageReceiver(codec, layout));
    this.senders = codecs
      .filter((codec) => codec.message.direction === 'sent')
      .map((codec) => new MessageSender(codec, layout, firstTick));
    this.inbox = new UdpInbox(received, mapChecksum);
    this.incoming = new Datagram(this.inbox.capacity);
    this.outgoing = new Datagram(Math.max(64, ...codecs.map((codec) => codec.length)));
    const slots = {} as Record<keyof typeof udpLinkCounts, number>;
    for (const name of Object.keys(udpLinkCounts) as (keyof typeof udpLinkCounts)[])
      slots[name] = layout.add(`${spec.name}.${name}`);
    this.slots = slots;
    this.awake = layout.add(`${spec.name}.awake`);
  }

  /**
   * Takes what waits. Each datagram goes to the journal before anything is believed of it, cut to one byte more than
   * the longest that the link knows: longer ones are wrong whatever follows.
   */
  take(block: Float64Array, tick: number): void {
    const capacity = this.incoming.capacity;
    for (let i = 0; i < this.receivers.length; i += 1) this.receivers[i].grow(block);
    let taken = 0;
    while (taken < this.datagramsPerTick) {
      const whole = this.transport.poll(this.incoming.bytes);
      if (whole < 0) break;
      const length = Math.min(whole, capacity);
      this.journal.input(tick, this.number, this.incoming.bytes, length);
      this.judge(block, tick, length);
      taken += 1;
    }
    block[this.slots.received] += taken;
    if (taken === this.datagramsPerTick) block[this.slots.floods] += 1;
  }

  /** Writes sender number `index` with values[from ..] when it is due, and sends it. */
  send(block: Float64Array, tick: number, index: number, values: Float64Array, from: number): void {
    const length = this.senders[index].write(block, tick, values, from, this.outgoing, tick);
    if (length >= 0) this.pass(length);
  }

  flush(_block: Float64Array, _tick: number): void {}

  /** Tells the controller that the bench starts: sequences and ages begin again. */
  hello(tick: number): void {
    this.pass(writeControl(this.outgoing, kinds.hello, 0, tick, this.mapChecksum));
  }

  clearCounts(block: Float64Array): void {
    const slots = this.slots;
    block[slots.received] = 0;
    block[slots.malformed] = 0;
    block[slots.wrongChecksum] = 0;
    block[slots.wrongMap] = 0;
    block[slots.wrongLength] = 0;
    block[slots.floods] = 0;
    block[slots.hellos] = 0;
    block[slots.replies] = 0;
    block[slots.oneStepReplies] = 0;
    for (const receiver of this.receivers) receiver.clearCounts(block);
    for (const sender of this.senders) sender.clearCounts(block);
  }

  private pass(length: number): void {
    if (this.transport.send(this.outgoing.bytes, length) < 0) this.refusedSends += 1;
  }

  private judge(block: Float64Array, tick: number, length: number): void {
    const slots = this.slots;
    switch (this.inbox.inspect(this.incoming, length)) {
      case verdicts.sound:
        this.use(block, tick);
        break;
      case verdicts.wrongChecksum:
        block[slots.wrongChecksum] += 1;
        break;
      case verdicts.wrongMap:
        block[slots.wrongMap] += 1;
        break;
      case verdicts.wrongLength:
        block[slots.wrongLength] += 1;
        break;
      default:
        block[slots.malformed] += 1;
    }
  }

  private use(block: Float64Array, tick: number): void {
    const view = this.incoming.view;
    const kind = view.getUint8(header.kind);
    if (kind === kinds.message) {
      const receiver = this.receivers[this.inbox.index(this.incoming)];
      const reception = receiver.accept(block, this.incoming, view.getInt32(header.sequence, true));
      if (reception > receptions.saturated) return;
      block[this.awake] = 1;
      block[this.slots.replies] += 1;
      if (((view.getInt32(header.tick, true) - tick + 1) | 0) === 0) block[this.slots.oneStepReplies] += 1;
    } else if (kind === kinds.hello) {
      block[this.slots.hellos] += 1;
      for (let i = 0; i < this.receivers.length; i += 1) this.receivers[i].expectRestart(block);
    } else if (kind === kinds.end) {
      // Only the bench ends a tick.
      block[this.slots.malformed] += 1;
    }
  }
}
