// What the adversary of a link does to the bench's frames, with candump as the witness.
import { CanSocket } from '../../../bridge/can-socket.js';
import { CanRig, canMap, field, frameMessage } from '../../bridge/can-rig.js';
import { capture, report, sleep } from './tools.js';

const found: Record<string, unknown>[] = [];
const ticks = 400;
for (const faults of [
  {},
  { sentDrop: 0.3 },
  { sentDuplicate: 0.3 },
  { sentReorder: 0.3 },
  { sentCorrupt: 0.3 },
  { sentShorten: 0.3 },
  { sentSilence: 1 },
  { sentFlood: 500 },
  { reportBusOff: 1 },
]) {
  const map = canMap([
    frameMessage('status', 0x100, 'sent', [field('v', 'x.v', { startBit: 0, length: 16 }, { least: 0, most: 65535 })]),
  ]);
  const rig = new CanRig(map, { seed: 7 });
  const socket = new CanSocket({ interface: 'vcan0' });
  rig.exchange.attach('bus', socket);
  for (const [name, value] of Object.entries(faults))
    rig.block[rig.exchange.faults.find((one) => one.path === `bus.${name}`)!.slot] = value;
  const spy = await capture();
  for (let tick = 0; tick < ticks; tick += 1) {
    rig.set('x.v', tick);
    rig.take(tick);
    rig.publish(tick);
    if (tick % 20 === 0) await sleep(5);
  }
  const frames = await spy.stop();
  socket.close();
  const slots = rig.exchange.links[0]!.slots;
  const own = Object.fromEntries(
    ['Dropped', 'Duplicated', 'Reordered', 'Corrupted', 'Shortened', 'Flooded'].map((name) => [
      name,
      rig.block[slots[`sent${name}`]!],
    ]),
  );
  found.push({ faults, frames, own });
}
report({ ticks, found });
