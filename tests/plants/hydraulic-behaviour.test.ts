import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { places } from '../../runtime/circuit/build.js';
import type { ElementFunction, ElementInstance } from '../../runtime/contract.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';

const fluid = oil();
const line = (name: string, volume: number, pressure: number) =>
  element(name, library.oilVolume, {
    fluid,
    parameters: { volume: volume * litre },
    start: { pressure: pressure * bar },
  });
const accumulator = (name: string, given: Record<string, number>, start: Record<string, number>) =>
  element(name, library.gasAccumulator, { fluid, parameters: { ambientTemperature: 293.15, ...given }, start });
const tank = (level = 0.6, volume = 20) =>
  element('tank', library.tank, {
    fluid,
    parameters: { volume: volume * litre, ambientPressure: 101325, ambientTemperature: 293.15 },
    start: { level, temperature: 318 },
  });
const orifice = (name: string, from: string, to: string, area: number) =>
  element(name, library.orifice, { parameters: { area }, to: { from: `${from}.oil`, to: `${to}.oil` } });
const pump = (from: string, to: string) =>
  element('pump', library.flowSource, { to: { from: `${from}.oil`, to: `${to}.oil` } });
const oilHeld = (bench: Bench) => bench.plant.observed[places(bench.circuit).holdings]!;

/** Largest difference of a signal between runs with few and many substeps, sampled each step. */
function deviation(
  elements: () => ElementInstance[],
  path: string,
  seconds: number,
  drive: (bench: Bench, time: number) => void,
): number {
  const trace = (substeps: number) => {
    const bench = new Bench(elements(), { substeps });
    const values: number[] = [];
    bench.run(seconds, (time) => {
      drive(bench, time);
      values.push(bench.get(path));
    });
    return values;
  };
  const fine = trace(64);
  return Math.max(...trace(4).map((value, i) => Math.abs(value - fine[i]!)));
}

describe('gas-accumulator', () => {
  const circuit = () => [
    accumulator('accumulator', { volume: 10 * litre, precharge: 120 * bar }, { charge: 0.05 }),
    line('line', 0.3, 125),
    tank(),
    orifice('neck', 'accumulator', 'line', 2e-4),
    pump('tank', 'line'),
  ];

  it('runs empty, shuts its poppet, falls to a low pressure that stays above zero, and fills again', () => {
    const bench = new Bench(circuit());
    const before = oilHeld(bench);
    let least = Number.POSITIVE_INFINITY;
    bench.run(1.5, (time) => {
      bench.set('pump.flowRequest', (time < 0.75 ? -40 : 40) * litresPerMinute);
      least = Math.min(least, bench.get('accumulator.pressure'), bench.get('line.pressure'));
    });
    expect(least).toBeGreaterThan(0);
    expect(least).toBeLessThan(1 * bar);
    expect(bench.get('accumulator.pressure')).toBeGreaterThan(120 * bar);
    expect(Math.abs(oilHeld(bench) - before) / before).toBeLessThan(1e-13);
    expect(bench.plant.solver.replaced).toBeLessThan(20);
  });

  it('keeps its gas near precharge while the oil side is empty', () => {
    const bench = new Bench(circuit());
    bench.set('pump.flowRequest', -40 * litresPerMinute);
    bench.run(0.8);
    expect(bench.get('accumulator.pressure')).toBeLessThan(10 * bar);
    expect(bench.get('accumulator.gasPressure')).toBeGreaterThan(100 * bar);
    expect(bench.get('accumulator.gasVolume') / (10 * litre)).toBeCloseTo(1, 3);
  });

  it('agrees with a step sixteen times smaller while it empties and refills, within 1 % of 300 bar', () => {
    const worst = deviation(circuit, 'line.pressure', 1.5, (bench, time) => {
      bench.set('pump.flowRequest', (time < 0.75 ? -40 : 40) * litresPerMinute);
    });
    expect(worst / bar).toBeLessThan(3);
  });

  it('meets a stop when full: as a reservoir of 6 bar precharge the pressure rises steeply at the end', () => {
    const bench = new Bench([
      accumulator(
        'reservoir',
        { volume: 20 * litre, precharge: 6 * bar, leastGasShare: 0.3, timeConstant: 0.2 },
        { charge: 0.9 },
      ),
      tank(0.9),
      pump('tank', 'reservoir'),
    ]);
    bench.set('pump.flowRequest', 20 * litresPerMinute);
    while (bench.get('reservoir.stateOfCharge') < 1) bench.run(0.001);
    expect(bench.get('reservoir.pressure')).toBeLessThan(30 * bar);
    bench.run(1.2);
    expect(bench.get('reservoir.pressure')).toBeGreaterThan(100 * bar);
    expect(bench.get('reservoir.gasPressure')).toBeLessThan(30 * bar);
  });

  it('starts at the pressure or the charge that is asked for, in balance with its gas', () => {
    const byPressure = new Bench([accumulator('a', { volume: 0.05, precharge: 150 * bar }, { pressure: 260 * bar })]);
    expect(byPressure.get('a.pressure') / bar).toBeCloseTo(260, 6);
    const byCharge = new Bench([accumulator('a', { volume: 0.05, precharge: 150 * bar }, { charge: 0.4 })]);
    expect(byCharge.get('a.stateOfCharge')).toBeCloseTo(0.4, 6);
    expect(byCharge.get('a.gasPressure')).toBeCloseTo(byCharge.get('a.pressure'), 3);
  });

  it('loses pressure with its gas, and the watch has a limit for it', () => {
    const bench = new Bench([accumulator('a', { volume: 0.05, precharge: 150 * bar }, { pressure: 200 * bar })]);
    bench.set('a.gasLeak', 0.5);
    const mass = bench.get('a.gasMass');
    bench.run(2);
    expect(mass - bench.get('a.gasMass')).toBeCloseTo(1, 6);
    expect(bench.get('a.pressure')).toBeLessThan(190 * bar);
    expect(library.gasAccumulator.limits.filter((limit) => limit.level === 'below precharge').length).toBe(2);
  });
});

