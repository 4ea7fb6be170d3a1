import { readFileSync, rmSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import type { RecordingView } from '../../../bridge/live/source.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { readScenario } from '../../../configs/scenario.js';
import { Recorder } from '../../../runtime/recording/recorder.js';
import { RecordingWriter } from '../../../runtime/recording/writer.js';
import { createRing } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';
import { benchFacts, nameInWords } from '../../../tools/live/bench-facts.js';
import { recordingShelf } from '../../../tools/live/recording-shelf.js';
import { sampleHeader, scratchFile } from '../../runtime/recording/sample.js';

const root = new URL('../../..', import.meta.url).pathname;
const benchFile = path.join(root, 'configs/harbour-truck/bench.yaml');
const spec = readBench(benchFile, catalogue);
const { script } = readScenario(path.join(path.dirname(benchFile), spec.duty ?? ''), spec);
const facts = benchFacts({ spec, script, recorded: spec.signals, control: true });
const paths = new Set(spec.signals.map((info) => info.path));

test('the facts of a bench name only what is recorded, and every element of its file', () => {
  expect(facts.elements.map((element) => element.name)).toEqual(spec.circuit.elements.map((element) => element.name));
  const named = [
    ...facts.pressures.map((pressure) => pressure.path),
    ...facts.accumulators.flatMap((accumulator) => [accumulator.pressure, accumulator.volume]),
    ...facts.powers.map((power) => power.path),
    ...facts.hands.map((hand) => hand.path),
    ...facts.charts.flatMap((chart) => chart.paths),
    ...facts.elements.flatMap((element) => [...element.shows, ...element.faults.map((fault) => fault.path)]),
  ];
  expect(named.filter((one) => !paths.has(one))).toEqual([]);
  expect(named.length).toBeGreaterThan(60);
});

test('settings stand where the bench file puts them', () => {
  const bar = (gauge: number) => gauge * 1e5 + spec.ambient.pressure;
  const line = facts.pressures.find((pressure) => pressure.path === 'highLine.pressure');
  expect(line?.relief).toBeCloseTo(bar(330), -3);
  expect(line?.maximumAllowable).toBeCloseTo(bar(350), -3);
  const accumulator = facts.accumulators.find((one) => one.name === 'High accumulator');
  expect(accumulator?.gasVolume).toBeCloseTo(0.05, 9);
  expect(accumulator?.precharge).toBeCloseTo(bar(150), -3);
  // every pressure has room above its highest setting
  for (const { scaleMost, relief = 0, maximumAllowable = 0 } of facts.pressures)
    expect(scaleMost).toBeGreaterThan(Math.max(relief, maximumAllowable));
  const valve = facts.elements.find((element) => element.name === 'isolationValve');
  expect(valve).toMatchObject({ flow: 'isolationValve.flow', position: { zero: 'closed', one: 'open' } });
  expect(valve?.ports.map((port) => port.store)).toEqual(['highAccumulator', 'highLine']);
  expect(facts.hands.find((hand) => hand.path === 'pumpMotor.wear')).toMatchObject({ kind: 'fault', rest: 1 });
  expect(
    facts.hands
      .filter((hand) => hand.kind !== 'fault' && hand.kind !== 'key' && hand.kind !== 'supply')
      .every((hand) => hand.deadMan !== undefined),
  ).toBe(true);
});

test('names are words', () => {
  expect(nameInWords('highLine.pressure')).toBe('High line');
  expect(nameInWords('pumpMotor.inletPressure')).toBe('Pump motor inlet pressure');
});

const file = scratchFile('round.osrec');
const columns = spec.signals.filter((info) => info.path === 'highLine.pressure' || info.path === 'body.velocity');
const pressureAt = (tick: number) => (tick === 7_123 ? 4.4e7 : 2.4e7 + 1e6 * Math.sin(tick / 900));
let view: RecordingView;

beforeAll(async () => {
  const handle = createRing({ capacity: 1 << 18, whenFull: 'drop' });
  const journal = new RingJournal(
    handle,
    Int32Array.from(columns, (_, i) => i),
  );
  const header = sampleHeader({
    bench: {
      name: spec.name,
      files: spec.sources.map((source) => ({
        path: path.relative(path.dirname(benchFile), path.resolve(source.name)),
        text: source.text,
      })),
    },
    options: { script: JSON.stringify(script) },
    signals: columns.map(({ path: one, unit, about, group }) => ({ path: one, unit, about, group })),
    events: {
      kinds: [
        { name: 'relief passing: highLine.pressure', severity: 'alarm', text: '{subject} passes' },
        { name: 'warning over, Pa', severity: 'note', text: '{subject} over' },
        { name: 'warning acknowledged, Pa', severity: 'note', text: '{subject} acknowledged' },
      ],
      subjects: ['highLine.pressure'],
    },
  });
  const recorder = new Recorder(handle, new RecordingWriter(file, header), { signals: columns.length });
  const signals = new Float64Array(columns.length);
  const hash = new Int32Array(2);
  for (let tick = 0; tick < 20_000; tick += 1) {
    signals[columns.findIndex((info) => info.path === 'highLine.pressure')] = pressureAt(tick);
    signals[columns.findIndex((info) => info.path === 'body.velocity')] = tick / 1000;
    if (tick === 7_123) journal.event(tick, 0, 0, 4.4e7, 3.31e7, 0);
    if (tick === 7_400) journal.event(tick, 1, 0, 4.4e7, 3.31e7, 0.001);
    if (tick === 9_000) journal.event(tick, 2, 0, 4.4e7, 3.31e7, 1.8);
    journal.row(tick, signals, hash);
    if (tick % 500 === 0) recorder.drain();
  }
  journal.close();
  await recorder.finish({ verdict: 'pass', simulated: 20 });
  view = await recordingShelf(path.dirname(file)).open('round.osrec');
});
afterAll(async () => {
  await view?.close();
  rmSync(path.dirname(file), { recursive: true });
});

test('a recording stands on the shelf under its name, and a file that is none does not', async () => {
  const list = await recordingShelf(path.dirname(file)).list();
  expect(list).toMatchObject([
    { name: 'round.osrec', bench: spec.name, scenario: script.name, verdict: 'pass', length: 20 },
  ]);
  expect(await recordingShelf('/nowhere').list()).toEqual([]);
});

test('the shelf says of a recording without its end that it was cut off, unless it is being written', async () => {
  const folder = path.dirname(scratchFile('shelf'));
  const whole = readFileSync(file);
  const name = path.join(folder, 'cut.osrec');
  for (const cut of [1, 9, Math.floor(whole.length / 2)]) {
    writeFileSync(name, whole.subarray(0, whole.length - cut));
    expect(await recordingShelf(folder).list()).toMatchObject([{ name: 'cut.osrec', verdict: 'not valid: cut off' }]);
    expect(await recordingShelf(folder, { writing: name }).list()).toMatchObject([{ verdict: 'still running' }]);
  }
  // the right length, but not the end that was written
  const spoilt = Buffer.from(whole);
  spoilt[spoilt.length - 3]! ^= 1;
  writeFileSync(name, spoilt);
  expect(await recordingShelf(folder).list()).toMatchObject([{ verdict: 'not valid: cut off' }]);
  rmSync(folder, { recursive: true });
});

test('looking back shows the spike at every width and the value of the very tick', async () => {
  const at = view.signals.findIndex((info) => info.path === 'highLine.pressure');
  for (const [from, to, bins] of [
    [0, 19_999, 100],
    [0, 19_999, 4000],
    [7_000, 7_300, 300],
    [7_123, 7_123, 1],
  ]) {
    const history = await view.history([at], from, to, bins);
    expect(Math.max(...history.most)).toBe(Math.fround(4.4e7));
  }
  const moment = await view.history([1 - at, at], 12_345, 12_345, 1);
  expect([...moment.ticks]).toEqual([12_345]);
  expect([...moment.least]).toEqual([Math.fround(12.345), Math.fround(pressureAt(12_345))]);
});

test('warnings stand as they stood at each moment', async () => {
  const at = async (tick: number) => (await view.statusAt(tick)).warnings;
  expect(await at(7_122)).toEqual([]);
  expect(await at(7_200)).toMatchObject([
    { level: 'relief passing', active: true, acknowledged: false, sinceTick: 7_123, peak: Math.fround(4.4e7) },
  ]);
  expect(await at(8_000)).toMatchObject([{ active: false, acknowledged: false }]);
  expect(await at(9_000)).toEqual([]);
  const status = await view.statusAt(17_000);
  expect(facts.scenario.steps[status.scenario.step]?.name).toBe('brake for the first delivery');
});
