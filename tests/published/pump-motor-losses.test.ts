import { describe, expect, it } from 'vitest';
import * as law from '../../plants/laws/pump-motor.js';
import * as library from '../../plants/library.js';
import { fitLossMap } from '../../tools/fit/loss-map.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litresPerMinute, oil, rpm } from '../support/oil.js';

const fluid = oil({ bulkModulus: 1e13, air: 1e-4, density: 870, thermalExpansion: 0 });
const displacement = 100e-6;
const radian = displacement / (2 * Math.PI);
const forms = ['wilson', 'constant efficiencies', 'willans', 'extended', 'mirrored efficiencies', 'map'] as const;

/** The element between prescribed pressures on a shaft of prescribed speed, its displacement swung to `stroke`. */
function unit(
  high: number,
  low: number,
  speed: number,
  stroke: number,
  given: Readonly<Record<string, number>>,
): Bench {
  const bench = new Bench([
    element('highSide', library.pressureSource, { fluid, parameters: { pressure: high * bar } }),
    element('lowSide', library.pressureSource, { fluid, parameters: { pressure: low * bar } }),
    element('housing', library.pressureSource, { fluid, parameters: { pressure: 1.5 * bar } }),
    element('drive', library.speedSource, { parameters: { constantSpeed: speed } }),
    element('unit', library.pumpMotor, {
      parameters: { displacement, request: 1, ...given },
      to: { high: 'highSide.oil', low: 'lowSide.oil', caseDrain: 'housing.oil', shaft: 'drive.shaft' },
    }),
  ]);
  bench.set('unit.displacementRequest', stroke);
  bench.run(0.8);
  return bench;
}

/** Some map: with losses that rise, and a leakage polynomial that would be negative at speed. */
const map = {
  mapLeakage: 0.02,
  mapLeakageSpeed: -0.05,
  mapTorque: 0.01,
  mapTorqueSquare: 0.02,
  mapTorquePressure: 0.02,
  mapTorqueDisplacement: 0.01,
};

describe('constant efficiencies in additive form', () => {
  const given = { losses: 1, volumetricEfficiency: 0.95, mechanicalEfficiency: 0.95, caseHeatShare: 0 };
  // terms of ISO 4391; 100 cm3, 2000 rpm, 300 bar: ideal 477.465 N m and 200 L/min
  it('pumps 0.95 of the ideal flow and gives 0.95 of the ideal torque as a motor', () => {
    const pump = unit(310, 10, 2000 * rpm, -1, given);
    expect(-pump.get('unit.highFlow') / litresPerMinute).toBeCloseTo(190, 0);
    expect(-pump.get('unit.torque') / 477.465).toBeCloseTo(1.05, 2);
    const motor = unit(310, 10, 2000 * rpm, 1, given);
    expect(motor.get('unit.torque')).toBeCloseTo(453.592, 0);
    expect(motor.get('unit.highFlow') / litresPerMinute).toBeCloseTo(210, 0);
  });
  it('has no loss at zero displacement, which real units have: the form is for comparison', () => {
    const idle = unit(310, 10, 2000 * rpm, 0, given);
    expect(Math.abs(idle.get('unit.torque'))).toBeLessThan(0.1);
  });
});

describe('Willans lines', () => {
  it('are straight: torque lost is its constant part and a share of the ideal one', () => {
    const given = { losses: 2, mechanicalEfficiency: 0.96, dryTorque: 6 };
    for (const stroke of [0.2, 0.6, 1]) {
      const ideal = stroke * radian * 300 * bar;
      const bench = unit(310, 10, 1500 * rpm, stroke, given);
      expect(ideal - bench.get('unit.torque')).toBeCloseTo(6 + 0.04 * ideal, 1);
    }
  });
  it('leak what they say at standstill', () => {
    const bench = unit(251.5, 1.5, 0, 0, { losses: 2, idleLeakage: 3e-5, ratedDifference: 250 * bar });
    expect(bench.get('unit.leakage')).toBeCloseTo(3e-5, 8);
  });
});

describe('mirrored efficiencies, for comparison', () => {
  const given = { losses: 4, volumetricEfficiency: 0.95, mechanicalEfficiency: 0.95, caseHeatShare: 0 };
  // terms of ISO 4391; 100 cm3, 2000 rpm, 300 bar, 0.95 and 0.95: the worked pump and motor
  it('need 502.595 N m as a pump and take 210.526 L/min as a motor', () => {
    const pump = unit(310, 10, 2000 * rpm, -1, given);
    expect(-pump.get('unit.torque')).toBeCloseTo(502.595, 0);
    expect(-pump.get('unit.highFlow') / litresPerMinute).toBeCloseTo(190, 0);
    const motor = unit(310, 10, 2000 * rpm, 1, given);
    expect(motor.get('unit.torque')).toBeCloseTo(453.592, 0);
    expect(motor.get('unit.highFlow') / litresPerMinute).toBeCloseTo(210.526, 0);
  });
  it('jump in slope where the power changes its sign', () => {
    const torque = (stroke: number) =>
      stroke * radian * 3e7 - law.lossTorque(4, 3e7, 200, stroke, 0.03, 870, radian, 0, 0, 0, 0.9, 0, 1);
    const slope = (stroke: number) => (torque(stroke + 1e-3) - torque(stroke)) / (1e-3 * radian * 3e7);
    expect(slope(0.1)).toBeCloseTo(0.9, 3);
    expect(slope(-0.1)).toBeCloseTo(1 / 0.9, 3);
  });
});