describe('isolation-valve', () => {
  const circuit = () => [
    element('supply', library.pressureSource, { fluid, parameters: { pressure: 250 * bar } }),
    line('line', 0.3, 250),
    tank(),
    element('valve', library.isolationValve, {
      parameters: { area: 2e-4, opens: 0.03, closes: 0.05, deadTime: 0.01 },
      start: { position: 0 },
      to: { from: 'supply.oil', to: 'line.oil' },
    }),
    orifice('load', 'line', 'tank', 1e-5),
  ];

  it('waits for its dead time, opens in its opening time, closes in its closing time', () => {
    const bench = new Bench(circuit());
    bench.set('valve.open', 1);
    bench.run(0.009);
    expect(bench.get('valve.position')).toBe(0);
    bench.run(0.015);
    expect(bench.get('valve.position')).toBeCloseTo(0.48, 1);
    bench.run(0.03);
    expect(bench.get('valve.position')).toBeGreaterThan(0.99);
    bench.set('valve.open', 0);
    bench.run(0.035);
    expect(bench.get('valve.position')).toBeCloseTo(0.5, 1);
    bench.run(0.05);
    expect(bench.get('valve.position')).toBeLessThan(0.01);
  });

  it.each([
    ['closed', 0, 0],
    ['open', 1, 1],
    ['holds', 2, 0.7],
  ])('without power goes to %s', (_name, atPowerLoss, end) => {
    const bench = new Bench([
      ...circuit().filter((one) => one.name !== 'valve'),
      element('valve', library.isolationValve, {
        parameters: { area: 2e-4, atPowerLoss },
        to: { from: 'supply.oil', to: 'line.oil' },
      }),
    ]);
    bench.set('valve.open', 0.7);
    bench.run(0.1);
    bench.set('valve.power', 0);
    bench.run(0.15);
    expect(bench.get('valve.position')).toBeCloseTo(end, 3);
  });

  it('slammed between small volumes at full flow, agrees with a step sixteen times smaller within 1 % of 330 bar', () => {
    const slam = () => [
      accumulator('accumulator', { volume: 50 * litre, precharge: 150 * bar }, { pressure: 260 * bar }),
      line('a', 0.3, 260),
      line('b', 0.2, 260),
      accumulator('reservoir', { volume: 50 * litre, precharge: 6 * bar }, { pressure: 10 * bar }),
      orifice('neck', 'accumulator', 'a', 3e-4),
      element('valve', library.isolationValve, {
        parameters: { area: 3e-4, opens: 0.005, closes: 0.005, deadTime: 0 },
        start: { position: 1 },
        to: { from: 'a.oil', to: 'b.oil' },
      }),
      orifice('load', 'b', 'reservoir', 2.5e-5),
    ];
    const drive = (bench: Bench, time: number) => bench.set('valve.open', time > 0.1 && time < 0.2 ? 0 : 1);
    expect(deviation(slam, 'b.pressure', 0.3, drive) / bar).toBeLessThan(3.3);
    expect(deviation(slam, 'a.pressure', 0.3, drive) / bar).toBeLessThan(3.3);
  });

  it('takes ten times as long with a tenth of its speed', () => {
    const until = (share: number) => {
      const bench = new Bench(circuit());
      bench.set('valve.speedFactor', share);
      bench.set('valve.open', 1);
      let ticks = 0;
      while (bench.get('valve.position') < 0.9 && ticks < 2000) {
        bench.run(0.001);
        ticks += 1;
      }
      return ticks;
    };
    // the dead time is the pilot stage's and stays
    const [usual, slow] = [until(1), until(0.1)];
    expect((slow - 10) / (usual - 10)).toBeGreaterThan(9);
    expect((slow - 10) / (usual - 10)).toBeLessThan(11);
  });

  it('sticks where a fault holds it', () => {
    const bench = new Bench(circuit());
    bench.set('valve.open', 1);
    bench.run(0.1);
    bench.set('valve.stuckAt', 0.3);
    bench.set('valve.open', 0);
    bench.run(0.2);
    expect(bench.get('valve.position')).toBeCloseTo(0.3, 3);
  });
});

