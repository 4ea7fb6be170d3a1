import { createSocket } from 'node:dgram';
import { afterEach, expect, it } from 'vitest';
import { makeFrame } from '../../bridge/can-frame.js';
import { CanMulticast } from '../../bridge/can-multicast.js';
import { noteKinds } from '../../bridge/can-notes.js';

const open: { close(): void }[] = [];
afterEach(() => {
  for (const one of open.splice(0)) one.close();
});

/** A port of our own, so that runs side by side do not hear each other. */
const port = 20_000 + (process.pid % 40_000);
const bus = (): CanMulticast => {
  const made = new CanMulticast({ group: '239.74.163.2', port, interfaceAddress: '127.0.0.1' });
  open.push(made);
  return made;
};

const hear = (one: CanMulticast): string[] => {
  const heard: string[] = [];
  const into = new Uint8Array(72);
  while (heard.length < 50) {
    const size = one.poll(into);
    if (size >= 0) heard.push(Buffer.from(into.subarray(0, size)).toString('hex'));
    else if (!one.wait(20)) break;
  }
  return heard;
};

it('carries frames between any number of ends, none hears itself', () => {
  const [a, b, c] = [bus(), bus(), bus()];
  const classic = makeFrame(0x123, [1, 2, 3]);
  const flexible = makeFrame(0x18ff0102, new Uint8Array(64).fill(7), {
    extended: true,
    flexible: true,
    bitRateSwitch: true,
  });
  a.send(classic, 16);
  b.send(flexible, 72);
  const [one, two] = [classic, flexible].map((frame) => Buffer.from(frame).toString('hex'));
  expect(hear(a)).toEqual([two]);
  expect(hear(b)).toEqual([one]);
  expect(hear(c).sort()).toEqual([one, two].sort());
  expect([a.sent, a.received, c.received]).toEqual([1, 1, 2]);
  expect(c.stamp[0]).toBeGreaterThan(1.6e9);
});

it('tells of what is no frame by a note', async () => {
  const end = bus();
  const stranger = createSocket('udp4');
  await new Promise<void>((done) => stranger.bind(0, '127.0.0.1', () => done()));
  stranger.setMulticastInterface('127.0.0.1');
  await new Promise((done) => stranger.send(Buffer.from('not a frame'), port, '239.74.163.2', done));
  stranger.close();
  const [note] = hear(end);
  expect(note).toBe(`0${noteKinds.malformed}00000001000000`);
  expect(end.malformed).toBe(1);
});
