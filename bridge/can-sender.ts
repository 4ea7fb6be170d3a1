import type { BlockLayout } from '../runtime/block.js';
import { nextShorter } from './bus-adversary.js';
import type { PayloadCodec } from './can-codec.js';
import { frameFlags, frameSizes, identifierFlags, payloadAt, writeFrameHead } from './can-frame.js';
import { checkByteOf } from './protection/make.js';
import type { Protector } from './protection/protector.js';
import { SentMessage } from './sent-message.js';

/** A message that goes by CAN, with its counter and checksum where it has them. */
export class CanSender extends SentMessage {
  private readonly counter: number;
  private readonly checkByte: number;
  private readonly word: number;
  private readonly flags: number;
  private readonly size: number;

  constructor(
    readonly codec: PayloadCodec,
    private readonly protector: Protector | undefined,
    layout: BlockLayout,
    firstTick: number,
  ) {
    // Of a message that the bench receives `outOfRange` says what the bench does, not what its sender does.
    super(codec, layout, firstTick, codec.message.direction === 'sent' && codec.message.outOfRange === 'refuse');
    const { message } = this;
    this.checkByte = checkByteOf(message);
    this.counter = layout.add(`${message.name}.counter`);
    this.word = message.identifier | (message.extended ? identifierFlags.extended : 0);
    const flexible = message.flexibleDataRate === true;
    this.size = flexible ? frameSizes.flexible : frameSizes.classic;
    this.flags = flexible ? frameFlags.flexible | (message.bitRateSwitch ? frameFlags.bitRateSwitch : 0) : 0;
  }

  /**
   * Writes the frame if the message is due with values[from ..] (units of the map); its size (16 or 72), or -1 when it is
   * not due, or -2 when it was not written because of a value. `payload` is the frame from its payload on.
   */
  write(
    memory: Float64Array,
    tick: number,
    values: Float64Array,
    from: number,
    frame: Uint8Array,
    payload: Uint8Array,
  ): number {
    const length = this.fill(memory, tick, values, from, payload);
    if (length < 0) return length;
    const { faults } = this;
    const short = faults?.strikes(memory, faults.slots.faultLength) === true;
    return this.frame(frame, short ? nextShorter(length) : length);
  }

  /** Writes the payload alone, as `write` does; its length, -1 or -2. */
  fill(memory: Float64Array, tick: number, values: Float64Array, from: number, payload: Uint8Array): number {
    const prepared = this.prepare(memory, tick, values, from);
    if (prepared < 0) return prepared;
    const length = this.codec.write(payload);
    const { protector, faults } = this;
    if (protector !== undefined) {
      const { modulo } = protector;
      let counter = memory[this.counter] | 0;
      if (faults?.strikes(memory, faults.slots.faultCounter))
        counter = counter === 0 ? Math.max(0, modulo - 1) : counter - 1;
      protector.protect(payload, length, counter);
      memory[this.counter] = counter + 1 >= modulo ? 0 : counter + 1;
      if (this.checkByte >= 0 && faults?.strikes(memory, faults.slots.faultChecksum)) payload[this.checkByte] ^= 1;
    }
    return length;
  }

  /** Writes what stands around a payload of `length` bytes; the size of the frame. */
  frame(frame: Uint8Array, length: number): number {
    writeFrameHead(frame, this.word, length, this.flags);
    for (let i = payloadAt + length; i < this.size; i += 1) frame[i] = 0;
    return this.size;
  }
}
