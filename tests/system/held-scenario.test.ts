import path from 'node:path';
import { expect, test } from 'vitest';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { HAND, type HandMessage, writeHand } from '../../runtime/hand-wire.js';
import { emptyScript } from '../../runtime/script.js';
import { createLoopControl, runLoop } from '../../tools/loop/engine.js';

const bench = path.resolve(import.meta.dirname, '..', '..', 'configs', 'hand-bench', 'bench.yaml');
const target = 'isolationValve.open';
const script = {
  ...emptyScript,
  name: 'opens a valve over 100 ticks',
  ticks: 300,
  steps: [{ at: 50, name: 'open', action: 'ramp' as const, target, value: 1, over: 100 }],
};

/** Runs the bench; `hands` by tick. What the valve was told, tick by tick. */
function run(hands: ReadonlyMap<number, readonly Partial<HandMessage>[]>) {
  const assembly = assemble(readBench(bench, catalogue), { seed: 1, script });
  const at = assembly.table.find(target);
  let tick = assembly.firstTick;
  let next = 0;
  assembly.hands.source = {
    poll(into) {
      const hand = hands.get(tick)?.[next];
      if (hand === undefined) {
        tick += 1;
        next = 0;
        return -1;
      }
      next += 1;
      const whole = {
        kind: 0,
        request: 1,
        target: 0,
        deadMan: 0,
        value: 0,
        text: { who: '', address: '', said: '' },
        ...hand,
      };
      return writeHand(whole, into);
    },
  };
  const told: number[] = [];
  const step = assembly.tick.run.bind(assembly.tick);
  assembly.tick.run = (now) => {
    step(now);
    if (now >= 0) told.push(assembly.signals[at]!);
  };
  const end = runLoop({
    assembly,
    ticks: script.ticks,
    shared: createLoopControl(),
    barriers: [],
    peaks: new Int32Array(0),
  });
  return { end, told };
}
const scenario = (action: number) => [{ kind: HAND.scenario, target: action }];

test('a scenario that is held for a while ends later by as much, and its ramp stands meanwhile', () => {
  const free = run(new Map());
  const held = run(
    new Map([
      [80, scenario(1)],
      [120, scenario(2)],
    ]),
  );
  expect(free.end).toMatchObject({ ticks: 300, stopped: false });
  expect(held.end).toMatchObject({ ticks: 340, stopped: false });
  expect(new Set(held.told.slice(79, 120)).size).toBe(1);
  expect([...held.told.slice(0, 80), ...held.told.slice(120)]).toEqual(free.told);
});

test('a scenario that is held before tick 0 begins when it is let go on', () => {
  const free = run(new Map());
  const held = run(
    new Map([
      [-1, scenario(1)],
      [30, scenario(2)],
    ]),
  );
  expect(held.end.ticks).toBe(330);
  expect(held.told.slice(30)).toEqual(free.told);
});

test('a run that is ended by hand ends with that tick', () => {
  expect(run(new Map([[70, scenario(3)]])).end).toMatchObject({ ticks: 71, stopped: true });
});
