import { parseRequirements } from '../../configs/requirements.js';
import { BlockLayout } from '../../runtime/block.js';
import type { SignalInfo } from '../../runtime/contract.js';
import { compileRequirements } from '../../runtime/judge/monitor.js';
import { SignalTable } from '../../runtime/signals.js';

/**
 * Prints what 50 requirements cost a tick, as JSON: median and worst, memory, and what the heap grew. A process of its own, started by
 * the part `judge` of the measurements: nothing else of the project has run in it.
 */

const infos: SignalInfo[] = [];
const signal = (path: string, unit: string) => infos.push({ path, unit, about: '', group: 'reading' });
for (const side of ['high', 'low']) {
  signal(`${side}Line.pressure`, 'Pa');
  signal(`${side}Accumulator.gasPressure`, 'Pa');
  signal(`${side}Accumulator.temperature`, 'K');
  signal(`${side}PressureSensor.value`, 'Pa');
}
signal('vehicle.speed', 'm/s');
signal('driver.brakePedal', '1');
signal('driver.throttlePedal', '1');
signal('engine.speed', 'rad/s');
signal('engine.torque', 'N m');
signal('engine.fuelFlow', 'kg/s');
signal('pumpMotor.torque', 'N m');
signal('pumpMotor.displacement', '1');
signal('isolation.position', '1');
signal('relief.power', 'W');
signal('relief.passing', '1');

/** Ten kinds, five of each with other numbers: as a suite of a release gate would have them. */
const kinds: ((n: number) => string)[] = [
  (n) => `always highLine.pressure < ${345 + n} bar(g)`,
  (n) =>
    `whenever driver.brakePedal > ${50 + n} % then vehicle.speed falls below ${1 + n} km/h within ${6 + n} s and stays for 2 s`,
  (n) => `whenever highLine.pressure > ${310 + n} bar(g) then pumpMotor.displacement < ${0.3 + n / 20} within 300 ms`,
  (n) => `never lowLine.pressure < ${2 + n} bar(g)`,
  (n) => `always abs(rate(highLine.pressure, 10 ms)) < ${4000 + n} bar/s`,
  (n) => `at the end integral(engine.fuelFlow) < ${200 + n} g`,
  (n) =>
    `always abs(highPressureSensor.value - highLine.pressure) < ${5 + n} bar for 100 ms or driver.brakePedal > 2 happens`,
  (n) => `whenever relief.passing is on begins then relief.passing is off within ${1 + n} s`,
  (n) => `always mean(engine.torque, ${1 + n} s) < 500 N m`,
  (n) =>
    `whenever isolation.position > 0.9 begins then engine.speed settles to ${1200 + n} rpm +- 600 rpm within 4 s and stays for 500 ms`,
];
const lines: string[] = [];
for (let n = 0; n < 5; n += 1) {
  for (const [k, kind] of kinds.entries()) lines.push(`  R${k}.${n}: ${kind(n)}`);
}
const requirements = parseRequirements(`requirements:\n${lines.join('\n')}\n`, 'measured', infos, 0.001);

const table = new SignalTable();
for (const info of infos) table.add(info);
const layout = new BlockLayout();
const windows = new BlockLayout();
const judge = compileRequirements(requirements, table, { step: 0.001, layout, windows });
const block = layout.create();
const history = windows.create();
const signals = new Float64Array(infos.length);
const index = (path: string) => table.find(path);
const [high, low, speed, brake, engine, displacement, sensor, passing, isolation, torque, fuel] = [
  'highLine.pressure',
  'lowLine.pressure',
  'vehicle.speed',
  'driver.brakePedal',
  'engine.speed',
  'pumpMotor.displacement',
  'highPressureSensor.value',
  'relief.passing',
  'isolation.position',
  'engine.torque',
  'engine.fuelFlow',
].map(index) as [number, number, number, number, number, number, number, number, number, number, number];

/** A round of stops and starts, of formulas. */
function drive(tick: number): void {
  const t = tick * 0.001;
  const phase = t % 30;
  signals[brake] = phase > 20 && phase < 27 ? 0.6 : 0;
  signals[speed] = phase < 20 ? Math.min(14, phase) : Math.max(0, 14 - 2.4 * (phase - 20));
  signals[high] = 2.2e7 + 9e6 * Math.sin(t / 5) + 2e5 * Math.sin(40 * t);
  signals[low] = 1.2e6 + 1e5 * Math.sin(t);
  signals[engine] = 125 + 5 * Math.sin(3 * t);
  signals[displacement] = Math.sin(t);
  signals[sensor] = signals[high]! + 3e4 * Math.sin(1000 * t);
  signals[passing] = signals[high]! > 3.09e7 ? 1 : 0;
  signals[isolation] = phase > 2 ? 1 : 0;
  signals[torque] = 200 + 100 * Math.sin(t);
  signals[fuel] = 0.002;
}

const ticks = 120_000;
const batch = 500;
const scratch = { user: 0, system: 0 };
/** Processor time of each batch of ticks, µs, with or without the judge: other work on the machine shows in the worst only. */
function batches(judged: boolean): { costs: Float64Array; growth: number } {
  const costs = new Float64Array(ticks / batch);
  block.set(layout.create());
  history.set(windows.create());
  let heap = 0;
  for (let i = 0; i < costs.length; i += 1) {
    if (i === costs.length / 2) heap = process.memoryUsage().heapUsed;
    const before = process.cpuUsage(scratch).user;
    for (let tick = i * batch; tick < (i + 1) * batch; tick += 1) {
      drive(tick);
      if (judged) judge.tick(tick, signals, block, history);
    }
    costs[i] = process.cpuUsage(scratch).user - before;
  }
  const growth = (process.memoryUsage().heapUsed - heap) / (ticks / 2);
  return { costs: costs.slice(costs.length / 2).sort(), growth };
}
const empty = batches(false);
const judged = batches(true);
const at = (share: number) => {
  const pick = (costs: Float64Array) => costs[Math.min(costs.length - 1, Math.floor(share * costs.length))]!;
  return Math.round(((pick(judged.costs) - pick(empty.costs)) / batch) * 1000);
};
const start = performance.now();
const results = judge.finish(ticks, block, history);
const count = (verdict: string) => results.filter((one) => one.verdict === verdict).length;
const found = {
  requirements: requirements.length,
  operations: judge.operations,
  /** Of batches of ticks, processor time of one tick, ns. */
  nanoseconds: { median: at(0.5), tenth: at(0.1), worst: at(1) },
  /** Slots that are hashed, and slots of history. */
  slots: { block: block.length, history: history.length },
  /** Bytes a tick: with the judge, and of the measuring itself. */
  growth: { judged: judged.growth, measuring: empty.growth },
  end: {
    milliseconds: performance.now() - start,
    pass: count('pass'),
    fail: count('fail'),
    undecided: count('undecided'),
    notExercised: count('not exercised'),
  },
};
console.log(JSON.stringify(found));
