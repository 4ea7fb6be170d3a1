import { describe, expect, it } from 'vitest';
import { parseRequirements } from '../../../configs/requirements.js';
import { BlockLayout } from '../../../runtime/block.js';
import { BuildError, type SignalInfo } from '../../../runtime/contract.js';
import { EventCatalogue, noJournal } from '../../../runtime/journal.js';
import { compileRequirements } from '../../../runtime/judge/monitor.js';
import { type RequirementResult, requirementVerdicts } from '../../../runtime/judge/result.js';
import { SignalTable } from '../../../runtime/signals.js';

const infos: SignalInfo[] = [
  { path: 'line.pressure', unit: 'Pa', about: '', group: 'reading' },
  { path: 'sensor.value', unit: 'Pa', about: '', group: 'instrument' },
  { path: 'vehicle.speed', unit: 'm/s', about: '', group: 'state' },
  { path: 'driver.brake', unit: '1', about: '', group: 'instrument' },
];
const step = 0.1;

/** Judges one text over signals given by functions of the tick; also what was said at each tick. */
function judge(text: string, ticks: number, drive: Record<string, (tick: number) => number>) {
  const requirements = parseRequirements(`requirements:\n  R:\n    holds: ${text}\n`, 'f', infos, step);
  const table = new SignalTable();
  for (const info of infos) table.add(info);
  const layout = new BlockLayout();
  const windows = new BlockLayout();
  const catalogue = new EventCatalogue();
  const events: number[][] = [];
  const journal = { ...noJournal, event: (...all: number[]) => events.push(all) };
  const monitor = compileRequirements(requirements, table, { step, layout, windows, journal, catalogue });
  const block = layout.create();
  const history = windows.create();
  const signals = new Float64Array(infos.length);
  const said: string[] = [];
  const now: number[] = [];
  for (let t = 0; t < ticks; t += 1) {
    infos.forEach((info, i) => {
      signals[i] = drive[info.path]?.(t) ?? 0;
    });
    monitor.tick(t, signals, block, history);
    said.push(requirementVerdicts[block[monitor.slots(0).verdict]!]!);
    now.push(block[monitor.slots(0).now]!);
  }
  const before = [block.slice(), history.slice()];
  const result = monitor.finish(ticks, block, history)[0]! as RequirementResult;
  expect([block, history]).toEqual(before);
  return { result, said, now, events };
}

