import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { memoryFiles } from '../../configs/files.js';
import { catalogue } from './catalogue.js';
import { smallBench } from './small-bench.js';

const read = (text: string) => readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text }));

describe('a right bench file', () => {
  const bench = read(smallBench);
  const element = (name: string) => bench.circuit.elements.find((one) => one.name === name)!;

  it('has its general statements in SI', () => {
    expect(bench).toMatchObject({ name: 'small circuit', step: 1e-3, substeps: 4, seed: 1, duty: 'round.yaml' });
    expect(bench.ambient).toEqual({ temperature: 298.15, pressure: 101325 });
    expect(bench.budgets.lateness).toBeCloseTo(150e-6, 12);
    expect(bench.budgets.lostFrames).toBeCloseTo(0.002, 12);
    expect(bench.life).toEqual({
      supply: true,
      key: false,
      preRoll: 200,
      hands: false,
      bootWindow: 500,
      frames: { preRoll: 'silence', afterRun: 'plant' },
      afterRun: 300,
      reset: {
        before: [
          { at: 0, target: 'life.supply', value: 0 },
          { at: 50, target: 'life.supply', value: 1 },
        ],
        after: [{ at: 100, target: 'life.supply', value: 0 }],
      },
    });
    expect(bench.controller).toEqual({ module: undefined, command: 'node controller.js', period: 10, patience: 5 });
  });

  it('has its elements in order, stores first, with defaults and short forms resolved', () => {
    expect(bench.circuit.elements.map((one) => one.name)).toEqual([
      'highAccumulator',
      'highLine',
      'lowLine',
      'propShaft',
      'isolation',
      'mainRelief',
      'pumpMotor',
    ]);
    expect(element('highAccumulator').parameters).toEqual({
      volume: 0.05,
      precharge: 15101325,
      prechargeTemperature: 293.15,
      separator: 0,
      maximumAllowable: 0,
    });
    // The start temperature that nobody gives is that of the surroundings.
    expect(element('highAccumulator').start).toEqual({ temperature: 298.15 });
    expect(element('highLine').start).toEqual({ pressure: 20101325, temperature: 313.15 });
    expect(element('highLine').fluid).toEqual({ air: 0.005 });
    expect(element('highLine').where).toEqual({ file: 'bench.yaml', line: 11, column: 3 });
    expect(element('mainRelief').parameters).toEqual({
      cracking: 33101325,
      fullFlow: 34601325,
      fullFlowRate: 0.2 / 60,
      hysteresis: 1e5,
    });
  });

  it('has its connections, ratios on shafts', () => {
    expect(element('pumpMotor').connections).toEqual({
      high: { store: 'highLine', port: 'oil', ratio: 1 },
      low: { store: 'lowLine', port: 'oil', ratio: 1 },
      shaft: { store: 'propShaft', port: 'shaft', ratio: 1.4 },
    });
  });

  it('has its instruments, with parameters in the unit of what they sense', () => {
    const [sensor, stage] = bench.instruments;
    expect(sensor).toMatchObject({
      name: 'highPressureSensor',
      parameters: { least: 101325, most: 40101325, lag: 0.002 },
      inputs: { of: 'highLine.pressure' },
    });
    expect(stage).toMatchObject({ inputs: { request: 'requests.valve' }, drives: { output: 'isolation.opening' } });
    expect(bench.signals.find((info) => info.path === 'highPressureSensor.value')!.unit).toBe('Pa');
  });

  it('has its message map in ticks and wire units', () => {
    const [sensors, requests] = bench.map.messages;
    expect(sensors).toMatchObject({
      link: 'powertrain',
      direction: 'sent',
      identifier: 1,
      every: 10,
      phase: 2,
      trigger: 'cyclic',
      outOfRange: 'saturate',
    });
    expect(sensors!.signals[0]).toMatchObject({
      path: 'highPressureSensor.value',
      unitScale: 1e5,
      unitOffset: 101325,
      type: 'u16',
      scale: 0.01,
      least: 0,
      most: 400,
    });
    expect(sensors!.signals[1]).toMatchObject({ unit: 'rpm', least: -4000, most: 4000, type: 'f32' });
    expect(requests).toMatchObject({ direction: 'received', timeout: 50, outOfRange: 'refuse' });
    expect(requests!.signals.map((signal) => [signal.path, signal.substitute, signal.type])).toEqual([
      ['pumpMotor.torqueRequest', 0, 'f32'],
      ['', 0, 'u8'],
      ['', 0, 'u8'],
    ]);
    expect(requests!.signals[2]).toMatchObject({ names: { off: 0, drive: 1 }, least: 0, most: 1 });
  });

  it('knows what to watch: limits of elements, the relief of each side, additions', () => {
    const watched = new Map(bench.watched.map((one) => [one.path, one]));
    const high = watched.get('highLine.pressure')!;
    expect(high.limits.map((limit) => [limit.level, limit.side, limit.setting, limit.from])).toEqual([
      ['above maximum', 'above', 35101325, 'highLine.maximumAllowable'],
      // 1.1 PS as gauge pressure: 385 bar(g).
      ['above 1.1 maximum', 'above', 38601325, 'highLine.maximumAllowable'],
    ]);
    expect(high.relief).toEqual({ valve: 'mainRelief', setting: 33101325 });
    expect(watched.get('highAccumulator.pressure')!.relief).toEqual({ valve: 'mainRelief', setting: 33101325 });
    expect(watched.get('highAccumulator.pressure')!.limits.map((limit) => limit.level)).toEqual(['below precharge']);
    expect(watched.get('lowLine.pressure')).toMatchObject({
      limits: [{ level: 'below least inlet', setting: 3e5, from: 'watch' }],
    });
    expect(watched.get('lowLine.pressure')!.relief).toBeUndefined();
  });

  it('records what its patterns match, in the order of the signals', () => {
    expect(bench.record.signals).toEqual([
      'highAccumulator.gasTemperature',
      'highAccumulator.pressure',
      'highAccumulator.gasPressure',
      'highLine.mass',
      'highLine.pressure',
      'highLine.inflow',
      'propShaft.speed',
      'highPressureSensor.value',
    ]);
    expect(bench.record.peaks).toContain('lowLine.pressure');
  });

  it('carries its text and has no remarks', () => {
    expect(bench.sources).toEqual([{ name: 'bench.yaml', text: smallBench }]);
    expect(bench.remarks).toEqual([]);
  });

  it('is plain data but for its kinds', () => {
    const { circuit, instruments, ...plain } = bench;
    expect(structuredClone(plain)).toEqual(plain);
    expect(circuit.elements).toHaveLength(7);
    expect(instruments).toHaveLength(2);
  });
});

