import type { BenchSpec } from '../../configs/bench-spec.js';
import { table } from '../commands/table.js';
import type { AccuracySheet, SignalError } from './accuracy.js';
import { shortFormFaults } from './short-form.js';

/** Past these a bench is refused for live runs. Shares of the relief setting or of the largest value. */
export const accuracyLimits = { pressure: 0.005, speed: 0.005, overshoot: 0.01, energy: 1e-3, oil: 1e-10 };

/** What an error of a pressure is a share of: the relief setting of its side, else its PS, else the largest one watched. */
export function scaleOf(spec: BenchSpec): (path: string) => number | undefined {
  const own = new Map(
    spec.watched.map((watched) => [
      watched.path,
      watched.relief?.setting ?? watched.limits.find((limit) => limit.side === 'above')?.setting,
    ]),
  );
  return (path) => own.get(path);
}

export function verdictOf(
  sheet: AccuracySheet,
  limits: typeof accuracyLimits,
  spec: BenchSpec,
): { fit: boolean; why: string } {
  const faults = shortFormFaults(spec);
  const share = (value: number) => `${(100 * value).toPrecision(3)} %`;
  const worst = [sheet.worstPressure, sheet.worstSpeed].filter((one): one is SignalError => one !== undefined);
  for (const one of worst) {
    const limit = one === sheet.worstPressure ? limits.pressure : limits.speed;
    if (!(one.share <= limit)) {
      // the method is of order 3: halving the substep leaves an eighth
      const factor = Math.cbrt(one.share / limit);
      faults.push(
        `${one.path} is off by ${share(one.share)} of ${one === sheet.worstPressure ? 'its setting' : 'its largest value'} (limit ${share(limit)}): try substeps: ${Math.ceil(spec.substeps * Math.max(1.2, factor))}, or slow down the fastest mode below`,
      );
    }
  }
  if (sheet.overshoot.share > limits.overshoot)
    faults.push(`the peak of ${sheet.overshoot.path} is ${share(sheet.overshoot.share)} of its setting too high`);
  if (!(sheet.energyResidual <= limits.energy))
    faults.push(
      `the energy balance leaves ${sheet.energyResidual.toExponential(1)} of what passed: an element is wrong or the step too long`,
    );
  if (!(sheet.oilResidual <= limits.oil)) faults.push(`oil is lost: ${sheet.oilResidual.toExponential(1)} of it`);
  return faults.length > 0
    ? { fit: false, why: faults.join('; ') }
    : { fit: true, why: `largest errors ${worst.map((one) => `${share(one.share)} (${one.path})`).join(', ')}` };
}

export function sheetText(sheet: AccuracySheet, spec: BenchSpec): string {
  const percent = (value: number) => `${(100 * value).toFixed(value < 1e-4 ? 5 : 3)} %`;
  const rows = (list: readonly SignalError[], scale: string) => [
    ['signal', 'error', scale, 'reference', 'at', 'in'],
    ...list
      .slice(0, 12)
      .map((one) => [
        one.path,
        percent(one.share),
        one.scale.toPrecision(4),
        percent(one.reference),
        `${one.at.toFixed(2)} s`,
        one.event,
      ]),
  ];
  const modes = sheet.modes.map((mode) => [
    mode.frequency > 0 ? `${mode.frequency.toFixed(1)} Hz` : '',
    `${(1e6 * mode.timeConstant).toPrecision(3)} us`,
    mode.damping.toFixed(2),
    mode.frequency > 0 ? ((2 * Math.PI * mode.frequency * spec.step) / spec.substeps).toFixed(2) : '',
    mode.carriers.map((carrier) => `${carrier.path} ${Math.round(100 * carrier.share)} %`).join(', '),
  ]);
  return [
    `Accuracy over ${sheet.seconds.toFixed(1)} s of the duty and ${sheet.events.length - 1} hard events, ${sheet.substeps} substeps against ${sheet.referenceSubsteps}`,
    '',
    'Pressures, share of the relief setting (Pa)',
    table(rows(sheet.pressures, 'setting'), [1, 2, 3, 4]),
    '',
    'Speeds, share of the largest value',
    table(rows(sheet.speeds, 'largest'), [1, 2, 3, 4]),
    '',
    'Fastest modes met on the way',
    table([['swings', 'decays in', 'damping', '2 pi f h', 'carried by'], ...modes], [0, 1, 2, 3]),
    '',
    `stability: fastest growth of the circuit itself ${sheet.stability.growth.toPrecision(3)} 1/s${sheet.stability.growing.length > 0 ? ` (${sheet.stability.growing.join(', ')})` : ''}; what decays within a step, the method takes down to ${percent(sheet.stability.amplification)} or less in each substep`,
    `refined ${sheet.refined.toFixed(1)} and replaced ${sheet.replaced.toFixed(1)} of a million substeps; energy residual ${sheet.energyResidual.toExponential(1)}, oil residual ${sheet.oilResidual.toExponential(1)}; plant step ${sheet.stepCost.toFixed(1)} us here and now`,
  ].join('\n');
}
