import type { BlockLayout } from '../runtime/block.js';
import type { PayloadCodec } from './can-codec.js';
import { checkByteOf } from './protection/make.js';
import { type Protector, wrongCheck } from './protection/protector.js';
import { ReceivedMessage, receptions } from './received-message.js';
import { fieldVerdicts } from './udp-codec.js';

/**
 * A message that comes by CAN. Where it is protected, a wrong checksum and a counter that did not move or went back keep
 * it from being used. A step of the counter up to the protection's `mostStep` is a gap; a wider one is taken for a
 * message out of order, and for a sender that started again when the next one follows on it.
 *
 * Signals that the selectors of a multiplexed message leave out keep their values.
 */
export class CanReceiver extends ReceivedMessage {
  readonly wrongChecksum: number;
  readonly wrongLength: number;
  private readonly last: number;
  private readonly checkByte: number;
  private readonly stray: number;

  constructor(
    readonly codec: PayloadCodec,
    private readonly protector: Protector | undefined,
    layout: BlockLayout,
  ) {
    super(codec.message, layout);
    const add = (name: string, initial = 0): number => layout.add(`${this.message.name}.${name}`, initial);
    this.wrongChecksum = add('wrongChecksum');
    this.wrongLength = add('wrongLength');
    this.last = add('lastCounter', -1);
    this.stray = add('strayCounter', -1);
    this.checkByte = checkByteOf(this.message);
    this.slots['wrongChecksum'] = this.wrongChecksum;
    this.slots['wrongLength'] = this.wrongLength;
  }

  /** A frame with this message's identifier and the right form; `payload` is `length` bytes long. One of `receptions`. */
  accept(memory: Float64Array, payload: Uint8Array, length: number): number {
    if (!this.codec.fits(length)) return this.refuseLength(memory);
    const { faults } = this;
    if (faults !== undefined) {
      if (faults.strikes(memory, faults.slots.faultLength)) return this.refuseLength(memory);
      if (this.checkByte >= 0 && faults.strikes(memory, faults.slots.faultChecksum)) payload[this.checkByte] ^= 1;
      else if (
        this.protector !== undefined &&
        memory[this.last] >= 0 &&
        faults.strikes(memory, faults.slots.faultCounter)
      )
        this.protector.protect(payload, length, memory[this.last] | 0);
    }
    if (this.protector !== undefined) {
      const counter = this.protector.check(payload, length);
      if (counter === wrongCheck) {
        memory[this.wrongChecksum] += 1;
        return receptions.refused;
      }
      if (this.protector.modulo > 0) {
        const place = this.place(memory, counter, this.protector.modulo, this.protector.mostStep);
        if (place !== receptions.used) return place;
      }
    }
    for (let i = 0; i < this.count; i += 1) this.fresh[i] = memory[this.values + i];
    const verdict = this.codec.read(payload, this.fresh, 0, length);
    if (verdict !== fieldVerdicts.fine) memory[this.outOfRange] += 1;
    if (verdict === fieldVerdicts.refused) return receptions.refused;
    this.hold(memory);
    return verdict === fieldVerdicts.saturated ? receptions.saturated : receptions.used;
  }

  refuseLength(memory: Float64Array): number {
    memory[this.wrongLength] += 1;
    return receptions.refused;
  }

  override clearCounts(memory: Float64Array): void {
    super.clearCounts(memory);
    memory[this.wrongChecksum] = 0;
    memory[this.wrongLength] = 0;
  }

  private place(memory: Float64Array, counter: number, modulo: number, mostStep: number): number {
    const last = memory[this.last];
    // Before the first message and after a time-out any counter begins anew.
    if (last < 0 || memory[this.alive] === 0) return this.follow(memory, counter);
    const step = (counter - last + modulo) % modulo;
    if (step === 0) {
      memory[this.duplicate] += 1;
      return receptions.duplicate;
    }
    if (step <= mostStep) {
      memory[this.lost] += step - 1;
      return this.follow(memory, counter);
    }
    const stray = memory[this.stray];
    if (stray >= 0 && (stray + 1) % modulo === counter) {
      memory[this.restarts] += 1;
      memory[this.late] -= 1;
      return this.follow(memory, counter);
    }
    memory[this.stray] = counter;
    memory[this.late] += 1;
    if (modulo - step <= mostStep && memory[this.lost] > 0) memory[this.lost] -= 1;
    return receptions.late;
  }

  private follow(memory: Float64Array, counter: number): number {
    memory[this.last] = counter;
    memory[this.stray] = -1;
    return receptions.used;
  }
}
