// 20,000 random frames of every kind through the kernel into a CAN link, with the watch on every value.
import { spawn } from 'node:child_process';
import { CanSocket } from '../../../bridge/can-socket.js';
import { CanRig, sampleCanMap } from '../../bridge/can-rig.js';
import { report, sh, sleep } from './tools.js';

const rig = new CanRig(sampleCanMap(), { datagramsPerTick: 2000 });
const socket = new CanSocket({ interface: 'vcan0', flexibleDataRate: true, receiveBuffer: 64 << 20 });
rig.exchange.attach('bus', socket);
const received = rig.map.messages.filter((message) => message.direction === 'received');
const bounds = received.flatMap((message) =>
  message.signals.map((signal) => ({
    path: `${message.name}.${signal.name}`,
    least: signal.least * signal.unitScale,
    most: signal.most * signal.unitScale,
  })),
);

// Every kind at random; the identifiers that the bench receives with random payloads and lengths; remote requests.
const generators = [
  ['vcan0', '-g', '0', '-n', '8000', '-m', '-p', '10'],
  ['vcan0', '-g', '0', '-n', '4000', '-I', '200', '-L', 'i', '-D', 'r', '-p', '10'],
  ['vcan0', '-g', '0', '-n', '4000', '-I', '201', '-L', '8', '-D', 'r', '-p', '10'],
  ['vcan0', '-g', '0', '-n', '2000', '-f', '-I', '200', '-L', '8', '-D', 'r', '-p', '10'],
  ['vcan0', '-g', '0', '-n', '2000', '-R', '-I', '200', '-p', '10'],
];
let running = generators.length;
for (const words of generators) {
  const child = spawn('cangen', words, { stdio: 'inherit' });
  child.once('close', () => {
    running -= 1;
  });
}
let outside = 0;
let tick = 0;
let idle = 0;
while (running > 0 || idle < 300) {
  const before = rig.value('bus.received');
  rig.take(tick);
  tick += 1;
  for (const { path, least, most } of bounds) {
    const value = rig.value(path);
    if (!(value >= least && value <= most)) outside += 1;
  }
  idle = rig.value('bus.received') === before ? idle + 1 : 0;
  await sleep(1);
}
// The count of dropped frames comes with the next frame that is taken.
sh('cansend vcan0 7FE#');
await sleep(100);
rig.take(tick);
const counts = Object.fromEntries(
  ['received', 'replies', 'unknown', 'remote', 'malformed', 'wrongLength', 'errorFrames', 'dropped'].map((name) => [
    name,
    rig.value(`bus.${name}`),
  ]),
);
const messages = Object.fromEntries(
  received.map(({ name }) => [
    name,
    Object.fromEntries(
      ['received', 'wrongChecksum', 'duplicate', 'late', 'outOfRange'].map((count) => [
        count,
        rig.value(`${name}.${count}`),
      ]),
    ),
  ]),
);
report({ counts, messages, outside, ticks: tick });
