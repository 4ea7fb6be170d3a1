import { describe, expect, it } from 'vitest';
import * as engineLaws from '../../plants/laws/engine.js';
import * as frictionLaws from '../../plants/laws/friction.js';
import * as tyreLaws from '../../plants/laws/tyre.js';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';

const g = 9.80665;

/** Runs until `path` falls through `level`; the time, interpolated in the last step. */
function timeUntil(bench: Bench, path: string, level: number, most: number): number {
  const { step } = bench.plant.settings;
  let before = bench.get(path);
  for (let i = 1; i * step <= most; i += 1) {
    bench.plant.step();
    const now = bench.get(path);
    if (before > level && now <= level) return step * (i - 1 + (before - level) / (before - now));
    before = now;
  }
  return Number.NaN;
}

describe('coast-down, closed form for constant and quadratic drag (EPA "Vehicle Road Load Problem", Thompson)', () => {
  const parameters = { mass: 7500, rollingResistance: 0.008, dragArea: 4.5, airDensity: 1.2 };
  const coasting = () =>
    new Bench([element('body', library.vehicle, { parameters, start: { velocity: 80 / 3.6 } })], { step: 0.01 });

  it.each([
    [70, 11.8547],
    [40, 63.831],
    [0, 185.2375],
  ])('80 to %s km/h takes %s s', (to, seconds) => {
    expect(timeUntil(coasting(), 'body.velocity', to / 3.6, 200)).toBeCloseTo(seconds, 3);
  });

  it('runs at 41.7216 km/h after 60 s and stops after 1643.857 m', () => {
    const bench = coasting();
    bench.run(60);
    expect(bench.get('body.velocity') * 3.6).toBeCloseTo(41.7216, 4);
    const rest = timeUntil(bench, 'body.velocity', 0, 130);
    expect(60 + rest).toBeCloseTo(185.2375, 3);
    expect(bench.get('body.distance')).toBeCloseTo(1643.857, 2);
    expect(Math.abs(bench.energyResidual())).toBeLessThan(1e-6 * bench.plant.ledger[1]!);
  });

  it('with a linear term: t = (2/q) [atan((2 C v + B)/q)] between the speeds (40 CFR 1066.210 form)', () => {
    const [f0, f1, f2, mass] = [600, 25, 2.7, 7500];
    const [A, B, C] = [f0 / mass, f1 / mass, f2 / mass];
    const q = Math.sqrt(4 * A * C - B * B);
    const at = (v: number) => (2 / q) * Math.atan((2 * C * v + B) / q);
    const bench = new Bench(
      [
        element('body', library.vehicle, {
          parameters: { mass, constantLoad: f0, linearLoad: f1, quadraticLoad: f2 },
          start: { velocity: 25 },
        }),
      ],
      { step: 0.01 },
    );
    expect(timeUntil(bench, 'body.velocity', 5, 400)).toBeCloseTo(at(25) - at(5), 4);
  });
});

describe('road load and energy of trucks, from the definitions', () => {
  it('18 t at 60 km/h needs 38.73 kW', () => {
    const velocity = 60 / 3.6;
    const bench = new Bench([
      element('body', library.vehicle, {
        parameters: { mass: 18000, rollingResistance: 0.0075, dragArea: 6, airDensity: 1.2 },
        start: { velocity },
      }),
    ]);
    expect(((bench.get('body.rollingForce') + bench.get('body.airDragForce')) * velocity) / 1e3).toBeCloseTo(38.73, 2);
    expect(bench.get('body.loss') / 1e3).toBeCloseTo(38.73, 2);
  });

  it('a 20 % grade pulls 18 t with 34.62 kN', () => {
    const bench = new Bench([element('body', library.vehicle, { parameters: { mass: 18000 } })]);
    bench.set('body.grade', 0.2);
    bench.plant.observe();
    expect(bench.get('body.gradeForce') / 1e3).toBeCloseTo(34.62, 2);
  });

  it.each([
    [7500, 723.4],
    [18000, 1736.1],
  ])('%s kg at 50 km/h hold %s kJ', (mass, kilojoule) => {
    const bench = new Bench([
      element('body', library.vehicle, { parameters: { mass }, start: { velocity: 50 / 3.6 } }),
    ]);
    expect(bench.get('body.energy') / 1e3).toBeCloseTo(kilojoule, 1);
  });

  it('the payload of the start stays on board until somebody says otherwise', () => {
    const bench = new Bench([
      element('body', library.vehicle, { parameters: { mass: 5200 }, start: { payload: 1400 } }),
    ]);
    bench.run(2);
    expect(bench.get('body.totalMass')).toBe(6600);
    bench.set('body.payload', 1100);
    bench.run(4);
    expect(bench.get('body.totalMass')).toBeCloseTo(6300, 3);
  });

  it('payload loaded while driving keeps the velocity and the ledger', () => {
    const bench = new Bench([
      element('body', library.vehicle, {
        parameters: { mass: 5000, rollingResistance: 0.008 },
        start: { velocity: 10 },
      }),
    ]);
    bench.set('body.payload', 2500);
    bench.run(3);
    expect(bench.get('body.totalMass')).toBeCloseTo(7500, 1);
    // Crr g is the only deceleration
    expect(bench.get('body.velocity')).toBeCloseTo(10 - 0.008 * g * 3, 6);
    expect(Math.abs(bench.energyResidual())).toBeLessThan(0.5);
  });
});

