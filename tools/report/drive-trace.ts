import type { BenchSpec } from '../../configs/bench-spec.js';
import { formatNumber } from '../../configs/units.js';
import { driveTraceMetrics, excursions, regressionFaults, speedRegression } from '../../runtime/drive-trace.js';
import type { DriveQuality } from '../../runtime/run-summary.js';
import type { Fact } from './data.js';

/** Signals that the quality of the drive is told from; undefined without a driver. */
export function driveSignals(spec: BenchSpec): { target: string; driven: string } | undefined {
  const driver = spec.instruments.find((one) => one.kind.kind === 'driver');
  const target = driver?.inputs['target'];
  const driven = driver?.inputs['velocity'];
  return target === undefined || driven === undefined ? undefined : { target, driven };
}

/** Ticks between the samples that the metrics are reckoned from: 10 Hz. */
export function driveStride(step: number): number {
  return Math.max(1, Math.round(0.1 / step));
}

/**
 * How well the driver followed the drive, so that a bad result is not the driver's fault: the metrics of SAE J2951 at 10 Hz with the
 * road load that the driver reckons with, the regression of 40 CFR 1037.555 and the band of 40 CFR 600.109-08. `wanted` and `had`:
 * one value every `driveStride` ticks, m/s. null when there was nothing to follow.
 */
export function driveQuality(spec: BenchSpec, wanted: Float64Array, had: Float64Array): DriveQuality | null {
  const top = wanted.reduce((most, speed) => Math.max(most, speed), 0);
  if (wanted.length < 30 || !(top > 0.5) || had.some(Number.isNaN)) return null;
  const driver = spec.instruments.find((one) => one.kind.kind === 'driver')!.parameters;
  const step = driveStride(spec.step) * spec.step;
  const load = {
    constant: driver['constantLoad'] ?? 0,
    linear: 0,
    quadratic: driver['quadraticLoad'] ?? 0,
    effectiveMass: 1.015 * (driver['mass'] ?? 0),
  };
  const metrics = driveTraceMetrics(had, wanted, step, load);
  const regression = speedRegression(had, wanted);
  // A drive that only brakes asks no energy to compare with.
  const percent = (value: number) => (Number.isFinite(value) ? value : null);
  return {
    energyRating: percent(metrics.energyRating),
    distanceRating: percent(metrics.distanceRating),
    energyEconomyRating: percent(metrics.energyEconomyRating),
    absoluteSpeedChangeRating: percent(metrics.absoluteSpeedChangeRating),
    inertialWorkRating: percent(metrics.inertialWorkRating),
    rootMeanSquareSpeedError: metrics.rootMeanSquareSpeedError,
    regression: {
      slope: regression.slope,
      intercept: regression.intercept,
      standardError: regression.standardError,
      determination: regression.determination,
      faults: regressionFaults(regression, top),
    },
    outside: excursions(had, wanted, step).map(({ from, until }) => ({ from, until })),
  };
}

/** The same of signals with a value in every tick. */
export function driveFacts(spec: BenchSpec, target: ArrayLike<number>, driven: ArrayLike<number>): Fact[] {
  const stride = driveStride(spec.step);
  const count = Math.floor(target.length / stride);
  const quality = driveQuality(
    spec,
    Float64Array.from({ length: count }, (_, i) => target[i * stride]!),
    Float64Array.from({ length: count }, (_, i) => driven[i * stride]!),
  );
  return quality === null ? [] : qualityFacts(quality);
}

function qualityFacts(quality: DriveQuality): Fact[] {
  const percent = (value: number | null) => (value === null ? 'the drive asks none' : `${value.toFixed(2)} %`);
  const { regression, outside } = quality;
  return [
    { name: 'Energy rating (J2951)', value: percent(quality.energyRating) },
    { name: 'Distance rating', value: percent(quality.distanceRating) },
    { name: 'Energy economy rating', value: percent(quality.energyEconomyRating) },
    { name: 'Absolute speed change rating', value: percent(quality.absoluteSpeedChangeRating) },
    { name: 'Inertial work rating', value: percent(quality.inertialWorkRating) },
    { name: 'Root mean square speed error', value: `${formatNumber(quality.rootMeanSquareSpeedError * 3.6, 3)} km/h` },
    { name: 'Speed regression (40 CFR 1037.555)', value: regressionText(regression) },
    {
      name: 'Outside the band of 40 CFR 600.109-08',
      value:
        outside.length === 0
          ? 'never'
          : outside.map((one) => `${one.from.toFixed(1)} to ${one.until.toFixed(1)} s`).join(', '),
    },
  ];
}

function regressionText({
  slope,
  intercept,
  standardError,
  determination,
  faults,
}: DriveQuality['regression']): string {
  return `slope ${slope.toFixed(4)}, intercept ${intercept.toFixed(3)} m/s, standard error ${standardError.toFixed(3)} m/s, r² ${determination.toFixed(4)}: ${faults.length === 0 ? 'accepted' : faults.join('; ')}`;
}

/** In one sentence, for a summary. */
export function driveSentence({ energyRating, rootMeanSquareSpeedError, regression, outside }: DriveQuality): string {
  const energy = energyRating === null ? '' : `energy rating ${energyRating.toFixed(2)} % (J2951), `;
  const band = outside.length === 0 ? 'never' : `${outside.length} times`;
  return `${energy}speed error ${formatNumber(rootMeanSquareSpeedError * 3.6, 3)} km/h root mean square; regression of 40 CFR 1037.555: ${regressionText(regression)}; ${band} outside the band of 40 CFR 600.109-08`;
}
