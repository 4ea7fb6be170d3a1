import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { z } from 'zod';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { benchSchema } from '../../configs/schema.js';

const folder = new URL('../../configs/harbour-truck/', import.meta.url).pathname;
const bench = readBench(`${folder}bench.yaml`, catalogue);

describe('the reference bench', () => {
  it('reads without a remark', () => {
    expect(bench.remarks).toEqual([]);
    expect(bench.circuit.elements.length).toBeGreaterThan(20);
  });

  it('has a duty that reads', () => {
    expect(readScenario(`${folder}${bench.duty}`, bench).script.ticks).toBeGreaterThan(0);
  });

  it('fits the schema for editors', () => {
    const validator = z.fromJSONSchema(benchSchema(catalogue) as Parameters<typeof z.fromJSONSchema>[0]);
    const { include: _include, ...main } = parse(readFileSync(`${folder}bench.yaml`, 'utf8'));
    for (const part of [main, ...bench.sources.slice(1).map((source) => parse(source.text))]) {
      expect(validator.safeParse(part).error?.issues ?? []).toEqual([]);
    }
  });

  it('declares the signals that the assembled bench has, in the same units', () => {
    const { table } = assemble(bench, { seed: 1 });
    const units = new Map(table.all.map((info) => [info.path, info.unit]));
    expect(bench.signals.filter((info) => units.get(info.path) !== info.unit).map((info) => info.path)).toEqual([]);
    const declared = new Set(bench.signals.map((info) => info.path));
    const own = ['state', 'memory', 'reading', 'command', 'instrument', 'sent', 'received', 'link', 'ledger'];
    expect(
      table.all.filter((info) => own.includes(info.group) && !declared.has(info.path)).map((info) => info.path),
    ).toEqual([]);
  });

  it('protects each high-pressure store by the main relief valve and each low one by the low relief valve', () => {
    const reliefs = Object.fromEntries(
      bench.watched.flatMap((one) => (one.relief ? [[one.path, one.relief.valve]] : [])),
    );
    expect(reliefs).toMatchObject({
      'highLine.pressure': 'mainRelief',
      'highAccumulator.pressure': 'mainRelief',
      'lowLine.pressure': 'lowRelief',
      'lowReservoir.pressure': 'lowRelief',
    });
  });
});
