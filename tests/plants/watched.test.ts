import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import type { ElementKind } from '../../runtime/contract.js';
import { Bench, element } from '../support/circuit.js';

const kinds: readonly ElementKind[] = Object.values(library);
const watches = (kind: ElementKind, level: string) => kind.limits.some((limit) => limit.level === level);

describe('what elements declare for the watch', () => {
  it('is over-speed for whatever turns by itself', () => {
    // a source turns as it is told; branches hang on the shafts of stores, and have a limit where it is theirs
    const turning = kinds.filter((kind) => kind.role === 'store' && Object.values(kind.ports).includes('shaft'));
    expect(turning.map((kind) => kind.kind)).toEqual(
      expect.arrayContaining(['axle', 'differential', 'inertia', 'planetary-joint']),
    );
    for (const kind of turning)
      if (kind.kind !== 'speed-source') expect(watches(kind, 'over speed'), kind.kind).toBe(true);
    for (const kind of ['pump-motor', 'charge-pump', 'combustion-engine', 'stepped-gearbox'])
      expect(watches(kinds.find((one) => one.kind === kind)!, 'over speed'), kind).toBe(true);
  });
  it('is temperature for every closed store of oil and for gas, level for a tank, the stop for a separator', () => {
    for (const kind of ['oil-volume', 'tank', 'gas-accumulator'])
      expect(watches(kinds.find((one) => one.kind === kind)!, 'over temperature'), kind).toBe(true);
    expect(watches(library.tank, 'level low')).toBe(true);
    expect(watches(library.gasAccumulator, 'end of travel')).toBe(true);
    expect(watches(library.gasAccumulator, 'below precharge')).toBe(true);
  });
  it('is case and inlet pressure and displacement of a unit, inlet pressure of charge pumps', () => {
    for (const level of ['case pressure', 'below least inlet', 'not following'])
      expect(watches(library.pumpMotor, level), level).toBe(true);
    for (const kind of [library.chargePump, library.electricChargePump])
      expect(watches(kind, 'below least inlet'), kind.kind).toBe(true);
  });
  it('names a reading and a parameter that are there', () => {
    for (const kind of kinds)
      for (const limit of kind.limits) {
        expect({ ...kind.readings, ...kind.states }, kind.kind).toHaveProperty(limit.reading);
        expect(kind.parameters, kind.kind).toHaveProperty(limit.parameter);
      }
  });
});

describe('a locked wheel', () => {
  it('shows above walking pace and lets go of it when the vehicle stands', () => {
    const bench = new Bench([
      element('body', library.vehicle, {
        parameters: { mass: 2000, rollingResistance: 0.01 },
        start: { velocity: 12 },
      }),
      element('wheel', library.inertia, { parameters: { inertia: 5 }, start: { speed: 30 } }),
      element('brake', library.serviceBrake, { parameters: { maximumTorque: 20000 }, to: { shaft: 'wheel.shaft' } }),
      element('tyre', library.tyre, {
        parameters: { radius: 0.4, loadShare: 1 },
        to: { wheel: 'wheel.shaft', road: 'body.road' },
      }),
    ]);
    bench.run(0.3);
    expect(bench.get('tyre.lock')).toBeLessThan(0.01);
    bench.set('brake.demand', 1);
    bench.run(0.5);
    expect(bench.get('body.velocity')).toBeGreaterThan(3);
    expect(bench.get('tyre.lock')).toBeGreaterThan(0.85);
    bench.run(2);
    expect(Math.abs(bench.get('body.velocity'))).toBeLessThan(0.3);
    expect(bench.get('tyre.lock')).toBe(0);
  });
});