describe('an external leak of a volume', () => {
  it('loses oil by the orifice law, down to the pressure of the surroundings and not below', () => {
    const bench = new Bench([
      element('line', library.oilVolume, {
        fluid: oil(),
        parameters: { volume: 2 * litre },
        start: { pressure: 200 * bar },
      }),
      element('other', library.oilVolume, {
        fluid: oil(),
        parameters: { volume: litre },
        start: { pressure: 0.6 * bar },
      }),
      orifice('between', 'line', 'other', 1e-12),
    ]);
    bench.set('line.leakArea', 1e-7);
    bench.set('other.leakArea', 1e-7);
    const before = bench.get('line.mass');
    const low = bench.get('other.mass');
    bench.run(0.001);
    // Cd A sqrt(2 rho dp): 0.7 * 1e-7 m2 * sqrt(2 * 870 kg/m3 * 199e5 Pa), 0.0130 kg/s
    expect((before - bench.get('line.mass')) / 0.001).toBeCloseTo(0.013, 3);
    bench.run(30);
    expect(bench.get('line.pressure') / bar).toBeGreaterThan(1);
    expect(bench.get('line.pressure') / bar).toBeLessThan(1.1);
    // nothing is drawn in from outside
    expect(Math.abs(bench.get('other.mass') - low)).toBeLessThan(1e-4);
  });
});

describe('check-valve', () => {
  it('two of them facing one volume keep its pressure between and do not ring', () => {
    const circuit = () => [
      element('supply', library.pressureSource, { fluid, parameters: { pressure: 10 * bar } }),
      line('chamber', 0.05, 10),
      element('sink', library.pressureSource, { fluid, parameters: { pressure: 60 * bar } }),
      tank(),
      element('suction', library.checkValve, {
        parameters: { area: 5e-5 },
        to: { from: 'supply.oil', to: 'chamber.oil' },
      }),
      element('delivery', library.checkValve, {
        parameters: { area: 5e-5 },
        to: { from: 'chamber.oil', to: 'sink.oil' },
      }),
      pump('tank', 'chamber'),
    ];
    const drive = (bench: Bench, time: number) =>
      bench.set('pump.flowRequest', 15 * litresPerMinute * Math.sin(60 * time));
    expect(deviation(circuit, 'chamber.pressure', 0.5, drive) / bar).toBeLessThan(0.6);
    const bench = new Bench(circuit());
    bench.run(0.5, (time) => {
      drive(bench, time);
      if (time > 0.1) {
        expect(bench.get('chamber.pressure') / bar).toBeGreaterThan(5);
        expect(bench.get('chamber.pressure') / bar).toBeLessThan(66);
      }
    });
  });
});

