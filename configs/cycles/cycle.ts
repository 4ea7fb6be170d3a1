/** A drive cycle: speed over time by straight lines between breakpoints. */
export interface DriveCycle {
  readonly name: string;
  readonly source: string;
  /** s, rising */
  readonly times: readonly number[];
  /** m/s */
  readonly speeds: readonly number[];
}

/** A cycle from pairs of time, s, and speed, km/h. */
export function cycle(name: string, source: string, points: readonly (readonly [number, number])[]): DriveCycle {
  return { name, source, times: points.map(([time]) => time), speeds: points.map(([, speed]) => speed / 3.6) };
}

/** One cycle after the other; the last point of one is the first of the next. */
export function sequence(name: string, source: string, parts: readonly DriveCycle[]): DriveCycle {
  const times: number[] = [];
  const speeds: number[] = [];
  let offset = 0;
  for (const part of parts) {
    part.times.forEach((time, i) => {
      if (i === 0 && times.length > 0) return;
      times.push(offset + time);
      speeds.push(part.speeds[i]!);
    });
    offset += part.times.at(-1)!;
  }
  return { name, source, times, speeds };
}

/** Speed at a time, m/s: linear between breakpoints, the first value before them and the last after. Allocates nothing. */
export function speedAt(cycle: DriveCycle, time: number): number {
  const { times, speeds } = cycle;
  let low = 0;
  let high = times.length - 1;
  if (!(time > times[0]!)) return speeds[0]!;
  if (time >= times[high]!) return speeds[high]!;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (times[middle]! <= time) low = middle;
    else high = middle;
  }
  const share = (time - times[low]!) / (times[high]! - times[low]!);
  return speeds[low]! + share * (speeds[high]! - speeds[low]!);
}

/** s */
export function duration(cycle: DriveCycle): number {
  return cycle.times.at(-1)! - cycle.times[0]!;
}

/** Integral of the speed, m: exact for straight lines. */
export function distance(cycle: DriveCycle): number {
  let sum = 0;
  for (let i = 1; i < cycle.times.length; i += 1) {
    sum += 0.5 * (cycle.speeds[i]! + cycle.speeds[i - 1]!) * (cycle.times[i]! - cycle.times[i - 1]!);
  }
  return sum;
}

/** Greatest and least slope, m/s2. */
export function accelerations(cycle: DriveCycle): { readonly most: number; readonly least: number } {
  let most = 0;
  let least = 0;
  for (let i = 1; i < cycle.times.length; i += 1) {
    const slope = (cycle.speeds[i]! - cycle.speeds[i - 1]!) / (cycle.times[i]! - cycle.times[i - 1]!);
    most = Math.max(most, slope);
    least = Math.min(least, slope);
  }
  return { most, least };
}
