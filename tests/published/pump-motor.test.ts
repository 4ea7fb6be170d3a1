import { describe, expect, it } from 'vitest';
import * as law from '../../plants/laws/pump-motor.js';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litresPerMinute, oil, rpm } from '../support/oil.js';

/** Dynamic viscosity 0.03 Pa s, 870 kg/m3, stiff. */
const viscosity = 0.03;
const fluid = oil({
  bulkModulus: 1e13,
  air: 1e-4,
  density: 870,
  thermalExpansion: 0,
  grade: 3,
  at: 313.15,
  viscosityAt40: viscosity / 870,
  viscosityAt100: 7e-6,
});
const displacement = 100e-6;
const radian = displacement / (2 * Math.PI);

/** The element between prescribed pressures on a shaft of prescribed speed, its displacement swung to `stroke`. */
function unit(
  high: number,
  low: number,
  speed: number,
  stroke: number,
  parameters: Readonly<Record<string, number>> = {},
): Bench {
  const bench = new Bench([
    element('highSide', library.pressureSource, { fluid, parameters: { pressure: high * bar } }),
    element('lowSide', library.pressureSource, { fluid, parameters: { pressure: low * bar } }),
    element('housing', library.pressureSource, { fluid, parameters: { pressure: low * bar } }),
    element('drive', library.speedSource, { parameters: { constantSpeed: speed } }),
    element('unit', library.pumpMotor, {
      parameters: { displacement, request: 1, dryTorque: 0, ...parameters },
      to: { high: 'highSide.oil', low: 'lowSide.oil', caseDrain: 'housing.oil', shaft: 'drive.shaft' },
    }),
  ]);
  bench.set('unit.displacementRequest', stroke);
  bench.run(1);
  expect(bench.get('unit.displacement')).toBeCloseTo(stroke, 6);
  return bench;
}

describe('100 cm3, 2000 rpm, 300 bar (terms of ISO 4391)', () => {
  const speed = 2000 * rpm;
  const ideal = radian * 300 * bar;
  const hersey = (viscosity * speed) / (300 * bar);

  it('without losses: 477.465 N m, 200 L/min', () => {
    const bench = unit(350, 50, speed, 1, { slipCoefficient: 0, viscousCoefficient: 0, frictionCoefficient: 0 });
    expect(bench.get('unit.torque')).toBeCloseTo(477.465, 1);
    expect(bench.get('unit.highFlow') / litresPerMinute).toBeCloseTo(200, 2);
  });

  it('as a pump with 0.95 and 0.95: 190 L/min, 502.595 N m, 95.000 and 105.263 kW', () => {
    const bench = unit(350, 50, speed, -1, {
      slipCoefficient: 0.05 * hersey,
      viscousCoefficient: 0,
      frictionCoefficient: 1 / 0.95 - 1,
    });
    expect(bench.get('unit.highFlow') / litresPerMinute).toBeCloseTo(-190, 2);
    expect(bench.get('unit.torque')).toBeCloseTo(-502.595, 1);
    expect(-bench.get('unit.highFlow') * 300 * bar).toBeCloseTo(95e3, -2);
    expect(-bench.get('unit.shaftPower') / 105263).toBeCloseTo(1, 4);
  });

  it('as a motor with 0.95 and 0.95: 210.526 L/min, 453.592 N m, 95.000 kW from 105.263 kW', () => {
    const bench = unit(350, 50, speed, 1, {
      slipCoefficient: (1 / 0.95 - 1) * hersey,
      viscousCoefficient: 0,
      frictionCoefficient: 0.05,
    });
    expect(bench.get('unit.highFlow') / litresPerMinute).toBeCloseTo(210.526, 2);
    expect(bench.get('unit.torque')).toBeCloseTo(453.592, 1);
    expect(bench.get('unit.shaftPower') / 95e3).toBeCloseTo(1, 4);
    expect(bench.get('unit.hydraulicPower') / 105263).toBeCloseTo(1, 3);
  });

  it('with Cs 3e-9, Cv 1.2e5, Cf 0.02 after Wilson: 2.865 L/min, 12.00 N m and 9.549 N m, 0.98568 and 0.95682', () => {
    const bench = unit(350, 50, speed, -1, {
      slipCoefficient: 3e-9,
      viscousCoefficient: 1.2e5,
      frictionCoefficient: 0.02,
    });
    const leakage = bench.get('unit.leakage');
    expect(leakage / litresPerMinute).toBeCloseTo(2.865, 2);
    const torque = -bench.get('unit.torque');
    expect(torque - ideal).toBeCloseTo(12 + 9.549, 1);
    expect(-bench.get('unit.highFlow') / (radian * speed)).toBeCloseTo(0.98568, 4);
    expect(ideal / torque).toBeCloseTo(0.95682, 4);
  });

  it('follows a torque request by its displacement', () => {
    const bench = unit(350, 50, speed, 0, {
      request: 0,
      slipCoefficient: 0,
      viscousCoefficient: 0,
      frictionCoefficient: 0,
    });
    bench.set('unit.torqueRequest', -200);
    bench.run(1);
    expect(bench.get('unit.torque')).toBeCloseTo(-200, 0);
    expect(bench.get('unit.displacement')).toBeCloseTo(-200 / 477.465, 3);
  });
});

