import type { BenchSpec } from '../../configs/bench-spec.js';
import { formatNumber } from '../../configs/units.js';
import { driveTraceMetrics, excursions, regressionFaults, speedRegression } from '../../runtime/drive-trace.js';
import type { Fact } from './data.js';

/** Signals that the quality of the drive is told from; undefined without a driver. */
export function driveSignals(spec: BenchSpec): { target: string; driven: string } | undefined {
  const driver = spec.instruments.find((one) => one.kind.kind === 'driver');
  const target = driver?.inputs['target'];
  const driven = driver?.inputs['velocity'];
  return target === undefined || driven === undefined ? undefined : { target, driven };
}

/**
 * How well the driver followed the drive, so that a bad result is not the driver's fault: the metrics of SAE J2951 at 10 Hz with the
 * road load that the driver reckons with, the regression of 40 CFR 1037.555 and the band of 40 CFR 600.109-08. Empty when
 * there was nothing to follow.
 */
export function driveFacts(spec: BenchSpec, target: ArrayLike<number>, driven: ArrayLike<number>): Fact[] {
  const stride = Math.max(1, Math.round(0.1 / spec.step));
  const count = Math.floor(target.length / stride);
  const wanted = Float64Array.from({ length: count }, (_, i) => target[i * stride]!);
  const had = Float64Array.from({ length: count }, (_, i) => driven[i * stride]!);
  const top = wanted.reduce((most, speed) => Math.max(most, speed), 0);
  if (count < 30 || !(top > 0.5) || had.some(Number.isNaN)) return [];
  const driver = spec.instruments.find((one) => one.kind.kind === 'driver')!.parameters;
  const step = stride * spec.step;
  const load = {
    constant: driver['constantLoad'] ?? 0,
    linear: 0,
    quadratic: driver['quadraticLoad'] ?? 0,
    effectiveMass: 1.015 * (driver['mass'] ?? 0),
  };
  const metrics = driveTraceMetrics(had, wanted, step, load);
  const regression = speedRegression(had, wanted);
  const faults = regressionFaults(regression, top);
  const outside = excursions(had, wanted, step);
  // A drive that only brakes asks no energy to compare with.
  const percent = (value: number) => (Number.isFinite(value) ? `${value.toFixed(2)} %` : 'the drive asks none');
  return [
    { name: 'Energy rating (J2951)', value: percent(metrics.energyRating) },
    { name: 'Distance rating', value: percent(metrics.distanceRating) },
    { name: 'Energy economy rating', value: percent(metrics.energyEconomyRating) },
    { name: 'Absolute speed change rating', value: percent(metrics.absoluteSpeedChangeRating) },
    { name: 'Inertial work rating', value: percent(metrics.inertialWorkRating) },
    { name: 'Root mean square speed error', value: `${formatNumber(metrics.rootMeanSquareSpeedError * 3.6, 3)} km/h` },
    {
      name: 'Speed regression (40 CFR 1037.555)',
      value: `slope ${regression.slope.toFixed(4)}, intercept ${regression.intercept.toFixed(3)} m/s, standard error ${regression.standardError.toFixed(3)} m/s, r² ${regression.determination.toFixed(4)}: ${faults.length === 0 ? 'accepted' : faults.join('; ')}`,
    },
    {
      name: 'Outside the band of 40 CFR 600.109-08',
      value:
        outside.length === 0
          ? 'never'
          : outside.map((one) => `${one.from.toFixed(1)} to ${one.until.toFixed(1)} s`).join(', '),
    },
  ];
}
