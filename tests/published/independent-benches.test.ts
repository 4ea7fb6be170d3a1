import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { printC } from '../../runtime/circuit/print-c.js';
import { Plant } from '../../runtime/plant.js';
import { freeze } from '../../tools/check/accuracy.js';
import { scaleOf } from '../../tools/check/sheet.js';
import { type Barrier, loadController, moduleBarrier } from '../../tools/loop/controller-module.js';

/**
 * The other ready benches against CVODE of SUNDIALS at a tolerance of 1e-9 on their printed C: the solver is another one,
 * the equations are the same (those of the truck are written apart: independent-truck.test.ts). The first seconds of the
 * duty, its commands frozen.
 */
const source = new URL('c/printed.c', import.meta.url).pathname;
const libraries = ['cvode', 'nvecserial', 'sunmatrixdense', 'sunlinsoldense'].map((name) => `-lsundials_${name}`);
const folder = mkdtempSync(join(tmpdir(), 'independent-'));
const probe = spawnSync('cc', ['-E', '-include', 'cvode/cvode.h', '-x', 'c', '/dev/null'], { encoding: 'utf8' });
const why = probe.error ? 'no C compiler' : probe.status !== 0 ? 'no SUNDIALS headers' : '';
if (why) console.log(`not run: the ready benches by another solver: ${why}`);
const root = new URL('../../configs/', import.meta.url).pathname;

afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe.skipIf(why !== '' && process.env.CI === undefined).each([
  ['refuse-collector', 5],
  ['shuttle-bus', 5],
  ['flywheel-stand', 8],
] as const)('%s', (name, seconds) => {
  it('every pressure stays within 0.5 % of its setting', { timeout: 300_000 }, async () => {
    const spec = readBench(`${root}${name}/bench.yaml`, catalogue);
    const { script } = readScenario(`${root}${name}/${spec.duty}`, spec);
    const assembly = assemble(spec, { seed: spec.seed, script });
    const { circuit } = assembly;
    const barriers: Barrier[] = [];
    if (spec.controller?.module !== undefined) {
      const { barrier, transports } = moduleBarrier(
        spec.map,
        assembly.exchange.checksum,
        await loadController(`${root}${name}/`, spec.controller.module),
        spec.step,
        spec.controller.period,
      );
      for (const { link, transport } of transports) assembly.exchange.attach(link, transport);
      barriers.push(barrier);
    }
    const ticks = Math.round(seconds / spec.step);
    const drive = freeze(assembly, barriers, ticks, () => true);
    const scale = scaleOf(spec);
    const signals = circuit.readings.flatMap((slot, index) =>
      slot.group === 'reading' && slot.unit === 'Pa' && scale(slot.path) !== undefined ? [{ index, slot }] : [],
    );
    expect(signals.length).toBeGreaterThan(2);

    const bench = Plant.alone(circuit, assembly.plant.settings);
    const place = (file: string) => join(folder, `${name}${file}`);
    writeFileSync(place('.c'), printC(circuit));
    const built = spawnSync(
      'cc',
      ['-O1', '-ffp-contract=off', `-DPRINTED="${place('.c')}"`, '-o', place(''), source, ...libraries, '-lm'],
      { encoding: 'utf8' },
    );
    expect(built.stderr).toBe('');
    const lines = [`r ${spec.step} ${bench.settings.substeps}`];
    circuit.states.forEach((_, i) => {
      lines.push(`y ${i} ${bench.y[i]}`);
    });
    circuit.memory.forEach((slot, i) => {
      lines.push(`m ${i} ${bench.m[i]} ${slot.unit === '1' && !slot.name.startsWith('delay') ? 1 : 0}`);
    });
    for (const { index } of signals) lines.push(`o ${index}`);
    const count = circuit.commands.length;
    for (let tick = 0; tick < ticks; tick += 1) {
      lines.push('t');
      for (let i = 0; i < count; i += 1) {
        const value = drive.commands[tick * count + i]!;
        if (tick === 0 || value !== drive.commands[(tick - 1) * count + i]) lines.push(`c ${i} ${value}`);
      }
    }
    writeFileSync(place('.in'), `${lines.join('\n')}\n`);
    const run = spawnSync(place(''), [place('.in'), place('.out')], { encoding: 'utf8' });
    expect(run.stderr).toBe('');
    const bytes = readFileSync(place('.out'));
    const truth = new Float64Array(bytes.buffer, bytes.byteOffset, bytes.byteLength / 8);
    expect(truth.length).toBe(ticks * signals.length);
    const worst = signals.map(() => ({ share: 0, at: 0, moved: 0 }));
    for (let tick = 0; tick < ticks; tick += 1) {
      bench.u.set(drive.commands.subarray(tick * count, (tick + 1) * count));
      bench.step();
      signals.forEach(({ index, slot }, i) => {
        const value = truth[tick * signals.length + i]!;
        const share = Math.abs(bench.observed[index]! - value) / scale(slot.path)!;
        worst[i]!.moved = Math.max(worst[i]!.moved, Math.abs(value - truth[i]!) / scale(slot.path)!);
        if (!(share <= worst[i]!.share)) Object.assign(worst[i]!, { share, at: tick });
      });
    }
    const rows = signals.map(
      ({ slot }, i) =>
        `  ${slot.path.padEnd(30)} ${(100 * worst[i]!.share).toFixed(4).padStart(8)} % of its setting at ${(worst[i]!.at * spec.step).toFixed(3)} s\n`,
    );
    process.stdout.write(`${name} by CVODE, ${seconds} s:\n${rows.join('')}`);
    signals.forEach(({ slot }, i) => {
      expect(worst[i]!.share, slot.path).toBeLessThan(0.005);
    });
    expect(Math.max(...worst.map((one) => one.share))).toBeGreaterThan(0);
    expect(Math.max(...worst.map((one) => one.moved))).toBeGreaterThan(0.02);
  });
});
