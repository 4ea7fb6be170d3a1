import path from 'node:path';
import { packageRoot } from '../../loop/controller-module.js';
import type { Place, Started } from '../place.js';
import { sleep } from '../place.js';
import { demand, type Trial } from '../trial.js';

function controller(place: Place): Started {
  const file = path.join(packageRoot(), 'dist', 'tools', 'controller.js');
  return place.start([process.execPath, file, place.bench('harbour-truck')]);
}

/** Sends to the bench's port as fast as it goes until it is ended: random bytes, or datagrams that nearly fit. */
const flood = `
import { createSocket } from 'node:dgram';
const [from, kind, seconds] = process.argv.slice(2);
const socket = createSocket('udp4');
socket.on('error', () => {});
socket.bind(Number(from), '127.0.0.1', () => {
  const bytes = new Uint8Array(kind === 'long' ? 1400 : 48);
  const end = Date.now() + 1000 * Number(seconds);
  let state = 1;
  const some = () => {
    for (let i = 0; i < 64; i += 1) {
      for (let at = 0; at < bytes.length; at += 1) bytes[at] = (state = (Math.imul(state, 1103515245) + 12345) >>> 0) >>> 16;
    const out = heard === undefined || i % 2 === 0 ? bytes : heard.map((byte, at) => (at > 4 && at % 7 === i % 7 ? byte ^ 1 : byte));
      socket.send(out, 47110, '127.0.0.1');
    }
    if (Date.now() < end) setImmediate(some); else process.exit(0);
  };
  some();
});
let heard;
socket.on('message', (message) => { heard = Uint8Array.from(message); });
`;

const round = ['--for', '4s', '--controller', 'external'];

export const restarting: Trial = {
  name: 'controller restarts',
  about: 'the controller is killed in the middle of the run and another one comes later',
  rounds: 10,
  async round(place) {
    const first = controller(place);
    const run = place.run(place.bench('harbour-truck'), round);
    await place.beyond(run, 500);
    first.process.kill('SIGKILL');
    await sleep(300 + place.choose(700));
    controller(place);
    const ended = await place.end(run);
    const { summary } = await place.evidence(ended);
    demand(
      summary!.ending === 'complete' && summary!.simulated === 4,
      () => `${summary!.ending} after ${summary!.simulated} s`,
    );
    const { timeOuts, received } = summary!.links[0]!;
    demand(timeOuts > 0, () => 'no time-out was counted');
    demand(received > 100, () => `${received} messages`);
    return `${timeOuts} time-outs, ${received} messages, ${summary!.verdict}`;
  },
};

export const dying: Trial = {
  name: 'controller dies',
  about: 'a controller that the run started ends with an error, or kills itself',
  rounds: 10,
  async round(place) {
    const how = ['process.exit(7)', "process.kill(process.pid, 'SIGKILL')", "throw new Error('tired')"][
      place.choose(3)
    ]!;
    const file = place.write('dies.mjs', `setTimeout(() => { ${how} }, ${1000 + place.choose(3000)});\n`);
    const run = place.run(place.bench('harbour-truck'), ['--for', '4s', '--controller', `${process.execPath} ${file}`]);
    const ended = await place.end(run);
    const { summary } = await place.evidence(ended);
    demand(summary!.verdict === 'not valid' && ended.code === 3, () => `${summary!.verdict}, exit code ${ended.code}`);
    demand(
      summary!.reasons.some(({ what }) => what.startsWith('the controller ended with')),
      () => `no reason says so: ${JSON.stringify(summary!.reasons)}`,
    );
    return `${how}: ${summary!.reasons.find(({ what }) => what.startsWith('the controller'))!.what.slice(0, 60)}`;
  },
};

export const nonsense: Trial = {
  name: 'controller floods',
  about: 'the controller’s own port sends nonsense at full rate; nothing of it is used',
  rounds: 10,
  async round(place) {
    const kind = place.choose(2) === 0 ? 'long' : 'short';
    const file = place.write('flood.mjs', flood);
    const run = place.run(place.bench('harbour-truck'), round);
    await place.beyond(run, -900);
    place.start([process.execPath, file, '47111', kind, '20']);
    const ended = await place.end(run);
    const { summary, remains } = await place.evidence(ended);
    demand(
      summary!.ending === 'complete' && summary!.simulated === 4,
      () => `${summary!.ending} after ${summary!.simulated} s`,
    );
    demand(summary!.verdict === 'not valid', () => summary!.verdict);
    const { received, malformed } = summary!.links[0]!;
    demand(malformed > 1000, () => `${malformed} malformed`);
    demand(received === 0, () => `${received} of them were believed`);
    return `${kind}: ${malformed} refused, ${remains.inputs} recorded, ${(summary!.timing.lateness.max / 1000).toFixed(1)} ms late at most`;
  },
};

export const stranger: Trial = {
  name: 'stranger floods',
  about: 'a stranger’s datagrams at full rate beside the controller’s: the controller is heard all the same',
  rounds: 10,
  async round(place) {
    const file = place.write('flood.mjs', flood);
    controller(place);
    const run = place.run(place.bench('harbour-truck'), round);
    await place.beyond(run, 0);
    place.start([process.execPath, file, '0', place.choose(2) === 0 ? 'long' : 'short', '20']);
    const ended = await place.end(run);
    const { summary } = await place.evidence(ended);
    demand(
      summary!.ending === 'complete' && summary!.simulated === 4,
      () => `${summary!.ending} after ${summary!.simulated} s`,
    );
    const { received, malformed, lost } = summary!.links[0]!;
    demand(malformed === 0, () => `${malformed} of the stranger's datagrams came through`);
    demand(received + lost > 400 && received > 100, () => `${received} messages of the controller, ${lost} lost`);
    return `${received} messages heard, ${lost} lost, ${summary!.verdict}`;
  },
};
