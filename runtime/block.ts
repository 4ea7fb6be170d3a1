/**
 * The block: every number that the run's future depends on, in one array. Solver states, discrete memory, held
 * commands, instrument memory, message values and ages, script and watch memory. It is hashed in every tick and
 * written whole every second, so that a run derived again can name the tick and then the slot that differs.
 */
export class BlockLayout {
  /** Names by range: windows of thousands of slots would otherwise cost a string each. */
  private readonly ranges: { readonly path: string; readonly at: number; readonly single: boolean }[] = [];
  private readonly first: number[] = [];

  get length(): number {
    return this.first.length;
  }

  /** Reserves one slot. `path` names it in messages about differences. */
  add(path: string, initial = 0): number {
    this.ranges.push({ path, at: this.first.length, single: true });
    this.first.push(initial);
    return this.first.length - 1;
  }

  /** Reserves `count` slots in a row, named path[0], path[1], ...; the index of the first. */
  addMany(path: string, count: number, initial = 0): number {
    const at = this.first.length;
    if (count > 0) this.ranges.push({ path, at, single: false });
    for (let i = 0; i < count; i += 1) this.first.push(initial);
    return at;
  }

  path(index: number): string {
    if (!(index >= 0 && index < this.first.length)) return `slot ${index}`;
    let low = 0;
    let high = this.ranges.length - 1;
    while (low < high) {
      const middle = (low + high + 1) >> 1;
      if (this.ranges[middle]!.at <= index) low = middle;
      else high = middle - 1;
    }
    const range = this.ranges[low]!;
    return range.single ? range.path : `${range.path}[${index - range.at}]`;
  }

  setInitial(index: number, value: number): void {
    this.first[index] = value;
  }

  /** A new block holding the initial values. */
  create(): Float64Array {
    return Float64Array.from(this.first);
  }
}

/**
 * 64-bit running mix over the bytes of a block, as two 32-bit halves written into `out`. Two multiplicative mixes in
 * the manner of MurmurHash3's body (public domain) over the low and high words; allocates nothing.
 */
export function hashBlock(words: Int32Array, out: Int32Array): void {
  let a = 0x243f6a88 | 0;
  let b = 0x85a308d3 | 0;
  const count = words.length;
  for (let i = 0; i < count; i += 2) {
    let low = Math.imul(words[i]!, 0xcc9e2d51);
    low = (low << 15) | (low >>> 17);
    a ^= Math.imul(low, 0x1b873593);
    a = (a << 13) | (a >>> 19);
    a = (Math.imul(a, 5) + 0xe6546b64) | 0;
    let high = Math.imul(words[i + 1]!, 0x38b34ae5);
    high = (high << 16) | (high >>> 16);
    b ^= Math.imul(high, 0xa1e38b93);
    b = (b << 17) | (b >>> 15);
    b = (Math.imul(b, 5) + 0x561ccd1b) | 0;
    a = (a + b) | 0;
    b = (b ^ a) | 0;
  }
  a ^= a >>> 16;
  a = Math.imul(a, 0x85ebca6b);
  a ^= a >>> 13;
  b ^= b >>> 16;
  b = Math.imul(b, 0xc2b2ae35);
  b ^= b >>> 13;
  out[0] = (a ^ b) | 0;
  out[1] = (b + Math.imul(a, 0x9e3779b1)) | 0;
}

/** Sixteen hexadecimal digits of a hash as written by `hashBlock`. */
export function hashText(low: number, high: number): string {
  return (high >>> 0).toString(16).padStart(8, '0') + (low >>> 0).toString(16).padStart(8, '0');
}
