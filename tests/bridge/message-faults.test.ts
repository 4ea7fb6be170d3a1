import { describe, expect, it } from 'vitest';
import { messageFaults } from '../../bridge/message-faults.js';
import { Rig } from './rig.js';
import { mapOf, message, signal } from './sample-map.js';

const map = mapOf(
  message('status', 1, 'sent', [signal('pressure', 'line.pressure', { least: 0, most: 400 })]),
  message('request', 2, 'received', [signal('torque', 'machine.torque', { least: -9000, most: 9000, substitute: -1 })]),
);

function rig(seed = 1) {
  const one = new Rig(map, { seed });
  const slot = (path: string) => one.exchange.faults.find((fault) => fault.path === path)!.slot;
  return {
    one,
    fault: (path: string, value: number) => {
      one.block[slot(path)] = value;
    },
    /** Ticks in which the controller says `10 + tick`; the torque that counts in each. */
    receive: (from: number, to: number) =>
      Array.from({ length: to - from }, (_, i) => {
        one.say('request', [10 + from + i], from + i, from + i);
        one.take(from + i);
        return one.command('machine.torque');
      }),
    /** Ticks in which the pressure is the tick; what went out in each: undefined for nothing. */
    send: (from: number, to: number) =>
      Array.from({ length: to - from }, (_, i) => {
        one.set('line.pressure', from + i);
        one.publish(from + i);
        const sent = one.heard().filter((datagram) => datagram.kind === 1);
        return sent.length === 0 ? undefined : one.value('status.pressure');
      }),
  };
}

describe('faults of a received message', () => {
  it('silent: the substitute counts after the time-out', () => {
    const { fault, receive, one } = rig();
    expect(receive(0, 3)).toEqual([10, 11, 12]);
    fault('request.faultSilent', 1);
    expect(receive(3, 10)).toEqual([12, 12, 12, 12, -1, -1, -1]);
    fault('request.faultSilent', 0);
    expect(receive(10, 12)).toEqual([20, 21]);
    // the counts of the link are those of the link: nothing was lost on it
    expect(one.value('request.lost')).toBe(0);
  });

  it('frozen: it comes with old values and does not time out', () => {
    const { fault, receive } = rig();
    receive(0, 3);
    fault('request.faultFrozen', 1);
    expect(new Set(receive(3, 20))).toEqual(new Set([12]));
    fault('request.faultFrozen', 0);
    expect(receive(20, 21)).toEqual([30]);
  });

  it('delayed by whole ticks', () => {
    const { fault, receive } = rig();
    receive(0, 3);
    fault('request.faultDelay', 0.003);
    expect(receive(3, 9)).toEqual([12, 12, 12, 13, 14, 15]);
    fault('request.faultDelay', 0);
    expect(receive(9, 11)).toEqual([19, 20]);
  });

  it('lost and corrupted by chance: the stated share, the same again with the same seed', () => {
    const run = (seed: number, path: string) => {
      const { fault, receive } = rig(seed);
      receive(0, 1);
      fault(path, 0.3);
      return receive(1, 2001).filter((torque, i) => torque !== 11 + i).length;
    };
    for (const path of ['request.faultLost', 'request.faultCorrupted']) {
      const share = run(1, path) / 2000;
      // four standard deviations of a share of 0.3 among 2000
      expect(Math.abs(share - 0.3)).toBeLessThan(4 * Math.sqrt((0.3 * 0.7) / 2000));
      expect(run(1, path)).toBe(run(1, path));
      expect(run(2, path)).not.toBe(run(1, path));
    }
  });
});

describe('faults of a sent message', () => {
  it('silent, frozen, delayed', () => {
    const { fault, send } = rig();
    expect(send(0, 3)).toEqual([0, 1, 2]);
    fault('status.faultSilent', 1);
    expect(send(3, 5)).toEqual([undefined, undefined]);
    fault('status.faultSilent', 0);
    fault('status.faultFrozen', 1);
    expect(send(5, 7)).toEqual([2, 2]);
    fault('status.faultFrozen', 0);
    fault('status.faultDelay', 0.002);
    expect(send(7, 11)).toEqual([undefined, undefined, 7, 8]);
    fault('status.faultDelay', 0);
    expect(send(11, 12)).toEqual([11]);
  });
});

it('every fault of a message is a command with a slot', () => {
  const { one } = rig();
  expect(
    one.exchange.faults
      .map(({ path }) => path)
      .filter((path) => !path.startsWith('controller.'))
      .sort(),
  ).toEqual(
    ['request', 'status'].flatMap((name) => Object.keys(messageFaults).map((fault) => `${name}.${fault}`)).sort(),
  );
});
