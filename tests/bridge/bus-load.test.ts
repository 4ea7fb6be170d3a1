import { expect, it } from 'vitest';
import { busLoad, busRemarks } from '../../bridge/bus-load.js';
import type { LinkSpec, MessageSpec } from '../../bridge/message-map.js';
import { spreadPhases } from '../../bridge/spread-phases.js';
import { canMap, field, frameMessage } from './can-rig.js';

const link: LinkSpec = { name: 'bus', kind: 'can', interface: 'can0', bitRate: 250e3 };
const message = (name: string, identifier: number, every: number, changes: Partial<MessageSpec> = {}): MessageSpec =>
  frameMessage(name, identifier, 'sent', [field('v', 'x.v', { length: 8 })], { every, ...changes });
const step = 1e-3;

it('spreads phases so that no tick has more to send than it must, and leaves those that are said', () => {
  const said = message('said', 0x90, 10, { phase: 3 });
  const messages = [said, ...Array.from({ length: 9 }, (_, i) => message(`m${i}`, 0x100 + i, 10))];
  const heard = message('heard', 0x200, 10, { direction: 'received', timeout: 50 });
  const spread = spreadPhases([...messages, heard], link, (one) => one === said);
  expect(spread[0]).toBe(said);
  expect(spread[10]).toBe(heard);
  expect(
    spread
      .slice(0, 10)
      .map((one) => one.phase)
      .sort((a, b) => a - b),
  ).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
  const slow = spreadPhases(
    [message('a', 1, 2), message('b', 2, 4), message('c', 3, 4), message('d', 4, 1000)],
    link,
    () => false,
  );
  const before = busLoad(canMap([message('a', 1, 2), message('b', 2, 4), message('c', 3, 4)], [link]), link, step)!;
  const after = busLoad(canMap(slow.slice(0, 3), [link]), link, step)!;
  expect(before.burst.messages).toEqual(['a', 'b', 'c']);
  expect(after.burst.messages).toHaveLength(1);
  expect(after.load).toBeCloseTo(before.load, 12);
});

it('counts what goes by change beside what goes by cycle, and warns of bursts, late frames and time-outs', () => {
  const frame = 135 / 250e3;
  const both = canMap([message('both', 1, 10, { trigger: 'cyclic-and-change', fastEvery: 4 })], [link]);
  expect(busLoad(both, link, step)!.load).toBeCloseTo(frame / 10e-3 + frame / 4e-3, 12);
  const burst = canMap(
    [1, 2, 3].map((i) => message(`m${i}`, i, 10)),
    [link],
  );
  const heavy = busLoad(burst, link, step)!;
  expect(heavy.burst).toEqual({ tick: 0, messages: ['m1', 'm2', 'm3'], time: 3 * frame });
  expect(busRemarks(heavy, burst, step).warnings).toEqual([expect.stringMatching(/^burst: .*m1, m2, m3, 1\.62 ms/)]);
  const late = canMap([message('fast', 1, 1), message('slow', 2, 2)], [link]);
  const warnings = busRemarks(busLoad(late, link, step)!, late, step).warnings.join('\n');
  expect(warnings).toMatch(/fast may still wait/);
  const strict = canMap([message('a', 1, 5), message('r', 2, 5, { direction: 'received', timeout: 6 })], [link]);
  expect(busRemarks(busLoad(strict, link, step)!, strict, step).warnings.join('\n')).toMatch(/time-out of 6 ms/);
  const over = canMap([message('a', 1, 1), message('b', 2, 1)], [link]);
  const { overloaded } = busRemarks(busLoad(over, link, step)!, over, step);
  expect(overloaded).toEqual([expect.stringMatching(/108 % of the bus/)]);
  expect(busLoad(over, { ...link, bitRate: undefined } as unknown as LinkSpec, step)).toBeUndefined();
});
