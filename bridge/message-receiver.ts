import type { BlockLayout } from '../runtime/block.js';
import { ReceivedMessage, receptions } from './received-message.js';
import { type Datagram, fieldVerdicts, type UdpCodec } from './udp-codec.js';

/**
 * A step of the sequence larger than this, either way, is a sender that started again and not a gap. At 1 kHz it is a
 * second of silence, longer than any time-out of practice.
 */
const restartStep = 1024;

/**
 * A message that comes by UDP. A sequence window of 32 datagrams in the manner of RFC 4303 section 3.4.3 tells a
 * duplicate from one that is late.
 */
export class MessageReceiver extends ReceivedMessage {
  private readonly synchronised: number;
  private readonly expected: number;
  private readonly window: number;

  constructor(
    readonly codec: UdpCodec,
    layout: BlockLayout,
  ) {
    super(codec.message, layout);
    const add = (name: string): number => layout.add(`${this.message.name}.${name}`);
    this.synchronised = add('synchronised');
    this.expected = add('expected');
    this.window = add('window');
  }

  /** A sound datagram of this message: one of `receptions`. */
  accept(memory: Float64Array, datagram: Datagram, sequence: number): number {
    const place = this.place(memory, sequence);
    if (place !== receptions.used) return place;
    const verdict = this.codec.read(datagram, this.fresh, 0);
    if (verdict !== fieldVerdicts.fine) memory[this.outOfRange] += 1;
    if (verdict === fieldVerdicts.refused) return receptions.refused;
    this.hold(memory);
    return verdict === fieldVerdicts.saturated ? receptions.saturated : receptions.used;
  }

  /** The sender said that it has just started: its next sequence number is taken as it comes. */
  expectRestart(memory: Float64Array): void {
    memory[this.synchronised] = 0;
  }

  private place(memory: Float64Array, sequence: number): number {
    const next = (sequence + 1) | 0;
    if (memory[this.synchronised] === 0) {
      memory[this.synchronised] = 1;
      memory[this.expected] = next;
      memory[this.window] = 1;
      return receptions.used;
    }
    const ahead = (sequence - memory[this.expected]) | 0;
    if (ahead >= 0 && ahead <= restartStep) {
      memory[this.lost] += ahead;
      memory[this.window] = ahead >= 31 ? 1 : (memory[this.window] << (ahead + 1)) | 1;
      memory[this.expected] = next;
      return receptions.used;
    }
    const back = -1 - ahead;
    if (ahead < 0 && back < 32) {
      const bit = 1 << back;
      if ((memory[this.window] & bit) !== 0) {
        memory[this.duplicate] += 1;
        return receptions.duplicate;
      }
      memory[this.window] = memory[this.window] | bit;
      memory[this.late] += 1;
      if (memory[this.lost] > 0) memory[this.lost] -= 1;
      return receptions.late;
    }
    if (ahead < 0 && back < restartStep && memory[this.alive] === 1) {
      memory[this.late] += 1;
      return receptions.late;
    }
    memory[this.restarts] += 1;
    memory[this.expected] = next;
    memory[this.window] = 1;
    return receptions.used;
  }
}
