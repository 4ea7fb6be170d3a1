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
 * 64-bit mix over the words of a block, as two 32-bit halves written into `out`: four lanes side by side, each word
 * exclusive-or'd into its lane, multiplied by an odd number and turned, in the manner of xxHash (public domain); at the
 * end the lanes are folded with the avalanche of MurmurHash3 (public domain). Four lanes, because one would wait for its own
 * multiplication. Allocates nothing.
 */
export function hashBlock(words: Int32Array, out: Int32Array): void {
  let a = 0x243f6a88 | 0;
  let b = 0x85a308d3 | 0;
  let c = 0x13198a2e | 0;
  let d = 0x03707344 | 0;
  const count = words.length;
  const fours = count & ~3;
  for (let i = 0; i < fours; i += 4) {
    a = Math.imul(a ^ words[i]!, 0x9e3779b1);
    b = Math.imul(b ^ words[i + 1]!, 0x85ebca77);
    c = Math.imul(c ^ words[i + 2]!, 0xc2b2ae3d);
    d = Math.imul(d ^ words[i + 3]!, 0x27d4eb2f);
    a = (a << 13) | (a >>> 19);
    b = (b << 15) | (b >>> 17);
    c = (c << 17) | (c >>> 15);
    d = (d << 11) | (d >>> 21);
  }
  for (let i = fours; i < count; i += 1) {
    a = Math.imul(a ^ words[i]!, 0x9e3779b1);
    a = (a << 13) | (a >>> 19);
  }
  a = avalanche(a ^ count);
  b = avalanche((b + a) | 0);
  c = avalanche((c + b) | 0);
  d = avalanche((d + c) | 0);
  out[0] = (a ^ c) | 0;
  out[1] = (b + Math.imul(d, 0x9e3779b1)) | 0;
}

function avalanche(x: number): number {
  let h = x;
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return h ^ (h >>> 16);
}

/** Sixteen hexadecimal digits of a hash as written by `hashBlock`. */
export function hashText(low: number, high: number): string {
  return (high >>> 0).toString(16).padStart(8, '0') + (low >>> 0).toString(16).padStart(8, '0');
}