describe('what requirements mean', () => {
  it('gives the least margin in the unit of the signal and its tick', () => {
    const { result, said, now } = judge('always line.pressure < 345 bar(a)', 10, {
      'line.pressure': (t) => (t === 6 ? 340e5 : 300e5 + t),
    });
    expect(result).toMatchObject({ verdict: 'pass', unit: 'Pa', tick: 6, triggers: undefined, open: false });
    expect(result.margin).toBeCloseTo(5e5, 6);
    expect(said).toEqual(Array(10).fill('pass'));
    expect(now[5]).toBeCloseTo(45e5 - 5, 6);
  });

  it('fails at the tick of a single sample and tells the journal once', () => {
    const { result, said, events } = judge('always line.pressure < 345 bar(a)', 10, {
      'line.pressure': (t) => (t === 4 ? 346e5 : 300e5),
    });
    expect(result).toMatchObject({ verdict: 'fail', tick: 4, margin: -1e5 });
    expect(said.slice(0, 4)).toEqual(Array(4).fill('pass'));
    expect(said.slice(4)).toEqual(Array(6).fill('fail'));
    expect(events).toHaveLength(1);
    expect(events[0]!.slice(0, 1).concat(events[0]!.slice(3))).toEqual([4, -1e5, 4, 0]);
  });

  it('takes the strictness of a comparison at its word', () => {
    const at = { 'line.pressure': () => 345e5 };
    expect(judge('always line.pressure < 345 bar(a)', 3, at).result.verdict).toBe('fail');
    expect(judge('always line.pressure <= 345 bar(a)', 3, at).result.verdict).toBe('pass');
    expect(judge('never line.pressure >= 345 bar(a)', 3, at).result.verdict).toBe('fail');
    expect(judge('never line.pressure > 345 bar(a)', 3, at).result.verdict).toBe('pass');
  });

  const stop = 'whenever driver.brake > 0.5 then vehicle.speed falls below 1 m/s within 2 s and stays for 0.5 s';

  it('never calls a trigger that did not come a pass', () => {
    const { result, said } = judge(stop, 60, { 'vehicle.speed': () => 0 });
    expect(result).toMatchObject({ verdict: 'not exercised', triggers: 0 });
    expect(said[59]).toBe('not exercised');
  });

  it('judges a stop in time, with the margin of the speed', () => {
    const drive = {
      'driver.brake': (t: number) => (t >= 10 && t < 15 ? 1 : 0),
      'vehicle.speed': (t: number) => (t < 20 ? 10 : 0.25),
    };
    const { result, said } = judge(stop, 60, drive);
    expect(result).toMatchObject({ verdict: 'pass', triggers: 1, margin: 0.75, unit: 'm/s' });
    expect([said[9], said[12], said[59]]).toEqual(['not exercised', 'undecided', 'pass']);
  });

  it('fails a stop that comes too late or does not last', () => {
    const brake = (t: number) => (t >= 10 && t < 12 ? 1 : 0);
    expect(judge(stop, 60, { 'driver.brake': brake, 'vehicle.speed': (t) => (t < 32 ? 10 : 0) }).result).toMatchObject({
      verdict: 'fail',
      margin: -9,
    });
    expect(
      judge(stop, 60, { 'driver.brake': brake, 'vehicle.speed': (t) => (t % 4 === 0 ? 3 : 0) }).result,
    ).toMatchObject({ verdict: 'fail', margin: -2 });
  });

  it('leaves open what the end of the run cut off, unless told otherwise', () => {
    const drive = { 'driver.brake': (t: number) => (t === 55 ? 1 : 0), 'vehicle.speed': () => 10 };
    expect(judge(stop, 60, drive).result).toMatchObject({ verdict: 'undecided', open: true, triggers: 1 });
    expect(judge(`${stop}\n    openAtEnd: fail`, 60, drive).result).toMatchObject({ verdict: 'fail', open: true });
    expect(judge(`${stop}\n    openAtEnd: pass`, 60, drive).result).toMatchObject({ verdict: 'pass', open: true });
    // Stood still for long enough already: nothing that comes could change it.
    expect(judge(stop, 62, { ...drive, 'vehicle.speed': () => 0 }).result.verdict).toBe('pass');
  });

  it('tells true and sensed values apart by their paths', () => {
    const drive = { 'line.pressure': () => 350e5, 'sensor.value': () => 340e5 };
    expect(judge('always sensor.value < 345 bar(a)', 5, drive).result.verdict).toBe('pass');
    expect(judge('always line.pressure < 345 bar(a)', 5, drive).result.verdict).toBe('fail');
  });

  it('counts a value that is no number against the requirement, either way round', () => {
    const drive = { 'line.pressure': (t: number) => (t === 3 ? Number.NaN : 300e5) };
    expect(judge('always line.pressure < 345 bar(a)', 5, drive).result).toMatchObject({ verdict: 'fail', tick: 3 });
    expect(judge('never line.pressure > 345 bar(a)', 5, drive).result).toMatchObject({ verdict: 'fail', tick: 3 });
  });

  it('integrates, counts and lasts', () => {
    const drive = { 'vehicle.speed': () => 2, 'driver.brake': (t: number) => (t % 10 < 3 ? 1 : 0) };
    expect(judge('at the end integral(vehicle.speed) > 9 m', 51, drive).result).toMatchObject({
      verdict: 'pass',
      unit: 'm',
      margin: expect.closeTo(1, 9),
    });
    expect(judge('at the end count(driver.brake > 0.5) <= 5', 50, drive).result).toMatchObject({
      verdict: 'pass',
      margin: 0,
    });
    expect(judge('at the end count(driver.brake > 0.5) < 5', 50, drive).result).toMatchObject({
      verdict: 'fail',
      margin: -0,
    });
    expect(judge('at the end duration(driver.brake > 0.5) <= 1.4 s', 50, drive).result).toMatchObject({
      verdict: 'fail',
      margin: expect.closeTo(-0.1, 9),
    });
  });

  it('refuses, with every reason, what cannot be judged', () => {
    const table = new SignalTable();
    table.add(infos[0]!);
    const compare = {
      is: 'compare' as const,
      left: { is: 'signal' as const, path: 'line.presure' },
      relation: '<' as const,
      right: { is: 'number' as const, value: 1 },
      unit: 'Pa',
    };
    const layout = new BlockLayout();
    try {
      compileRequirements([{ id: 'R', text: '', severity: 'major', formula: compare }], table, {
        step,
        layout,
        windows: layout,
      });
      expect.unreachable();
    } catch (error) {
      expect(error).toBeInstanceOf(BuildError);
      expect((error as Error).message).toMatch(/does not say when/);
      expect((error as Error).message).toMatch(/no such signal, line.presure, did you mean line.pressure/);
    }
  });
});