describe('braking distance', () => {
  it('60 km/h at 5 m/s2: v^2/(2 a) = 27.778 m', () => {
    const bench = new Bench([
      element('body', library.vehicle, { parameters: { mass: 7500 }, start: { velocity: 60 / 3.6 } }),
      element('brake', library.forceSource, { parameters: { constantForce: -5 * 7500 }, to: { road: 'body.road' } }),
    ]);
    expect(timeUntil(bench, 'body.velocity', 0, 5)).toBeCloseTo(60 / 3.6 / 5, 6);
    // the step in which it stops goes on a little backwards
    expect(bench.get('body.distance')).toBeCloseTo(27.778, 3);
  });

  it('load transfer: m a h / L (quasi-static)', () => {
    const bench = new Bench([
      element('body', library.vehicle, {
        parameters: { mass: 7500, heightOfCentre: 1.2, wheelbase: 4 },
        start: { velocity: 20 },
      }),
      element('brake', library.forceSource, { parameters: { constantForce: -5 * 7500 }, to: { road: 'body.road' } }),
      ...(['rear', 'front'] as const).flatMap((axle, i) => [
        element(`${axle}Axle`, library.axle, { parameters: { inertia: 10, meshLoss: 0 }, start: { speed: 40 } }),
        element(`${axle}Tyres`, library.tyre, {
          parameters: { radius: 0.5, loadShare: 0.5, axlePosition: 1 - 2 * i },
          to: { wheel: `${axle}Axle.wheels`, road: 'body.road' },
        }),
      ]),
    ]);
    bench.run(2);
    const shift = (-bench.get('body.acceleration') * 7500 * 1.2) / 4;
    expect(shift).toBeGreaterThan(10000);
    expect(bench.get('frontTyres.load')).toBeCloseTo(0.5 * 7500 * g + shift, -1);
    expect(bench.get('frontTyres.load') + bench.get('rearTyres.load')).toBeCloseTo(7500 * g, 6);
  });
});

