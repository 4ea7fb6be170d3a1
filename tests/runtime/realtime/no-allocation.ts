import { UdpSocket } from '../../../bridge/udp-socket.js';
import { BlockLayout } from '../../../runtime/block.js';
import { HandStage } from '../../../runtime/hand.js';
import { createHandRing, HandRing, HandRingWriter } from '../../../runtime/hand-ring.js';
import { HAND } from '../../../runtime/hand-wire.js';
import { EventCatalogue } from '../../../runtime/journal.js';
import { Clock } from '../../../runtime/realtime/clock.js';
import { CollectionMeter } from '../../../runtime/realtime/collection-meter.js';
import { Histogram } from '../../../runtime/realtime/histogram.js';
import { Pacer } from '../../../runtime/realtime/pacer.js';
import { createRing, RingReader } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';
import { BoardWriter } from '../../../runtime/status-board.js';

const meter = new CollectionMeter();
const results: Record<string, { calls: number; collections: number; allocated: number }> = {};

/**
 * Warms `run` up, then measures it three times and keeps the least: what is left of compiling it shows once, what a call
 * allocates shows every time.
 */
function measure(name: string, calls: number, run: (calls: number) => void): void {
  for (let i = 0; i < 3; i += 1) run(calls / 4);
  for (let i = 0; i < 3; i += 1) {
    meter.start();
    run(calls);
    const { collections, allocated } = meter.stop();
    if (results[name] === undefined || allocated < results[name].allocated)
      results[name] = { calls, collections, allocated };
    if (allocated < 0.05 * calls) break;
  }
}

const CALLS = 200_000;
const clock = new Clock();
const times = new Float64Array(8);
measure('clock', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    clock.now(times, 0);
    clock.threadTime(times, 1);
  }
});

const histogram = new Histogram();
measure('histogram', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    times[2] = i * 1234.5;
    histogram.record(times, 2);
  }
});

const pacer = new Pacer({ period: 20_000, spin: 5000 });
pacer.begin();
pacer.count();
measure('pacer', 10_000, (calls) => {
  for (let i = 0; i < calls; i += 1) pacer.wait();
});

const receiver = new UdpSocket({ local: { address: '127.0.0.1', port: 0 } });
const sender = new UdpSocket({
  local: { address: '127.0.0.1', port: 0 },
  peer: { address: '127.0.0.1', port: receiver.localPort },
});
const stranger = new UdpSocket({
  local: { address: '127.0.0.1', port: 0 },
  peer: { address: '127.0.0.1', port: receiver.localPort },
});
const datagram = new Uint8Array(120);
const into = new Uint8Array(2048);
sender.send(datagram, 1);
receiver.wait(1000);
receiver.poll(into);
receiver.adoptSender();
measure('send and poll', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    sender.send(datagram, 120);
    receiver.wait(100);
    if (receiver.poll(into) !== 120) throw new Error('a datagram is missing');
  }
});
measure('poll of nothing', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) receiver.poll(into);
});
measure('strangers', 50_000, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    stranger.send(datagram, 120);
    if (receiver.poll(into) !== -1) throw new Error('a stranger was heard');
  }
});

const signals = Float64Array.from({ length: 400 }, (_, i) => i * 1.7);
const selection = Int32Array.from({ length: 100 }, (_, i) => 3 * i);
const hash = Int32Array.of(1, 2);
const block = new Float64Array(300);
const handle = createRing({ capacity: 1 << 20, whenFull: 'drop' });
const journal = new RingJournal(handle, selection);
const reader = new RingReader(handle);
const empty = () => {
  while (reader.next());
  reader.release();
};
measure('journal rows', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    journal.row(i, signals, hash);
    if ((i & 1023) === 0) empty();
  }
});
measure('journal inputs and events', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    journal.input(i, 0, datagram, 120);
    journal.event(i, 3, 4, 0.1, i, 1e9);
    if ((i & 255) === 0) empty();
  }
});
measure('journal snapshots', 20_000, (calls) => {
  for (let i = 0; i < calls; i += 1) {
    journal.snapshot(i, block);
    if ((i & 31) === 0) empty();
  }
});

const layout = new BlockLayout();
const handTargets = Array.from({ length: 40 }, (_, i) => ({
  path: `valve${i}.command`,
  unit: '1',
  slot: i < 20 ? layout.add(`valve${i}.command`) : -1,
  signal: i < 20 ? -1 : i,
}));
const hands = new HandStage({
  targets: handTargets,
  reach: { heldSlot: layout.add('held'), scenario: '', acknowledge: () => 1, warnings: ['highLine.pressure'] },
  layout,
  events: new EventCatalogue(),
  step: 0.001,
  link: 1,
});
const handBlock = layout.create();
const handRing = createHandRing();
const handWriter = new HandRingWriter(handRing);
hands.source = new HandRing(handRing);
const tickOfHands = (tick: number) => {
  hands.lift(handBlock);
  hands.take(handBlock, tick, journal);
  hands.applySignals(handBlock, signals);
  hands.apply(handBlock);
  if ((tick & 255) === 0) empty();
};
measure('ticks without a hand', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) tickOfHands(i);
});
const text = { who: 'N.', address: '', said: '' };
for (const target of [0, 7, 25, 31])
  handWriter.put({ kind: HAND.set, request: target, target, deadMan: 1e9, value: 0.3, text });
tickOfHands(0);
measure('ticks with four targets held', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) tickOfHands(i);
});
const board = new BoardWriter(
  Int32Array.from({ length: 60 }, (_, i) => i),
  selection,
  20,
);
measure('status board', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) board.write(handBlock, signals, i);
});

let kept: number[] = [];
measure('control', CALLS, (calls) => {
  for (let i = 0; i < calls; i += 1) kept = [i, kept.length];
});
for (const socket of [receiver, sender, stranger]) socket.close();
console.log(JSON.stringify(results));
