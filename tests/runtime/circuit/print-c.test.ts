import { spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import koffi from 'koffi';
import { afterAll, describe, expect, it } from 'vitest';
import type { Circuit } from '../../../runtime/circuit/build.js';
import { printC } from '../../../runtime/circuit/print-c.js';
import { Plant } from '../../../runtime/plant.js';
import { Bench } from '../../support/circuit.js';
import { hardCircuits } from '../../system/hard-circuits.js';
import { loadTruckController, makeTruck } from '../../system/truck.js';

/** The circuit printed as C, compiled without contraction, against the JavaScript of the same circuit. */
const here = spawnSync('cc', ['--version']).status === 0;
const mustRun = process.env['CI'] === 'true';
if (!here && !mustRun) console.log('not run: circuits printed as C: no C compiler on this machine');
const folder = mkdtempSync(join(tmpdir(), 'oilspring-circuit-'));
afterAll(() => rmSync(folder, { recursive: true }));

interface InC {
  rates(y: Float64Array, u: Float64Array, m: Float64Array, d: Float64Array): void;
  jacobian(y: Float64Array, u: Float64Array, m: Float64Array, d: Float64Array, J: Float64Array): void;
  step(y: Float64Array, u: Float64Array, m: Float64Array, h: number, substeps: number, counts: BigInt64Array): void;
}

let count = 0;
function compiled(circuit: Circuit): InC {
  count += 1;
  const source = join(folder, `circuit${count}.c`);
  const library = join(folder, `circuit${count}.so`);
  writeFileSync(source, printC(circuit));
  const flags = [
    '-std=c11',
    '-O2',
    '-ffp-contract=off',
    '-Wall',
    '-Wno-unused-variable',
    '-Werror',
    '-shared',
    '-fPIC',
  ];
  const done = spawnSync('cc', [...flags, '-o', library, source, '-lm'], { encoding: 'utf8' });
  expect(done.stderr).toBe('');
  expect(done.status).toBe(0);
  const loaded = koffi.load(library);
  return {
    rates: loaded.func('void oilspring_rates(double *y, double *u, double *m, _Out_ double *d)'),
    jacobian: loaded.func(
      'void oilspring_rates_and_jacobian(double *y, double *u, double *m, _Out_ double *d, _Out_ double *J)',
    ),
    step: loaded.func(
      'void oilspring_step(_Inout_ double *y, double *u, _Inout_ double *m, double h, int substeps, _Inout_ int64_t *counts)',
    ),
  };
}

/** Largest difference between C and JavaScript at the plant's state, as a share of the terms that each value is made of. */
function differences(plant: Plant, c: InC): { rates: number; jacobian: number; step: number; refined: number } {
  const { circuit, y, u, m } = plant;
  const { rows, columns } = circuit.jacobian;
  const n = circuit.states.length;
  const own = { d: new Float64Array(n), e: new Float64Array(n + 8), J: new Float64Array(rows.length) };
  const other = { d: new Float64Array(n), e: new Float64Array(n + 8), J: new Float64Array(rows.length) };
  circuit.functions.rates(y, u, m, own.d);
  c.rates(y, u, m, other.d);
  circuit.functions.ratesAndJacobian(y, u, m, own.e, own.J);
  c.jacobian(y, u, m, other.e, other.J);
  const term = new Float64Array(n);
  rows.forEach((row, k) => {
    const state = columns[k]!;
    term[row] = Math.max(term[row]!, Math.abs(own.J[k]!) * (Math.abs(y[state]!) + circuit.states[state]!.scale));
  });
  let rates = 0;
  for (let i = 0; i < n; i += 1) {
    const size = Math.abs(own.d[i]!) + term[i]! + 1e-300;
    rates = Math.max(rates, Math.abs(own.d[i]! - other.d[i]!) / size, Math.abs(own.e[i]! - other.e[i]!) / size);
  }
  let jacobian = 0;
  rows.forEach((row, k) => {
    const scale = Math.abs(y[columns[k]!]!) + circuit.states[columns[k]!]!.scale;
    jacobian = Math.max(jacobian, (Math.abs(own.J[k]! - other.J[k]!) * scale) / (term[row]! + 1e-300));
  });
  const twin = Plant.alone(circuit, { ...plant.settings, longest: 1 });
  twin.y.set(y);
  twin.m.set(m);
  twin.u.set(u);
  const y2 = y.slice();
  // never of length zero: an address is wanted
  const m2 = new Float64Array(m.length + 1);
  m2.set(m);
  twin.step();
  const counts = new BigInt64Array(2);
  c.step(y2, u, m2, plant.settings.step / plant.settings.substeps, plant.settings.substeps, counts);
  expect(Number(counts[0])).toBe(twin.solver.refined);
  expect(Number(counts[1])).toBe(twin.solver.replaced);
  let step = 0;
  for (let i = 0; i < n; i += 1) {
    step = Math.max(step, Math.abs(y2[i]! - twin.y[i]!) / (Math.abs(y[i]!) + circuit.states[i]!.scale));
  }
  return { rates, jacobian, step, refined: twin.solver.refined };
}

describe.skipIf(!here && !mustRun)('a circuit printed as C', () => {
  it('computes the rates, Jacobian and steps of the harbour truck along its duty', async () => {
    const truck = makeTruck(await loadTruckController());
    const { plant, circuit } = truck.assembly;
    const c = compiled(circuit);
    let points = 0;
    truck.run(12_000, (tick) => {
      if (tick < 0 || tick % 400 !== 200) return;
      points += 1;
      const { rates, jacobian, step } = differences(plant, c);
      expect(rates, `rates at ${tick} ms`).toBeLessThan(1e-12);
      expect(jacobian, `Jacobian at ${tick} ms`).toBeLessThan(1e-12);
      expect(step, `step at ${tick} ms`).toBeLessThan(1e-12);
    });
    expect(points).toBe(30);
  });

  it('takes the same way through the safety net: lines a few bar out of balance', () => {
    let refined = 0;
    for (const [, hard] of hardCircuits.slice(0, 4)) {
      const bench = new Bench(hard.elements());
      const c = compiled(bench.circuit);
      const { plant } = bench;
      bench.run(Math.min(0.3, hard.seconds), (time) => {
        hard.drive((path, value) => bench.set(path, value), time);
        if (Math.round(time * 1000) % 10 !== 5) return;
        const before = plant.y.slice();
        bench.circuit.states.forEach((state, i) => {
          if (state.name === 'mass') plant.y[i] = plant.y[i]! * (i % 2 === 0 ? 1.01 : 0.995);
        });
        const result = differences(plant, c);
        expect(result.rates).toBeLessThan(1e-12);
        expect(result.step).toBeLessThan(1e-9);
        refined += result.refined;
        plant.y.set(before);
      });
    }
    expect(refined).toBeGreaterThan(10);
  });
});
