import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { problemText } from '../../runtime/contract.js';

const circuit = (line: string, more = '') => `bench: reliefs
fluids: { oil: { is: mineral-oil } }
stores:
  tank: { is: tank, volume: 30 L }
  accumulator: { is: gas-accumulator, volume: 10 L, precharge: 100 bar(g), maximumAllowable: 320 bar(g) }
  line: { is: oil-volume, volume: 1 L${line} }
  far: { is: oil-volume, volume: 1 L }
branches:
  isolation: { is: isolation-valve, from: accumulator, to: line, area: 100 mm2 }
  hose: { is: pipe, from: accumulator, to: far, length: 1 m, diameter: 16 mm }
  relief: { is: relief-valve, from: line, to: tank, cracking: 330 bar(g), fullFlow: 345 bar(g) at 200 L/min }
  charge: { is: electric-charge-pump, inlet: tank, outlet: line, displacement: 8 cm3, cracking: 16 bar(g), fullFlow: 18 bar(g), fullFlowRate: 25 L/min }
  check: { is: check-valve, from: tank, to: line, area: 50 mm2 }
${more}`;
const read = (text: string) => readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text }));
const reliefs = (text: string) =>
  Object.fromEntries(
    read(text)
      .watched.filter((one) => one.relief)
      .map((one) => [one.path, [one.relief!.valve, one.relief!.setting]]),
  );

describe('the relief valve of a side', () => {
  it('is the own one before the one in a charge pump, and reaches through valves and pipes', () => {
    expect(reliefs(circuit(''))).toEqual({
      'accumulator.pressure': ['relief', 33101325],
      'line.pressure': ['relief', 33101325],
      'far.pressure': ['relief', 33101325],
    });
  });

  it('gives stores their relief setting when the file does not', () => {
    const { circuit: spec } = read(circuit(''));
    const setting = (name: string) =>
      spec.elements.find((element) => element.name === name)!.parameters['reliefSetting'];
    expect(setting('line')).toBe(33101325);
    expect(setting('accumulator')).toBe(33101325);
  });

  it('gives way to what a store states, with a remark', () => {
    const text = circuit(', reliefSetting: 300 bar(g)');
    expect(reliefs(text)['line.pressure']).toEqual(['relief', 30101325]);
    expect(read(text).remarks.map(problemText)).toContain(
      'bench.yaml:6:40 stores.line.reliefSetting: another relief setting than that of relief, 300 bar(g), 330 bar(g), leave it away or make the two agree',
    );
    expect(reliefs(circuit(', reliefSetting: 0 bar(a)'))['line.pressure']).toBeUndefined();
  });

  it('that is set above what a store behind it may carry is remarked, at the store itself refused', () => {
    expect(read(circuit('')).remarks.map(problemText)).toEqual([
      'bench.yaml:5:76 stores.accumulator.maximumAllowable: relief valve of this side, relief, is set higher, 330 bar(g), PS of accumulator is 320 bar(g), give the store a relief valve of its own or lower that one',
    ]);
    expect(() => read(circuit(', maximumAllowable: 325 bar(g)'))).toThrow(
      'bench.yaml:11:53 branches.relief.cracking: relief setting above the maximum allowable pressure, 330 bar(g), PS of line is 325 bar(g), set it to 325 bar(g) or below',
    );
  });

  it('can be named for a signal', () => {
    const text = circuit('', 'watch: { far.pressure: { relief: charge, vicinity: 10 %, lookAhead: 0.5 s } }\n');
    expect(read(text).watched.find((one) => one.path === 'far.pressure')).toMatchObject({
      relief: { valve: 'charge', setting: 1701325 },
      vicinity: 0.1,
      lookAhead: 0.5,
    });
  });
});
