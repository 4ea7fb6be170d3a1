import { expect, it } from 'vitest';
import { disturbancesOf } from '../../tools/run/disturbances.js';
import { canBench } from '../support/can-bench.js';

const text = `life: { preRoll: 0 ms }
messages:
  request:
    direction: received
    id: 0x200
    every: 10 ms
    timeout: 50 ms
    bytes: 2
    signals: { v: { unit: "1", range: 0 .. 255, substitute: 0, can: { start: 0, length: 8 } } }
`;
const { spec } = canBench(text);
const traces = (...texts: string[]) => disturbancesOf(texts, spec);

it('disturbances of the command line become traces that begin and end at their tick', () => {
  expect(traces('bus.sentDrop=30%@5s..8s', 'bus.sentDrop=1@8s..9s', 'request.faultDelay=20 ms@0s')).toEqual([
    {
      target: 'bus.sentDrop',
      points: [
        [0, 0],
        [5000, 0.3],
        [8000, 1],
        [9000, 0],
      ],
      between: 'hold',
    },
    { target: 'request.faultDelay', points: [[0, 0.02]], between: 'hold' },
  ]);
  const bench = canBench(text, { traces: traces('bus.reportBusOff=1@20ms..40ms') });
  bench.run(20);
  expect(bench.value('bus.controllerState')).toBe(0);
  bench.run(2);
  expect([bench.value('bus.controllerState'), bench.value('bus.busOffs')]).toEqual([3, 1]);
  bench.run(20);
  expect([bench.value('bus.controllerState'), bench.value('bus.restarts')]).toEqual([0, 1]);
});

it.each([
  ['bus.sentDrop', 'not a disturbance'],
  ['bus.sendDrop=1@1s', 'no command bus.sendDrop'],
  ['bus.sentDrop=2@1s', 'outside'],
  ['bus.sentDrop=1@1.0005s', 'no whole number of ticks'],
  ['bus.sentDrop=1@2s..1s', 'ends before it begins'],
  ['bus.sentDrop=x@1s', 'with its unit'],
])('%s is refused', (said, what) => {
  expect(() => traces(said)).toThrow(what);
});

it('two at the same time are refused', () => {
  expect(() => traces('bus.sentDrop=1@1s..3s', 'bus.sentDrop=0.5@2s')).toThrow('at the same time');
});
