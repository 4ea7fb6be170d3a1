/**
 * How well a trace of speed was driven: the metrics of SAE J2951, the regression of 40 CFR 1037.555 and the tolerance
 * band of 40 CFR 600.109-08. Evaluated after a run, on recorded signals; speeds in m/s, equal steps.
 */

/** Road load and inertia that the energy metrics reckon with. */
export interface TraceLoad {
  /** N */
  readonly constant: number;
  /** N s/m */
  readonly linear: number;
  /** N s2/m2 */
  readonly quadratic: number;
  /** Effective mass Me, kg: 1.015 times the equivalent test weight. */
  readonly effectiveMass: number;
}

/** Sums over one trace. */
export interface TraceSums {
  /** Cycle energy: positive part of the tractive force times distance, J. */
  readonly cycleEnergy: number;
  /** Inertial work: positive part of Me a times distance, J. */
  readonly inertialWork: number;
  /** Absolute speed change, m/s. */
  readonly absoluteSpeedChange: number;
  /** m */
  readonly distance: number;
}

/** Metrics of a driven trace against its target; percent where not said otherwise. */
export interface DriveTraceMetrics {
  readonly energyRating: number;
  readonly distanceRating: number;
  readonly energyEconomyRating: number;
  readonly absoluteSpeedChangeRating: number;
  readonly inertialWorkRating: number;
  /** m/s */
  readonly rootMeanSquareSpeedError: number;
}

/** Moving average over five samples, applied twice, shortened at the ends (preparation of a trace at 10 Hz). */
export function smoothTrace(speeds: ArrayLike<number>): Float64Array {
  const once = average(speeds);
  return average(once);
}

function average(speeds: ArrayLike<number>): Float64Array {
  const out = new Float64Array(speeds.length);
  for (let i = 0; i < out.length; i += 1) {
    const half = Math.min(2, i, out.length - 1 - i);
    let sum = 0;
    for (let k = i - half; k <= i + half; k += 1) sum += speeds[k]!;
    out[i] = sum / (2 * half + 1);
  }
  return out;
}

/** Sums of a trace with `step` seconds between samples; acceleration by central differences. */
export function traceSums(speeds: ArrayLike<number>, step: number, load: TraceLoad): TraceSums {
  let cycleEnergy = 0;
  let inertialWork = 0;
  let absoluteSpeedChange = 0;
  let way = 0;
  const last = speeds.length - 1;
  for (let i = 0; i <= last; i += 1) {
    const speed = speeds[i]!;
    const low = Math.max(0, i - 1);
    const high = Math.min(last, i + 1);
    const acceleration = high > low ? (speeds[high]! - speeds[low]!) / ((high - low) * step) : 0;
    const length = i === 0 || i === last ? 0.5 * step : step;
    const inertial = load.effectiveMass * acceleration;
    const force = load.constant + load.linear * speed + load.quadratic * speed * speed + inertial;
    if (speed > 0) cycleEnergy += Math.max(0, force) * speed * length;
    inertialWork += Math.max(0, inertial) * speed * length;
    absoluteSpeedChange += Math.abs(acceleration) * length;
    way += speed * length;
  }
  return { cycleEnergy, inertialWork, absoluteSpeedChange, distance: way };
}

/** Energy economy rating from energy and distance rating, percent. */
export function energyEconomyRating(energyRating: number, distanceRating: number): number {
  return 100 * (1 - (distanceRating / 100 + 1) / (energyRating / 100 + 1));
}

/** SAE J2951 metrics of traces sampled alike (10 Hz for the standard's own numbers), smoothed as the standard has it. */
export function driveTraceMetrics(
  driven: ArrayLike<number>,
  target: ArrayLike<number>,
  step: number,
  load: TraceLoad,
): DriveTraceMetrics {
  if (driven.length !== target.length)
    throw new Error(`driven trace has ${driven.length} samples, target ${target.length}: sample both alike`);
  const d = smoothTrace(driven);
  const t = smoothTrace(target);
  const ofDriven = traceSums(d, step, load);
  const ofTarget = traceSums(t, step, load);
  const rating = (key: keyof TraceSums) => (100 * (ofDriven[key] - ofTarget[key])) / ofTarget[key];
  let squares = 0;
  for (let i = 0; i < d.length; i += 1) squares += (d[i]! - t[i]!) ** 2;
  const energyRating = rating('cycleEnergy');
  const distanceRating = rating('distance');
  return {
    energyRating,
    distanceRating,
    energyEconomyRating: energyEconomyRating(energyRating, distanceRating),
    absoluteSpeedChangeRating: rating('absoluteSpeedChange'),
    inertialWorkRating: rating('inertialWork'),
    rootMeanSquareSpeedError: Math.sqrt(squares / d.length),
  };
}

