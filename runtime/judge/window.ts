/**
 * Sliding windows over numbers that arrive one a tick, in slots of a Float64Array. Nothing here allocates; the cost of a
 * tick is amortised constant and at worst the logarithm of the window.
 */

/** The least power of two that is not below `count`. */
export function powerOfTwo(count: number): number {
  let size = 1;
  while (size < count) size *= 2;
  return size;
}

/** Slots of an extreme over `width + 1` ticks: head, tail, values, ticks. */
export function extremeSlots(width: number): number {
  return 2 + 2 * powerOfTwo(width + 1);
}

/**
 * Greatest (`sign` 1) or least (`sign` -1) of registers[from] over the last `width + 1` ticks into registers[to]: a
 * monotonic queue (Lemire 2006), in which those that a new value outdoes are found by galloping, so that a jump after a long
 * slope costs its logarithm. Zeros are ordered by sign.
 */
export function slideExtreme(
  memory: Float64Array,
  base: number,
  width: number,
  mask: number,
  sign: number,
  tick: number,
  registers: Float64Array,
  from: number,
  to: number,
): void {
  const values = base + 2;
  const ticks = values + mask + 1;
  let head = memory[base]! | 0;
  const tail = memory[base + 1]! | 0;
  const value = sign * registers[from]!;
  while (head < tail && memory[ticks + (head & mask)]! < tick - width) head += 1;
  let keep = head;
  let drop = tail;
  let stride = 1;
  while (drop > head) {
    const probe = Math.max(head, drop - stride);
    const other = memory[values + (probe & mask)]!;
    if (other > value || (other === value && 1 / other > 1 / value)) {
      keep = probe + 1;
      break;
    }
    drop = probe;
    stride *= 2;
  }
  while (keep < drop) {
    const middle = (keep + drop) >> 1;
    const other = memory[values + (middle & mask)]!;
    if (other > value || (other === value && 1 / other > 1 / value)) keep = middle + 1;
    else drop = middle;
  }
  memory[values + (drop & mask)] = value;
  memory[ticks + (drop & mask)] = tick;
  memory[base] = head;
  memory[base + 1] = drop + 1;
  registers[to] = sign * memory[values + (head & mask)]!;
}

/** Slots of an `until` over `width + 1` ticks: two for the running result and two trees. */
export function untilSlots(width: number): number {
  return 2 + 4 * powerOfTwo(width + 1);
}

/**
 * `left until [0, width] right` for the tick `width` back, into registers[to]. A stretch of ticks is summed up in a pair
 * (least left, until over the stretch); stretches join by (min(a1, a2), max(u1, min(a1, u2))), which is associative. The
 * pairs stand in a binary tree over a ring of ticks: one leaf renewed and one query a tick.
 */
export function slideUntil(
  memory: Float64Array,
  base: number,
  width: number,
  size: number,
  tick: number,
  registers: Float64Array,
  left: number,
  right: number,
  to: number,
): void {
  const least = base + 2;
  const until = least + 2 * size;
  const mask = size - 1;
  let node = size + (tick & mask);
  memory[least + node] = registers[left]!;
  memory[until + node] = registers[right]!;
  for (node >>= 1; node >= 1; node >>= 1) {
    const first = 2 * node;
    memory[least + node] = Math.min(memory[least + first]!, memory[least + first + 1]!);
    memory[until + node] = Math.max(
      memory[until + first]!,
      Math.min(memory[least + first]!, memory[until + first + 1]!),
    );
  }
  memory[base] = Infinity;
  memory[base + 1] = -Infinity;
  const begin = (tick - width) & mask;
  const end = tick & mask;
  if (begin <= end) {
    joinArc(memory, base, size, begin, end);
  } else {
    joinArc(memory, base, size, begin, mask);
    joinArc(memory, base, size, 0, end);
  }
  registers[to] = memory[base + 1]!;
}

/** Joins the leaves begin .. end behind the running result at `base`. */
function joinArc(memory: Float64Array, base: number, size: number, begin: number, end: number): void {
  const least = base + 2;
  const until = least + 2 * size;
  let low = begin + size;
  let high = end + size + 1;
  let frontLeast = memory[base]!;
  let frontUntil = memory[base + 1]!;
  let backLeast = Infinity;
  let backUntil = -Infinity;
  while (low < high) {
    if (low & 1) {
      frontUntil = Math.max(frontUntil, Math.min(frontLeast, memory[until + low]!));
      frontLeast = Math.min(frontLeast, memory[least + low]!);
      low += 1;
    }
    if (high & 1) {
      high -= 1;
      backUntil = Math.max(memory[until + high]!, Math.min(memory[least + high]!, backUntil));
      backLeast = Math.min(memory[least + high]!, backLeast);
    }
    low >>= 1;
    high >>= 1;
  }
  memory[base + 1] = Math.max(frontUntil, Math.min(frontLeast, backUntil));
  memory[base] = Math.min(frontLeast, backLeast);
}

/**
 * Adds source[index] times `sign` to the sum at `base` (value, correction) with Neumaier's correction (1974); the sum is
 * memory[base] + memory[base + 1]. The value comes by its place: a real number as an argument may be boxed.
 */
export function addTo(memory: Float64Array, base: number, source: Float64Array, index: number, sign: 1 | -1): void {
  const value = sign * source[index]!;
  const sum = memory[base]!;
  const next = sum + value;
  memory[base + 1] = memory[base + 1]! + (Math.abs(sum) >= Math.abs(value) ? sum - next + value : value - next + sum);
  memory[base] = next;
}
