/**
 * A histogram of durations with fixed buckets over memory that threads may share: one thread records, any may read.
 * Buckets are 1 ns wide up to 128 ns and then 1/64 of the value's octave (an error of at most 1.6 %), up to 2^44 ns (4.9 h);
 * what is longer counts in the last bucket. Recording allocates nothing.
 */
const LINEAR = 128;
const PER_OCTAVE = 64;
const OCTAVES = 37;
const BUCKETS = LINEAR + OCTAVES * PER_OCTAVE;
/** Float64 slots ahead of the buckets: count, sum, largest. */
const HEAD = 3;

export interface DurationSummary {
  /** All µs. */
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
}

export class Histogram {
  static readonly bytes = HEAD * 8 + BUCKETS * 4 + ((HEAD * 8 + BUCKETS * 4) % 8);
  private readonly head: Float64Array;
  private readonly buckets: Uint32Array;

  constructor(memory: ArrayBufferLike = new ArrayBuffer(Histogram.bytes), offset = 0) {
    this.head = new Float64Array(memory, offset, HEAD);
    this.buckets = new Uint32Array(memory, offset + HEAD * 8, BUCKETS);
  }

  /** Records times[index], ns. Negative counts as 0; NaN is not counted. */
  record(times: Float64Array, index: number): void {
    const value = times[index]!;
    if (Number.isNaN(value)) return;
    const bucket = bucketOf(value);
    this.buckets[bucket] = this.buckets[bucket]! + 1;
    this.head[0] = this.head[0]! + 1;
    this.head[1] = this.head[1]! + value;
    if (value > this.head[2]!) this.head[2] = value;
  }

  reset(): void {
    this.head.fill(0);
    this.buckets.fill(0);
  }

  get count(): number {
    return this.head[0]!;
  }

  /** Mean, µs; 0 when nothing was recorded. */
  get mean(): number {
    return this.count > 0 ? this.head[1]! / this.count / 1e3 : 0;
  }

  /** Largest, µs. */
  get max(): number {
    return this.head[2]! / 1e3;
  }

  /** The value, µs, that `share` (0..1) of the records do not exceed: the upper edge of its bucket, at most the largest. */
  quantile(share: number): number {
    const wanted = Math.max(1, Math.ceil(share * this.count));
    if (this.count === 0) return 0;
    let seen = 0;
    for (let i = 0; i < BUCKETS; i += 1) {
      seen += this.buckets[i]!;
      if (seen >= wanted) return i === BUCKETS - 1 ? this.max : Math.min(upperEdge(i), this.head[2]!) / 1e3;
    }
    return this.max;
  }

  /** Upper edge, µs, and count of each bucket that is not empty. */
  counts(): [number, number][] {
    const list: [number, number][] = [];
    for (let i = 0; i < BUCKETS; i += 1)
      if (this.buckets[i]! > 0) list.push([Math.min(upperEdge(i), this.head[2]!) / 1e3, this.buckets[i]!]);
    return list;
  }

  summary(): DurationSummary {
    return { p50: this.quantile(0.5), p99: this.quantile(0.99), p999: this.quantile(0.999), max: this.max };
  }
}

function bucketOf(value: number): number {
  if (value < LINEAR) return value > 0 ? value | 0 : 0;
  // Scale values beyond 31 bits down by 2^24 so that whole-number operations see them.
  let scaled = value;
  let octave = 0;
  if (scaled >= 2147483648) {
    scaled = scaled / 16777216;
    octave = 24;
    if (scaled >= 1048576) return BUCKETS - 1;
  }
  const whole = scaled | 0;
  const top = 31 - Math.clz32(whole);
  octave += top - 7;
  const part = (whole >> (top - 6)) - PER_OCTAVE;
  return LINEAR + octave * PER_OCTAVE + part;
}

function upperEdge(bucket: number): number {
  if (bucket < LINEAR) return bucket + 1;
  const octave = Math.floor((bucket - LINEAR) / PER_OCTAVE);
  const part = (bucket - LINEAR) % PER_OCTAVE;
  return 2 ** (octave + 7) * (1 + (part + 1) / PER_OCTAVE);
}
