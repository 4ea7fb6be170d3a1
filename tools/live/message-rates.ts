import type { MessageStatus } from '../../bridge/live/source.js';
import type { MessageSpec } from '../../bridge/message-map.js';
import type { BenchSpec } from '../../configs/bench-spec.js';

/** s over which rates are counted. */
const rateWindow = 1;
/** Counts that mean: something came that could not be used. */
const malformedCounts = ['malformed', 'wrongChecksum', 'wrongMap', 'wrongLength', 'outOfRange'];

interface Sample {
  readonly tick: number;
  readonly counts: Float64Array;
}

/**
 * Ages, rates and errors of messages from the counts that the exchange shows. What a link could not tell to be any
 * message counts with the first message that it brings.
 */
export class MessageRates {
  private readonly messages: readonly MessageSpec[];
  /** Count paths of each message's errors. */
  private readonly errors: readonly (readonly string[])[];
  private readonly samples: Sample[] = [];
  /** Tick at which the count of a message last rose; -1: never. */
  private readonly rose: Float64Array;

  constructor(private readonly spec: BenchSpec) {
    this.messages = spec.map.messages;
    this.rose = new Float64Array(this.messages.length).fill(-1);
    this.errors = this.messages.map((message) => {
      if (message.direction === 'sent') return [`${message.name}.unsendable`];
      const first = this.messages.find((other) => other.direction === 'received' && other.link === message.link);
      const owners = first === message ? [message.name, message.link] : [message.name];
      return owners.flatMap((owner) => malformedCounts.map((count) => `${owner}.${count}`));
    });
  }

  /** `value` gives what stands on the board by path. To be called now and then; rates are over the calls of a second. */
  status(tick: number, value: (path: string) => number | undefined): MessageStatus[] {
    const { step } = this.spec;
    const counts = Float64Array.from(
      this.messages,
      ({ name, direction }) => value(`${name}.${direction === 'sent' ? 'sent' : 'received'}`) ?? 0,
    );
    const before = this.remember(tick, counts);
    return this.messages.map(({ name, direction }, i) => {
      const count = counts[i]!;
      const time = (tick - before.tick) * step;
      const came = count - before.counts[i]!;
      const age = value(`${name}.age`);
      return {
        age: this.age(i, tick, direction === 'received' ? age : undefined, count),
        rate: time > 0 && came >= 0 ? came / time : 0,
        count,
        lost: value(`${name}.lost`) ?? 0,
        late: value(`${name}.late`) ?? 0,
        malformed: this.errors[i]!.reduce((sum, path) => sum + (value(path) ?? 0), 0),
        timedOut: (value(`${name}.timedOut`) ?? 0) > 0,
      };
    });
  }

  private age(i: number, tick: number, told: number | undefined, count: number): number {
    if (count === 0) return -1;
    if (told !== undefined) return told;
    const rose = this.rose[i]!;
    return rose < 0 ? -1 : (tick - rose) * this.spec.step;
  }

  /** The sample of about a second ago, or the oldest. */
  private remember(tick: number, counts: Float64Array): Sample {
    const { samples } = this;
    const last = samples.at(-1);
    for (let i = 0; i < counts.length; i += 1) if (counts[i]! > 0 && counts[i] !== last?.counts[i]) this.rose[i] = tick;
    if (last === undefined || tick > last.tick) samples.push({ tick, counts });
    // counts begin anew with tick 0
    if (last !== undefined && counts.some((count, i) => count < last.counts[i]!)) samples.splice(0, samples.length - 1);
    while (samples.length > 2 && (tick - samples[1]!.tick) * this.spec.step >= rateWindow) samples.shift();
    return samples[0]!;
  }
}