describe('tyre: Magic Formula (Bakker, Nyborg & Pacejka 1987), commonly quoted sets', () => {
  const sets: Record<string, [number, number, number, number]> = {
    dry: [10, 1.9, 1, 0.97],
    wet: [12, 2.3, 0.82, 1],
    snow: [5, 2, 0.3, 1],
    ice: [4, 2, 0.1, 1],
  };
  const force = (set: string, slip: number) => tyreLaws.magicFormula(slip, ...sets[set]!);

  it('values, peak and slope of the formula', () => {
    expect(tyreLaws.magicFormulaSlope(10, 1.9, 1)).toBeCloseTo(19, 12);
    expect((force('dry', 1e-6) - force('dry', -1e-6)) / 2e-6).toBeCloseTo(19, 6);
    expect(force('dry', 0.05)).toBeCloseTo(0.73562, 5);
    expect(force('dry', 0.1)).toBeCloseTo(0.95584, 5);
    expect(force('dry', 1)).toBeCloseTo(0.91452, 5);
    expect(force('wet', 1)).toBeCloseTo(0.63717, 5);
    expect(force('dry', -0.1)).toBe(-force('dry', 0.1));
  });

  it.each([
    ['dry', 0.18019, 1],
    ['wet', 0.08816, 0.82],
    ['snow', 0.3115, 0.3],
    ['ice', 0.3894, 0.1],
  ])('%s peaks at slip %s with %s', (set, slip, peak) => {
    let best = 0;
    for (let k = 0; k < 1; k += 1e-5) if (force(set, k) > force(set, best)) best = k;
    expect(Math.abs(best - slip)).toBeLessThan(1e-4);
    expect(force(set, best)).toBeCloseTo(peak, 6);
  });

  /** A wheel at a prescribed slip on a belt, settled. */
  function stand(slip: number, parameters: Record<string, number>, velocity = 15): Bench {
    return new Bench([
      element('belt', library.velocitySource, { parameters: { constantVelocity: velocity, weight: 40000 } }),
      element('drum', library.speedSource, { parameters: { constantSpeed: (velocity * (1 + slip)) / 0.5 } }),
      element('tyre', library.tyre, {
        parameters: { radius: 0.5, loadShare: 1, ...parameters },
        to: { wheel: 'drum.shaft', road: 'belt.road' },
      }),
    ]);
  }

  it('the element settles on the curve: slip 0.05, 0.1 and 0.18, dry', () => {
    for (const [slip, share] of [
      [0.05, 0.73562],
      [0.1, 0.95584],
      [0.18019, 1],
      [-0.1, -0.95584],
    ] as const) {
      const bench = stand(slip, {});
      bench.run(1);
      expect(bench.get('tyre.force') / 40000).toBeCloseTo(share, 3);
    }
  });

  it('refuses a Magic Formula that turns round at large slip, and takes the quoted sets for dry, wet, snow and ice', () => {
    const said = (stiffnessFactor: number, shapeFactor: number, curvatureFactor: number, model = 0) =>
      library.tyre.examine!({ parameter: { stiffnessFactor, shapeFactor, curvatureFactor, model }, fluid: {} }).length;
    expect([said(10, 1.9, 0.97), said(12, 2.3, 1), said(5, 2, 1), said(4, 2, 1)]).toEqual([0, 0, 0, 0]);
    expect(said(13.5, 2.28, 0.71)).toBe(1);
    expect(said(13.5, 2.28, 0.71, 1)).toBe(0);
    expect(tyreLaws.magicFormula(3, 13.5, 2.28, 1, 0.71)).toBeLessThan(0);
  });

  it('the element follows a step of slip over its relaxation length: 63.2 % at 0.3 m', () => {
    const bench = stand(0.001, { relaxationLength: 0.3 });
    bench.run(0.02); // 15 m/s: 0.3 m
    expect(bench.get('tyre.slip') / 0.001).toBeCloseTo(1 - Math.exp(-1), 3);
  });

  it('friction tyre (Dugoff, Fancher & Segel 1970): Cx 20, mu 0.8', () => {
    expect(tyreLaws.dugoff(0.02, 20, 0.8)).toBeCloseTo(0.392157, 6);
    expect(tyreLaws.dugoff(0.1, 20, 0.8)).toBeCloseTo(0.712, 6);
    expect(tyreLaws.dugoff(1, 20, 0.8)).toBeCloseTo(0.784, 6);
    const bench = stand(0.1, { model: 1, stiffnessFactor: 10, shapeFactor: 2.5, peakFriction: 0.8 }); // BCD = 20
    bench.run(1);
    expect(bench.get('tyre.force') / 40000).toBeCloseTo(0.712, 3);
  });

  it('slip stiffness at low speed is BCD Fz r^2 / (J v): 9500 1/s at 1 m/s, 40 kN, 0.5 m, 20 kg m2', () => {
    const slope = (tyreLaws.magicFormula(1e-6, 10, 1.9, 1, 0.97) / 1e-6) * 40000;
    expect((slope * 0.25) / 20).toBeCloseTo(9500, 3);
  });
});