describe('a map fitted to measured points', () => {
  // points made by Wilson's law at 20 speeds, pressures and displacements, as pump and as motor
  const wilson = (speed: number, difference: number, displacement: number) => {
    const leak = law.wilsonLeakage(difference, 0.03, radian, 3e-9);
    const lost = law.lossTorque(0, difference, speed, displacement, 0.03, 870, radian, 1.2e5, 0.02, 2, 1, 0, 1);
    const share = Math.abs(displacement);
    const sign = displacement > 0 ? 1 : -1;
    return {
      speed,
      difference,
      displacement,
      flow: share * radian * speed - sign * leak,
      torque: share * radian * difference + sign * lost,
    };
  };
  const points = [500, 1000, 1500, 2000, 2500].flatMap((n) =>
    [50, 150, 250, 350].flatMap((p) =>
      [-1, -0.5, 0.5, 1].map((displacement) => wilson(n * rpm, p * bar, displacement)),
    ),
  );
  it('gives them back to a thousandth of the largest', () => {
    const fitted = fitLossMap(points, displacement);
    expect(fitted.flowDeviation).toBeLessThan(1e-3);
    expect(fitted.torqueDeviation).toBeLessThan(1e-3);
    expect(fitted.gaining).toEqual([]);
    const bench = unit(260, 10, 1500 * rpm, -0.5, { losses: 5, caseHeatShare: 0, ...fitted.parameters });
    const point = wilson(1500 * rpm, 250 * bar, 0.5);
    expect(-bench.get('unit.highFlow') / point.flow).toBeCloseTo(1, 2);
    expect(-bench.get('unit.torque') / point.torque).toBeCloseTo(1, 2);
  });
  it('names a point that gives more than the ideal unit', () => {
    expect(fitLossMap([...points, { ...points[0]!, torque: points[0]!.torque + 1e3 }], displacement).gaining).toEqual([
      points.length + 1,
    ]);
  });
});

describe('extended form', () => {
  it('adds turbulent leakage with the root of the difference: twice at four times (Schloesser 1961)', () => {
    const leak = (difference: number) =>
      law.furtherLeakage(3, difference * bar, 0, 1, 870, radian, 0.96, 1e-3, 0, 1e30);
    expect(leak(400) / leak(100)).toBeCloseTo(2, 3);
    expect(leak(-100)).toBeCloseTo(-leak(100), 12);
  });
  it('adds torque with the square of the speed, and compression of the dead volume with speed and difference', () => {
    const torque = (speed: number) =>
      law.lossTorque(3, 0, speed, 1, 0.03, 870, radian, 0, 0, 0, 0.94, 20, 1) -
      law.lossTorque(0, 0, speed, 1, 0.03, 870, radian, 0, 0, 0, 0.94, 20, 1);
    expect(torque(400) / torque(200)).toBeCloseTo(4, 6);
    const flow = (difference: number, speed: number, stroke: number) =>
      law.furtherLeakage(3, difference, speed, stroke, 870, radian, 0.96, 0, 0.2, 1.5e9);
    expect(flow(3e7, 200, 1)).toBeCloseTo((0.2 * radian * 200 * 3e7) / 1.5e9, 9);
    expect(flow(3e7, 200, 0) / flow(3e7, 200, 1)).toBeCloseTo(3.5, 1);
  });
});

describe.each(forms.map((form, losses) => [form, losses] as const))('%s', (_form, losses) => {
  it('never gives more power than it takes, in all four quadrants and at the corners', () => {
    const bench = unit(20, 20, 0, 0, { losses, caseHeatShare: 0, ...map });
    for (const speed of [-200, -0.5, 0, 0.5, 200])
      for (const stroke of [-1, 0, 0.3, 1])
        for (const [high, low] of [
          [300, 10],
          [10, 300],
          [20, 20],
        ] as const) {
          bench.set('drive.speed', speed);
          bench.set('unit.displacementRequest', stroke);
          bench.set('highSide.pressureChange', (high - 20) * bar);
          bench.set('lowSide.pressureChange', (low - 20) * bar);
          bench.run(0.7);
          expect(bench.get('unit.displacement')).toBeCloseTo(stroke, 3);
          expect(bench.get('unit.difference')).toBeCloseTo((high - low) * bar, -3);
          expect(bench.get('unit.loss'), `${speed} ${stroke} ${high}`).toBeGreaterThanOrEqual(-1e-6);
          expect(bench.get('unit.hydraulicPower') - bench.get('unit.shaftPower')).toBeGreaterThanOrEqual(-1e-3);
        }
  });
});

describe('a unit of fixed displacement', () => {
  it('stands at full displacement whatever is asked', () => {
    const bench = unit(210, 10, 100, 0.3, { request: 2 });
    expect(bench.get('unit.displacement')).toBe(1);
    bench.set('unit.enable', 0);
    bench.run(0.2);
    expect(bench.get('unit.displacement')).toBe(1);
  });
});
