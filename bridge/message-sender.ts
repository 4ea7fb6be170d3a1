import type { BlockLayout } from '../runtime/block.js';
import { SentMessage } from './sent-message.js';
import type { Datagram, UdpCodec } from './udp-codec.js';

/** A message that goes by UDP, with its sequence. */
export class MessageSender extends SentMessage {
  private readonly sequence: number;

  constructor(
    readonly codec: UdpCodec,
    layout: BlockLayout,
    firstTick: number,
  ) {
    super(codec, layout, firstTick);
    this.sequence = layout.add(`${this.message.name}.sequence`);
  }

  /**
   * Writes the datagram if the message is due with values[from ..] (units of the map); its length, or -1 when it is not
   * due, or -2 when a value was not finite and it was therefore not written. `stamp` is the tick in the header.
   */
  write(
    memory: Float64Array,
    tick: number,
    values: Float64Array,
    from: number,
    datagram: Datagram,
    stamp: number,
  ): number {
    const prepared = this.prepare(memory, tick, values, from);
    if (prepared < 0) return prepared;
    const sequence = memory[this.sequence] | 0;
    memory[this.sequence] = (sequence + 1) | 0;
    return this.codec.write(datagram, sequence, stamp);
  }
}