describe('driveline', () => {
  it('two inertias, 1 and 10 kg m2, on 10 kN m/rad: 16.692 Hz', () => {
    const bench = new Bench([
      element('light', library.inertia, { parameters: { inertia: 1 }, start: { speed: 100 } }),
      element('heavy', library.inertia, { parameters: { inertia: 10 }, start: { speed: -10 } }),
      element('shaft', library.compliantShaft, {
        parameters: { stiffness: 1e4, damping: 0 },
        to: { a: 'light.shaft', b: 'heavy.shaft' },
      }),
    ]);
    let before = bench.get('shaft.twist');
    const crossings: number[] = [];
    for (let i = 1; i <= 2000; i += 1) {
      bench.plant.step();
      const now = bench.get('shaft.twist');
      if (before < 0 && now >= 0) crossings.push((i - 1 + before / (before - now)) * 1e-3);
      before = now;
    }
    const frequency = (crossings.length - 1) / (crossings.at(-1)! - crossings[0]!);
    expect(frequency).toBeCloseTo(16.692, 2);
    expect(Math.abs(bench.energyResidual())).toBeLessThan(1e-3 * bench.storedEnergy());
  });

  it.each([
    ['at once', (time: number) => (time > 0 ? 1 : 0)],
    ['slowly', (time: number) => Math.min(1, time / 0.8)],
    ['in pulses', (time: number) => (Math.sin(40 * time) > 0 ? 0.6 : 0.1)],
  ])('clutch closing %s against a constant speed: J dw^2 / 2 = 10.00 kJ whatever the torque', (_, profile) => {
    const bench = new Bench([
      element('line', library.speedSource, { parameters: { constantSpeed: 100 } }),
      element('rotor', library.inertia, { parameters: { inertia: 2 } }),
      element('clutch', library.clutch, {
        parameters: { maximumTorque: 400 },
        to: { a: 'line.shaft', b: 'rotor.shaft' },
      }),
    ]);
    bench.run(3, (time) => bench.set('clutch.engagement', profile(time)));
    expect(bench.get('rotor.speed')).toBeCloseTo(100, 1);
    expect(bench.get('clutch.slipEnergy') / 1e3).toBeCloseTo(10, 2);
    expect(Math.abs(bench.energyResidual())).toBeLessThan(1e-5 * bench.plant.ledger[0]!);
  });

  it('with both sides free the reduced inertia J1 J2 / (J1 + J2) counts', () => {
    const bench = new Bench([
      element('a', library.inertia, { parameters: { inertia: 2 }, start: { speed: 100 } }),
      element('b', library.inertia, { parameters: { inertia: 0.5 } }),
      element('clutch', library.clutch, { parameters: { maximumTorque: 300 }, to: { a: 'a.shaft', b: 'b.shaft' } }),
    ]);
    bench.set('clutch.engagement', 1);
    bench.run(2);
    expect(bench.get('a.speed')).toBeCloseTo(80, 3);
    expect(bench.get('clutch.slipEnergy') / 1e3).toBeCloseTo((0.5 * ((2 * 0.5) / 2.5) * 1e4) / 1e3, 2);
  });

  it('LuGre level (Canudas de Wit et al. 1995): steady force 1.18434 at 1 mm/s and 1.00400 at 10 mm/s', () => {
    // Fc 1, Fs 1.5, vs 1 mm/s, viscous 0.4 as in the paper
    const steady = (v: number) => frictionLaws.stribeckLevel(v, 1.5, 0.001) + 0.4 * v;
    expect(steady(0.001)).toBeCloseTo(1.18434, 5);
    expect(steady(0.01)).toBeCloseTo(1.004, 5);
    // at steady slip the bristle carries just that level, and nothing of the damping
    for (const v of [0.001, 0.01, -0.01]) {
      const level = frictionLaws.stribeckLevel(v, 1.5, 0.001);
      const z = Math.sign(v) * level;
      expect(frictionLaws.bristleRate(v, z, level, 1e-5)).toBeCloseTo(0, 9);
      expect(frictionLaws.bristleTorque(1, v, z, level, 300)).toBeCloseTo(z, 9);
    }
  });
});

describe('planetary gear (Willis 1841)', () => {
  it('speeds: sun + z ring = (1 + z) carrier; torques 1 : z : -(1 + z) balance', () => {
    const z = 2.6;
    const bench = new Bench([
      element('gear', library.planetaryJoint, {
        parameters: { ratio: z, sunInertia: 0.02, ringInertia: 0.1, carrierInertia: 0.2, viscousFriction: 0 },
        start: { carrierSpeed: 100, ringSpeed: 30 },
      }),
      element('sun', library.torqueSource, { parameters: { constantTorque: 100 }, to: { shaft: 'gear.sun' } }),
      element('ring', library.torqueSource, { parameters: { constantTorque: 100 * z }, to: { shaft: 'gear.ring' } }),
      element('carrier', library.torqueSource, {
        parameters: { constantTorque: -100 * (1 + z) },
        to: { shaft: 'gear.carrier' },
      }),
    ]);
    bench.run(2);
    expect(bench.get('gear.sunSpeed')).toBeCloseTo((1 + z) * 100 - z * 30, 9);
    expect(bench.get('gear.carrierSpeed')).toBeCloseTo(100, 9);
    expect(bench.get('gear.ringSpeed')).toBeCloseTo(30, 9);
  });

  it("with the ring held the sun sees its own inertia and the carrier's over (1 + z)^2", () => {
    const z = 3;
    const bench = new Bench([
      element('gear', library.planetaryJoint, {
        parameters: { ratio: z, sunInertia: 0.02, ringInertia: 1e6, carrierInertia: 0.32, viscousFriction: 0 },
      }),
      element('sun', library.torqueSource, { parameters: { constantTorque: 4 }, to: { shaft: 'gear.sun' } }),
    ]);
    bench.run(1);
    expect(bench.get('gear.sunSpeed')).toBeCloseTo(4 / (0.02 + 0.32 / 16), 2);
  });
});