describe('best efficiency of a pump after Wilson, S* = Cs + sqrt(Cs^2 + Cs (1 + Cf)/Cv)', () => {
  it.each([
    ['Merritt 1967, table 4-1, piston, from memory', 0.15e-7, 16.8e4, 0.045, 3.2082e-7, 0.86746],
    ['common practice, no source', 3e-9, 1.2e5, 0.02, 1.6272e-7, 0.94424],
  ])('%s', (_source, slip, viscous, friction, bestHersey, bestEfficiency) => {
    const speed = 200;
    const efficiency = (hersey: number) => {
      const difference = (viscosity * speed) / hersey;
      const flow = radian * speed - law.wilsonLeakage(difference, viscosity, radian, slip);
      const torque =
        radian * difference + law.wilsonTorque(difference, speed, viscosity, radian, viscous, friction, 0, 1);
      return (flow * difference) / (torque * speed);
    };
    let low = 1e-9;
    let high = 1e-5;
    for (let i = 0; i < 200; i += 1) {
      const a = low + 0.382 * (high - low);
      const b = low + 0.618 * (high - low);
      if (efficiency(a) > efficiency(b)) high = b;
      else low = a;
    }
    expect(low / bestHersey).toBeCloseTo(1, 3);
    expect(efficiency(low)).toBeCloseTo(bestEfficiency, 4);
  });
});

describe('losses in all four quadrants (additive form)', () => {
  it('are above zero whatever the signs, and the unit at zero displacement takes power from both sides', () => {
    for (const [high, low] of [
      [301, 1],
      [20, 250],
    ] as const) {
      for (const speed of [-250, -20, 20, 250]) {
        for (const stroke of [-1, -0.2, 0, 0.2, 1]) {
          const bench = unit(high, low, speed, stroke);
          const what = `${high} bar, ${low} bar, ${speed} rad/s, ${stroke}`;
          expect(bench.get('unit.loss'), what).toBeGreaterThan(0);
          // what the oil gives less what the shaft gets is the loss, within the heat of the sources
          expect(
            (bench.get('unit.hydraulicPower') - bench.get('unit.shaftPower')) / bench.get('unit.loss'),
            what,
          ).toBeCloseTo(1, 6);
          if (stroke === 0) {
            expect(bench.get('unit.torque') * speed, what).toBeLessThan(0);
            expect(bench.get('unit.leakage') * (high - low), what).toBeGreaterThan(0);
          }
        }
      }
    }
  });

  it('falls smoothly through standstill: no jump of torque between -0.01 and 0.01 rad/s', () => {
    const before = unit(301, 1, -0.01, 0.5).get('unit.torque');
    const after = unit(301, 1, 0.01, 0.5).get('unit.torque');
    expect(Math.abs(before - after)).toBeLessThan(0.005 * Math.abs(before));
  });

  it('without speed, pressure drives leakage only', () => {
    const bench = unit(301, 1, 0, 0.5);
    expect(bench.get('unit.flow')).toBeCloseTo(0, 12);
    expect(bench.get('unit.leakage')).toBeGreaterThan(0);
  });
});
