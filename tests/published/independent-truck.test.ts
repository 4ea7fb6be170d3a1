import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { Plant } from '../../runtime/plant.js';
import { scaleOf } from '../../tools/check/sheet.js';
import { loadTruckController, makeTruck, type Truck } from '../system/truck.js';

/**
 * The reference truck's plant against an independent solution: written by hand in C from the laws (c/truck.c shares no
 * line with the elements), solved by CVODE of SUNDIALS (Hindmarsh et al., ACM Trans. Math. Softw. 31 (2005) 363) at a
 * tolerance of 1e-9, under the commands of a driven round, frozen, and then a slam of the isolation valve.
 */
const source = new URL('c/truck.c', import.meta.url).pathname;
const libraries = ['cvode', 'nvecserial', 'sunmatrixdense', 'sunlinsoldense'].map((name) => `-lsundials_${name}`);
const folder = mkdtempSync(join(tmpdir(), 'independent-'));
const built = spawnSync('cc', ['-O2', '-o', join(folder, 'truck'), source, ...libraries, '-lm'], { encoding: 'utf8' });
const why = built.error ? 'no C compiler' : /sundials.*No such file/.test(built.stderr) ? 'no SUNDIALS headers' : '';
if (why) console.log(`not run: the independent solution of the truck: ${why}`);

const driven = 12_000;
const slammed = 400;
const pressures = ['highAccumulator', 'lowReservoir', 'highLine', 'lowLine', 'pumpCase'].map(
  (name) => `${name}.pressure`,
);
/** What the C program writes, in its order. */
const written = [
  ...pressures,
  'highAccumulator.gasPressure',
  'pumpShaft.speed',
  'engineShaft.speed',
  'propShaft.speed',
  'rearAxle.speed',
  'body.velocity',
];

describe.skipIf(why !== '' && process.env.CI === undefined)('the reference truck', () => {
  let truck: Truck;
  /** Per signal: largest difference, and the largest value. */
  const differences = written.map(() => ({ worst: 0, at: 0, largest: 0 }));
  let settings: (path: string) => number | undefined;

  beforeAll(async () => {
    expect(built.stderr).toBe('');
    truck = makeTruck(await loadTruckController());
    settings = scaleOf(truck.spec);
    const { assembly } = truck;
    const { circuit, plant } = assembly;
    const count = circuit.commands.length;
    // the round, closed loop; then the isolation valve slams at its largest flow of that round
    const rows: Float64Array[] = [];
    const flow = assembly.table.find('isolationValve.massFlow');
    let slam = 0;
    let most = 0;
    truck.run(driven, (tick) => {
      if (tick < 0) return;
      rows.push(plant.u.slice());
      const size = Math.abs(assembly.signals[flow]!);
      if (size > most && tick > 1000) [most, slam] = [size, tick];
    });
    rows.length = Math.max(slam, 1);
    const held = rows[slam - 1]!;
    const open = circuit.commands.findIndex((command) => command.path === 'isolationValve.open');
    for (let k = 0; k < slammed; k += 1) {
      const row = held.slice();
      row[open] = k < slammed / 2 ? 0 : 1;
      rows.push(row);
    }
    for (const row of rows)
      circuit.commands.forEach((command, i) => {
        if (command.fault) expect(row[i], command.path).toBe(command.rest);
      });

    const bench = Plant.alone(circuit, plant.settings);
    writeFileSync(join(folder, 'input'), inputOf(truck, bench, rows));
    const run = spawnSync(join(folder, 'truck'), [join(folder, 'input'), join(folder, 'output')], { encoding: 'utf8' });
    expect(run.stderr).toBe('');
    const bytes = readFileSync(join(folder, 'output'));
    const truth = new Float64Array(bytes.buffer, bytes.byteOffset, bytes.byteLength / 8);
    expect(truth.length).toBe(rows.length * written.length);
    const signals = written.map((path) => {
      const reading = circuit.readings.findIndex((slot) => slot.path === path);
      const state = circuit.states.findIndex((slot) => slot.path === path);
      return reading >= 0 ? () => bench.observed[reading]! : () => bench.y[state]!;
    });
    rows.forEach((row, tick) => {
      expect(row.length).toBe(count);
      bench.u.set(row);
      bench.step();
      signals.forEach((read, i) => {
        const value = truth[tick * written.length + i]!;
        const difference = Math.abs(read() - value);
        const one = differences[i]!;
        one.largest = Math.max(one.largest, Math.abs(value));
        if (!(difference <= one.worst)) Object.assign(one, { worst: difference, at: tick });
      });
    });
    const table = written.map((path, i) => {
      const { worst, at, largest } = differences[i]!;
      const scale = settings(path) ?? largest;
      return `  ${path.padEnd(30)} ${((100 * worst) / scale).toFixed(4).padStart(8)} % of ${(settings(path) === undefined ? 'its largest value' : 'its setting').padEnd(18)} at ${(at / 1000).toFixed(3)} s\n`;
    });
    process.stdout.write(
      `independent solution of the truck, ${(rows.length / 1000).toFixed(1)} s, slam at ${(slam / 1000).toFixed(2)} s with ${most.toFixed(2)} kg/s:\n${table.join('')}`,
    );
  }, 300_000);

  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  it.each(pressures)('%s stays within 0.5 %% of its setting', (path) => {
    const one = differences[written.indexOf(path)]!;
    expect(settings(path)).toBeGreaterThan(0);
    expect(one.worst / settings(path)!).toBeLessThan(0.005);
    // and the two are not the same program
    expect(one.worst).toBeGreaterThan(0);
  });

  it('speeds stay within 0.5 % of their largest values', () => {
    for (const path of written.slice(6)) {
      const one = differences[written.indexOf(path)]!;
      expect(one.worst / one.largest, path).toBeLessThan(0.005);
    }
  });

  it('went through a recovery and a launch: pressure and speed moved', () => {
    expect(differences[written.indexOf('body.velocity')]!.largest).toBeGreaterThan(5);
    expect(differences[written.indexOf('highLine.pressure')]!.largest).toBeGreaterThan(200e5);
  });
});

/** Parameters, fluid, ratios, start values, names and the commands of every tick, as text. */
function inputOf(truck: Truck, bench: Plant, rows: readonly Float64Array[]): string {
  const { circuit, spec } = truck.assembly;
  const lines = [`n run.step ${spec.step}`, `n run.substeps ${bench.settings.substeps}`];
  const number = (path: string, value: number) => lines.push(`n ${path} ${value}`);
  for (const element of circuit.spec.elements) {
    for (const [name, value] of Object.entries(element.parameters)) number(`${element.name}.${name}`, value);
    for (const [port, connection] of Object.entries(element.connections))
      number(`${element.name}.${port}`, connection.ratio);
  }
  const oil = circuit.spec.elements.find((element) => element.fluid)!.fluid!;
  for (const [name, value] of Object.entries(oil)) number(`fluid.${name}`, value);
  circuit.states.forEach((slot, i) => {
    number(slot.path, bench.y[i]!);
  });
  circuit.memory.forEach((slot, i) => {
    number(slot.path, bench.m[i]!);
  });
  for (const command of circuit.commands) lines.push(`u ${command.path}`);
  let last: Float64Array | undefined;
  for (const row of rows) {
    lines.push('t');
    for (let i = 0; i < row.length; i += 1) if (row[i] !== last?.[i]) lines.push(`c ${i} ${row[i]}`);
    last = row;
  }
  return `${lines.join('\n')}\n`;
}