describe('a bench in several files', () => {
  const cut = smallBench.indexOf('links:');
  const wires = smallBench.indexOf('watch:');
  const parts = {
    'truck/bench.yaml': `include: [parts, messages.yaml]\n${smallBench.slice(0, smallBench.indexOf('stores:'))}${smallBench.slice(wires)}`,
    'truck/parts/circuit.yaml': smallBench.slice(smallBench.indexOf('stores:'), smallBench.indexOf('instruments:')),
    'truck/parts/instruments.yaml': smallBench.slice(smallBench.indexOf('instruments:'), cut),
    'truck/messages.yaml': smallBench.slice(cut, wires),
  };

  it('says the same, with places in its own files', () => {
    const whole = read(smallBench);
    const bench = readBench('truck/bench.yaml', catalogue, memoryFiles(parts));
    expect(bench.map).toEqual(whole.map);
    expect(bench.circuit.elements.map(({ where: _where, ...rest }) => rest)).toEqual(
      whole.circuit.elements.map(({ where: _where, ...rest }) => rest),
    );
    expect(bench.circuit.elements[0]!.where).toEqual({ file: 'truck/parts/circuit.yaml', line: 2, column: 3 });
    expect(bench.sources.map((source) => source.name)).toEqual([
      'bench.yaml',
      'parts/circuit.yaml',
      'parts/instruments.yaml',
      'messages.yaml',
    ]);
  });

  it('reads again from the texts that it carries', () => {
    const bench = readBench('truck/bench.yaml', catalogue, memoryFiles(parts));
    const again = readBench(
      'bench.yaml',
      catalogue,
      memoryFiles(Object.fromEntries(bench.sources.map((source) => [source.name, source.text]))),
    );
    expect(again.map).toEqual(bench.map);
    expect(again.watched).toEqual(bench.watched);
  });

  it('is read from the disk', () => {
    const folder = mkdtempSync(join(tmpdir(), 'bench-'));
    try {
      writeFileSync(join(folder, 'bench.yaml'), parts['truck/bench.yaml'].replace('[parts, messages.yaml]', 'rest'));
      expect(() => readBench(join(folder, 'bench.yaml'), catalogue)).toThrow(
        `${join(folder, 'bench.yaml')}:1:10 include: no such file, ${join(folder, 'rest')}, check the name`,
      );
      writeFileSync(join(folder, 'rest'), smallBench.slice(smallBench.indexOf('stores:'), wires));
      expect(readBench(join(folder, 'bench.yaml'), catalogue).name).toBe('small circuit');
    } finally {
      rmSync(folder, { recursive: true });
    }
  });
});
