/** One column of a picture: index of the first and last sample, and where the least and the greatest stand. */
export interface Column {
  readonly first: number;
  readonly least: number;
  readonly greatest: number;
  readonly last: number;
}

/**
 * At most `columns` columns over the samples, none of which is lost: each column knows its first, least, greatest and last, so that a
 * spike of a single sample stays. Values that are no number are passed over; a column of nothing else is left out.
 */
export function decimate(values: ArrayLike<number>, columns: number): Column[] {
  const count = values.length;
  const width = Math.max(1, Math.ceil(count / Math.max(1, columns)));
  const found: Column[] = [];
  for (let begin = 0; begin < count; begin += width) {
    const end = Math.min(count, begin + width);
    let first = -1;
    let last = -1;
    let least = -1;
    let greatest = -1;
    for (let i = begin; i < end; i += 1) {
      const value = values[i]!;
      if (!Number.isFinite(value)) continue;
      if (first < 0) first = i;
      last = i;
      if (least < 0 || value < values[least]!) least = i;
      if (greatest < 0 || value > values[greatest]!) greatest = i;
    }
    if (first >= 0) found.push({ first, least, greatest, last });
  }
  return found;
}

/** The samples to draw, in order of time, each once. */
export function drawnSamples(values: ArrayLike<number>, columns: number): number[] {
  const drawn: number[] = [];
  for (const { first, least, greatest, last } of decimate(values, columns)) {
    for (const index of [first, Math.min(least, greatest), Math.max(least, greatest), last]) {
      if (drawn.length === 0 || index > drawn[drawn.length - 1]!) drawn.push(index);
    }
  }
  return drawn;
}