describe('tank', () => {
  it('runs dry without going below nothing, and what is pumped comes to an end', () => {
    const bench = new Bench([
      tank(0.1, 5),
      accumulator('reservoir', { volume: 20 * litre, precharge: 3 * bar }, { pressure: 4 * bar }),
      pump('tank', 'reservoir'),
    ]);
    bench.set('pump.flowRequest', 30 * litresPerMinute);
    bench.run(6);
    expect(bench.get('tank.mass')).toBeGreaterThan(0);
    expect(bench.get('tank.level')).toBeLessThan(0.01);
    expect(Math.abs(bench.get('pump.massFlow'))).toBeLessThan(0.05 * 870 * 30 * litresPerMinute);
  });

  it('breathes the volume that the oil leaves', () => {
    const bench = new Bench([tank(), line('line', 5, 20), pump('tank', 'line')]);
    bench.set('pump.flowRequest', 1 * litresPerMinute);
    bench.run(0.2);
    expect(bench.get('tank.airFlow') / litresPerMinute).toBeCloseTo(1, 2);
  });
});

describe('a reservoir near zero pressure', () => {
  const circuit = () => [
    line('inlet', 0.5, 2),
    tank(),
    element('supply', library.pressureSource, { fluid, parameters: { pressure: 20 * bar } }),
    pump('inlet', 'supply'),
    orifice('suction', 'tank', 'inlet', 4e-5),
  ];
  const drive = (bench: Bench, time: number) => bench.set('pump.flowRequest', (time < 0.5 ? 60 : 5) * litresPerMinute);

  it('cavitates: the pressure stays above zero, less is delivered, and it recovers', () => {
    const bench = new Bench(circuit());
    bench.run(0.5, (time) => drive(bench, time));
    expect(bench.get('inlet.pressure')).toBeGreaterThan(0);
    expect(bench.get('inlet.pressure')).toBeLessThan(0.5 * bar);
    expect(bench.get('pump.massFlow')).toBeLessThan(0.9 * 0.848 * 1);
    bench.run(1.5, (time) => drive(bench, 0.5 + time));
    expect(bench.get('inlet.pressure')).toBeGreaterThan(0.9 * bar);
  });

  it('agrees with a step sixteen times smaller within 1 % of 20 bar', () => {
    expect(deviation(circuit, 'inlet.pressure', 1.5, drive) / bar).toBeLessThan(0.2);
  });
});

describe('charge-pump', () => {
  it('holds the low side at its relief valve and drains heat with the oil that goes round', () => {
    const bench = new Bench([
      line('low', 1, 2),
      tank(),
      element('drive', library.speedSource, { parameters: { constantSpeed: 150 } }),
      element('charge', library.chargePump, {
        parameters: { displacement: 12e-6, cracking: 15 * bar, fullFlow: 18 * bar, fullFlowRate: 20 * litresPerMinute },
        to: { inlet: 'tank.oil', outlet: 'low.oil', shaft: 'drive.shaft' },
      }),
      orifice('leak', 'low', 'tank', 2e-6),
    ]);
    bench.run(3);
    expect(bench.get('low.pressure') / bar).toBeGreaterThan(15);
    expect(bench.get('low.pressure') / bar).toBeLessThan(18.5);
    expect(bench.get('charge.reliefFlow')).toBeGreaterThan(0);
    expect(bench.get('charge.torque')).toBeGreaterThan(0);
  });
});

