// The raw socket against can-utils and python-can, and through all that may happen to an interface.
import { makeFrame } from '../../../bridge/can-frame.js';
import { CanError, CanSocket } from '../../../bridge/can-socket.js';
import { capture, drain, report, sh } from './tools.js';

const found: Record<string, unknown> = {};
const socket = new CanSocket({ interface: 'vcan0', flexibleDataRate: true });
const filtered = new CanSocket({
  interface: 'vcan0',
  flexibleDataRate: true,
  filters: [{ identifier: 0x123, mask: 0x800007ff | 0 }],
});
const into = new Uint8Array(72);

// From can-utils.
sh(
  'cansend vcan0 123#0102ff; cansend vcan0 18FF0102#aabbccdd; cansend vcan0 123##1000102030405060708090a0b; cansend vcan0 124#R',
);
found['fromCanUtils'] = await drain(socket);
found['filtered'] = await drain(filtered);
found['stamped'] = socket.stamp[0]! > 1.6e9;

// To can-utils.
const spy = await capture();
socket.send(makeFrame(0x321, [1, 2, 3]), 16);
socket.send(makeFrame(0x18ff0304, [0xde, 0xad], { extended: true }), 16);
socket.send(makeFrame(0x322, new Uint8Array(12).fill(0x55), { flexible: true, bitRateSwitch: true }), 72);
socket.send(makeFrame(0x323, [], { remote: true }), 16);
found['toCanUtils'] = await spy.stop();
found['ownFrames'] = (await drain(socket)).filter((frame) => !frame.startsWith('fe07')).length;

// Python's python-can both ways.
sh(`python3 - <<'PY' & sleep 1.5; echo
import can
bus = can.Bus(channel='vcan0', interface='socketcan', fd=True)
bus.send(can.Message(arbitration_id=0x10, data=[9, 8], is_extended_id=False))
bus.send(can.Message(arbitration_id=0x1abcdef0, data=bytes(range(16)), is_fd=True, bitrate_switch=True, is_extended_id=True))
bus.shutdown()
PY
wait`);
found['fromPython'] = await drain(socket);

// Down, up, deleted, made again.
const life: Record<string, unknown> = {};
sh('ip link set vcan0 down');
life['sendWhileDown'] = socket.send(makeFrame(0x123, [1]), 16);
life['down'] = await drain(socket);
life['downAtTheOther'] = await drain(filtered);
sh('ip link set vcan0 up');
life['sendAfterUp'] = socket.send(makeFrame(0x123, [2]), 16);
life['upAtTheOther'] = await drain(filtered);
sh('ip link del vcan0');
life['sendWhileGone'] = socket.send(makeFrame(0x123, [3]), 16);
life['goneAtTheOther'] = await drain(filtered);
sh('ip link add dev vcan0 type vcan && ip link set vcan0 mtu 72 up');
await drain(socket, 1500);
life['again'] = await drain(filtered, 1500);
life['sendAgain'] = socket.send(makeFrame(0x123, [4]), 16);
life['heardAgain'] = await drain(filtered);
found['life'] = life;

// The receive buffer overflows: what is lost and what is taken make up what was sent.
const small = new CanSocket({ interface: 'vcan0', receiveBuffer: 4096 });
for (let i = 0; i < 1000; i += 1) socket.send(makeFrame(0x200, [i & 255]), 16);
let taken = 0;
for (let size = small.poll(into); size === 16; size = small.poll(into)) taken += 1;
socket.send(makeFrame(0x200, [0]), 16);
await drain(small);
found['overflow'] = { taken, dropped: small.dropped };

// The transmit queue is full.
sh('tc qdisc add dev vcan0 root tbf rate 8kbit burst 64 limit 300');
let refused = 0;
for (let i = 0; i < 200; i += 1) if (socket.send(makeFrame(0x300, [i]), 16) < 0) refused += 1;
sh('tc qdisc del dev vcan0 root');
found['queue'] = { refused, counted: socket.queueFull };
await drain(socket);

// An interface that is not there, and one that is set up for classic frames only.
const failure = (make: () => unknown): string => {
  try {
    make();
    return '';
  } catch (error) {
    return error instanceof CanError ? `${error.code} ${error.message}` : String(error);
  }
};
found['absent'] = failure(() => new CanSocket({ interface: 'vcan9' }));
sh('ip link set vcan1 down && ip link set vcan1 mtu 16 up');
found['classic'] = failure(() => new CanSocket({ interface: 'vcan1', flexibleDataRate: true }));
report(found);
