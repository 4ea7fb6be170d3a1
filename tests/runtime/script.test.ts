import { describe, expect, it } from 'vitest';
import { BlockLayout } from '../../runtime/block.js';
import { EventCatalogue, noJournal } from '../../runtime/journal.js';
import type { Formula } from '../../runtime/judge/formula.js';
import { emptyScript, Script, type ScriptSpec, type ScriptStep } from '../../runtime/script.js';
import { SignalTable } from '../../runtime/signals.js';

/** A script over one command, one instrument's output and one signal that the test sets. */
function rig(spec: Partial<ScriptSpec>) {
  const layout = new BlockLayout();
  const table = new SignalTable();
  const events = new EventCatalogue();
  const add = (path: string) => table.add({ path, unit: '1', about: '', group: 'run' });
  const x = add('plant.x');
  const pedal = add('driver.pedal');
  const valve = layout.add('valve.open', 0.25);
  const targets = { find: (path: string) => (path === 'valve.open' ? valve : -1) };
  const outputs = { find: (path: string) => (path === 'driver.pedal' ? pedal : -1) };
  const script = new Script({ ...emptyScript, ticks: 100, ...spec }, 1e-3, layout, table, events, targets, outputs);
  script.bind(table);
  const block = layout.create();
  const signals = new Float64Array(table.length);
  const said: string[] = [];
  const journal = {
    ...noJournal,
    event: (tick: number, code: number, subject: number) => {
      said.push(`${tick} ${events.kinds[code]!.name}: ${events.subjects[subject]}`);
    },
  };
  return {
    said,
    block,
    signals,
    value: (path: string) => signals[table.find(path)]!,
    /** One tick in which `plant.x` was `now` at the end of the tick before; what the valve and the pedal are in it. */
    tick(tick: number, now: number): [valve: number, pedal: number] {
      signals[x] = now;
      script.run(block, signals, tick, journal);
      signals[pedal] = 0.5;
      script.applySignals(block, signals, tick);
      script.apply(block, tick);
      return [block[valve]!, signals[pedal]!];
    },
    hold: (held: boolean) => {
      block[script.heldSlot] = held ? 1 : 0;
    },
  };
}

const above = (value: number): Formula => ({
  is: 'compare',
  left: { is: 'signal', path: 'plant.x' },
  relation: '>',
  right: { is: 'number', value },
  unit: '1',
});
const step = (over: Partial<ScriptStep>): ScriptStep => ({
  at: 0,
  name: 'step',
  action: 'note',
  target: '',
  value: 0,
  over: 0,
  ...over,
});

describe('a timeline', () => {
  it('waits for a condition to last, then for a time after it', () => {
    const { tick, said, value } = rig({
      conditions: [above(2)],
      steps: [
        step({ name: 'open', condition: 0, lasting: 3, action: 'set', target: 'valve.open', value: 1 }),
        step({ name: 'shut', wait: 2, action: 'set', target: 'valve.open', value: 0 }),
      ],
    });
    const x = [3, 3, 3, 1, 3, 3, 3, 3, 3, 3, 3];
    expect(x.map((now, at) => tick(at, now)[0])).toEqual([0.25, 0.25, 0.25, 0.25, 0.25, 0.25, 0.25, 1, 1, 0, 0]);
    expect(said).toEqual(['7 scenario step: open', '9 scenario step: shut']);
    expect(value('scenario.step')).toBe(2);
    expect(value('scenario.timeOuts')).toBe(0);
  });

  it('leaves a step out whose condition does not come in time, and says so', () => {
    const { tick, said, value } = rig({
      conditions: [above(2)],
      steps: [
        step({ name: 'open', condition: 0, timeOut: 3, action: 'set', target: 'valve.open', value: 1 }),
        step({ name: 'next', at: 5 }),
      ],
    });
    for (let at = 0; at < 7; at += 1) expect(tick(at, 0)[0]).toBe(0.25);
    expect(said).toEqual(['3 scenario step left out: open', '5 scenario step: next']);
    expect(value('scenario.timeOuts')).toBe(1);
  });

  it('ramps, holds and releases commands, and puts back what a fault changed', () => {
    const { tick, block } = rig({
      steps: [
        step({ at: 1, action: 'ramp', target: 'valve.open', value: 1.25, over: 4 }),
        step({ at: 7, action: 'release', target: 'valve.open' }),
        step({ at: 9, action: 'fault', target: 'valve.open', value: -1 }),
        step({ at: 11, action: 'clear', target: 'valve.open', value: 0.25 }),
      ],
    });
    const seen = Array.from({ length: 8 }, (_, at) => tick(at, 0)[0]);
    expect(seen).toEqual([0.25, 0.25, 0.5, 0.75, 1, 1.25, 1.25, 1.25]);
    const valve = block.length > 0 ? 0 : 0;
    block[valve] = 0.7; // a message says otherwise
    expect(tick(8, 0)[0]).toBe(0.7);
    expect([9, 10, 11, 12].map((at) => tick(at, 0)[0])).toEqual([-1, -1, 0.25, 0.25]);
    block[valve] = 0.6;
    expect(tick(13, 0)[0]).toBe(0.6);
  });

  it('takes the pedals by hand', () => {
    const { tick } = rig({
      steps: [
        step({ at: 1, action: 'set', target: 'driver.pedal', value: 0.9 }),
        step({ at: 3, action: 'release', target: 'driver.pedal' }),
      ],
    });
    expect([0, 1, 2, 3].map((at) => tick(at, 0)[1])).toEqual([0.5, 0.9, 0.9, 0.5]);
  });

  it('stands still while it is held by hand', () => {
    const { tick, hold } = rig({
      conditions: [above(2)],
      steps: [step({ condition: 0, action: 'set', target: 'valve.open', value: 1 })],
    });
    tick(0, 0);
    hold(true);
    expect(tick(1, 3)[0]).toBe(0.25);
    hold(false);
    expect(tick(2, 3)[0]).toBe(1);
  });

  it('follows a trace over a signal, back as well as forth', () => {
    const { tick } = rig({
      traces: [
        {
          target: 'valve.open',
          between: 'linear',
          over: 'plant.x',
          points: [
            [0, 0],
            [10, 1],
            [20, 3],
          ],
        },
      ],
    });
    expect([0, 5, 15, 25, 15, 2].map((x, at) => tick(at, x)[0])).toEqual([0, 0.5, 2, 3, 2, 0.2]);
  });
});