describe('pump-motor', () => {
  const bench = (parameters: Record<string, number> = {}) =>
    new Bench([
      element('high', library.pressureSource, { fluid, parameters: { pressure: 250 * bar } }),
      element('low', library.pressureSource, { fluid, parameters: { pressure: 10 * bar } }),
      line('housing', 0.5, 1.2),
      tank(),
      element('shaft', library.speedSource, { parameters: { constantSpeed: 150 } }),
      element('unit', library.pumpMotor, {
        parameters: { displacement: 110e-6, request: 1, ...parameters },
        to: { high: 'high.oil', low: 'low.oil', caseDrain: 'housing.oil', shaft: 'shaft.shaft' },
      }),
      orifice('drain', 'housing', 'tank', 5e-5),
    ]);

  it('swings no faster than its rate limit, through the centre without stopping, and stops at its ends', () => {
    const one = bench({ rateLimit: 8 });
    one.set('unit.displacementRequest', 1);
    let fastest = 0;
    one.run(0.5, () => {
      fastest = Math.max(fastest, Math.abs(one.get('unit.displacementRate')));
    });
    one.set('unit.displacementRequest', -1);
    one.run(0.5, () => {
      fastest = Math.max(fastest, Math.abs(one.get('unit.displacementRate')));
    });
    expect(fastest).toBeLessThanOrEqual(8.01);
    expect(fastest).toBeGreaterThan(7);
    expect(one.get('unit.displacement')).toBeCloseTo(-1, 2);
  });

  it('goes to zero without enable and stays where it is when stuck', () => {
    const one = bench();
    one.set('unit.displacementRequest', 0.6);
    one.run(0.5);
    one.set('unit.stuck', 1);
    one.set('unit.displacementRequest', -0.6);
    one.run(0.5);
    expect(one.get('unit.displacement')).toBeCloseTo(0.6, 2);
    one.set('unit.stuck', 0);
    one.set('unit.enable', 0);
    one.run(0.5);
    expect(one.get('unit.displacement')).toBeCloseTo(0, 3);
  });

  it('runs away to where a fault drives it, whatever is asked, and comes back', () => {
    const one = bench();
    one.set('unit.displacementRequest', 0.2);
    one.run(0.4);
    one.set('unit.runawayTo', -0.8);
    one.run(0.5);
    expect(one.get('unit.displacement')).toBeCloseTo(-0.8, 2);
    expect(one.get('unit.wantedDisplacement')).toBeCloseTo(0.2, 9);
    one.set('unit.enable', 0);
    one.run(0.3);
    expect(one.get('unit.displacement')).toBeCloseTo(-0.8, 2);
    one.set('unit.runawayTo', -2);
    one.run(0.5);
    expect(one.get('unit.displacement')).toBeCloseTo(0, 2);
  });

  it('leaks more when worn, into the case', () => {
    const one = bench();
    one.run(1);
    const before = one.get('housing.pressure');
    const leakage = one.get('unit.leakage');
    one.set('unit.wear', 4);
    one.run(1);
    expect(one.get('unit.leakage') / leakage).toBeCloseTo(4, 1);
    expect(one.get('housing.pressure')).toBeGreaterThan(before);
  });

  it('a torque falsified by 1 % shows in the energy balance of the element', () => {
    const wrong = { ...library.pumpMotor, flows: falsified() };
    const one = bench();
    const elements = one.circuit.spec.elements.map((each) => (each.name === 'unit' ? { ...each, kind: wrong } : each));
    const right = new Bench(one.circuit.spec.elements);
    const falsifiedBench = new Bench(elements);
    for (const each of [right, falsifiedBench]) {
      each.set('unit.displacementRequest', 1);
      each.run(1);
    }
    const turnedOver = Math.abs(right.get('unit.shaftPower'));
    expect(Math.abs(right.energyResidual()) / turnedOver).toBeLessThan(1e-4);
    expect(Math.abs(falsifiedBench.energyResidual()) / turnedOver).toBeGreaterThan(5e-3);
  });
});

/** The unit's own flows with 1 % more torque on the shaft. */
function falsified(): ElementFunction {
  const source = library.pumpMotor.flows!.toString();
  const changed = source.replace('shaft.torque += torque;', 'shaft.torque += 1.01 * torque;');
  expect(changed).not.toBe(source);
  return new Function(`return ({ ${changed} }).flows`)() as ElementFunction;
}