describe('flywheel', () => {
  it('0.5 kg m2 at 8000 rpm holds 175.460 kJ', () => {
    const bench = new Bench([
      element('wheel', library.inertia, { parameters: { inertia: 0.5 }, start: { speed: (8000 * Math.PI) / 30 } }),
    ]);
    expect(bench.storedEnergy() / 1e3).toBeCloseTo(175.46, 2);
  });

  it("runs down by J w' = -(a + c w^2): 8000 to 4000 rpm in 366.452 s, to rest in 1207.990 s", () => {
    const rpm = Math.PI / 30;
    const wheel = () =>
      new Bench(
        [
          element('wheel', library.inertia, { parameters: { inertia: 0.5 }, start: { speed: 8000 * rpm } }),
          element('drag', library.shaftDrag, {
            parameters: { constantDrag: 0.2, quadraticDrag: 1e-6, width: 0.01 },
            to: { shaft: 'wheel.shaft' },
          }),
        ],
        { step: 0.02 },
      );
    expect(timeUntil(wheel(), 'wheel.speed', 4000 * rpm, 400)).toBeCloseTo(366.452, 3);
    expect(timeUntil(wheel(), 'wheel.speed', 0.02, 1300)).toBeCloseTo(1207.99 - 0.02 * (0.5 / 0.2), 1);
  });
});

describe('combustion engine: Willans line, 6.7 L, e 0.45, p_me0 1.7 bar, 42.8 MJ/kg, 1500 rpm', () => {
  const drag = engineLaws.meanEffectiveTorque(1.7e5, 0.0067);
  const perHour = (torque: number) => (engineLaws.willansFuelPower(torque, drag, 50 * Math.PI, 0.45) / 42.8e6) * 3600;

  it.each([
    [0, 2.661],
    [100, 5.597],
    [600, 20.278],
  ])('%s N m: %s kg/h', (torque, fuel) => {
    expect(perHour(torque)).toBeCloseTo(fuel, 3);
  });

  it('the element burns just that at 100 and 600 N m, 356.3 and 215.15 g/kWh', () => {
    for (const [torque, fuel, specific] of [
      [100, 5.597, 356.3],
      [600, 20.278, 215.15],
    ] as const) {
      const bench = new Bench([
        element('dynamometer', library.speedSource, { parameters: { constantSpeed: 50 * Math.PI } }),
        element('engine', library.combustionEngine, {
          parameters: { sweptVolume: 0.0067, efficiency: 0.45, dragPressure: 1.7e5, heatingValue: 42.8e6 },
          to: { shaft: 'dynamometer.shaft' },
        }),
      ]);
      bench.set('engine.ignition', 1);
      bench.set('engine.torqueRequest', torque);
      bench.run(3);
      expect(bench.get('engine.torque')).toBeCloseTo(torque, 2);
      expect(bench.get('engine.fuelFlow') * 3600).toBeCloseTo(fuel, 3);
      expect(((bench.get('engine.fuelFlow') * 3600) / ((torque * 50 * Math.PI) / 1e3)) * 1e3).toBeCloseTo(specific, 1);
      const before = bench.get('engine.fuelMass');
      bench.run(3.6);
      expect((bench.get('engine.fuelMass') - before) * 1e3).toBeCloseTo(fuel, 2);
    }
  });

  it('600 N m are a mean effective pressure of 11.253 bar', () => {
    expect(engineLaws.meanEffectiveTorque(11.253e5, 0.0067)).toBeCloseTo(600, 1);
  });
});