/** Least squares line driven = intercept + slope target, its standard error of estimate and r squared. */
export interface SpeedRegression {
  readonly slope: number;
  /** m/s */
  readonly intercept: number;
  /** m/s */
  readonly standardError: number;
  readonly determination: number;
}

export function speedRegression(driven: ArrayLike<number>, target: ArrayLike<number>): SpeedRegression {
  const n = target.length;
  if (driven.length !== n || n < 3)
    throw new Error(`${driven.length} driven and ${n} target samples: give at least 3, as many of each`);
  let sx = 0;
  let sy = 0;
  for (let i = 0; i < n; i += 1) {
    sx += target[i]!;
    sy += driven[i]!;
  }
  const mx = sx / n;
  const my = sy / n;
  let xx = 0;
  let xy = 0;
  let yy = 0;
  for (let i = 0; i < n; i += 1) {
    const x = target[i]! - mx;
    const y = driven[i]! - my;
    xx += x * x;
    xy += x * y;
    yy += y * y;
  }
  const slope = xy / xx;
  const rest = Math.max(0, yy - slope * xy);
  return { slope, intercept: my - slope * mx, standardError: Math.sqrt(rest / (n - 2)), determination: 1 - rest / yy };
}

/** What a regression misses of 40 CFR 1037.555 (hybrid powertrain bench), empty when it is accepted. `topSpeed` in m/s. */
export function regressionFaults(regression: SpeedRegression, topSpeed: number): string[] {
  const faults: string[] = [];
  const { slope, intercept, standardError, determination } = regression;
  if (!(slope >= 0.95 && slope <= 1.03)) faults.push(`slope ${slope.toFixed(4)} outside 0.950 .. 1.030`);
  if (!(Math.abs(intercept) <= 0.02 * topSpeed))
    faults.push(`intercept ${intercept.toFixed(3)} m/s above 2.0 % of ${topSpeed.toFixed(2)} m/s`);
  if (!(standardError <= 0.05 * topSpeed))
    faults.push(`standard error ${standardError.toFixed(3)} m/s above 5 % of ${topSpeed.toFixed(2)} m/s`);
  if (!(determination >= 0.97)) faults.push(`r squared ${determination.toFixed(4)} below 0.970`);
  return faults;
}

/** A stretch of time outside the band, s. */
export interface Excursion {
  readonly from: number;
  readonly until: number;
}

/**
 * Stretches outside the band that lies `tolerance` (m/s) above the highest and below the lowest target within
 * +/- `reach` seconds. 40 CFR 600.109-08: 2 mph, 1 s; stretches shorter than 2 s are allowed.
 */
export function excursions(
  driven: ArrayLike<number>,
  target: ArrayLike<number>,
  step: number,
  tolerance = 0.89408,
  reach = 1,
): Excursion[] {
  const found: Excursion[] = [];
  const wide = Math.round(reach / step);
  let since = -1;
  for (let i = 0; i <= target.length; i += 1) {
    let outside = false;
    if (i < target.length) {
      let highest = Number.NEGATIVE_INFINITY;
      let lowest = Number.POSITIVE_INFINITY;
      for (let k = Math.max(0, i - wide); k <= Math.min(target.length - 1, i + wide); k += 1) {
        highest = Math.max(highest, target[k]!);
        lowest = Math.min(lowest, target[k]!);
      }
      outside = driven[i]! > highest + tolerance || driven[i]! < lowest - tolerance;
    }
    if (outside && since < 0) since = i;
    if (!outside && since >= 0) {
      found.push({ from: since * step, until: i * step });
      since = -1;
    }
  }
  return found;
}
