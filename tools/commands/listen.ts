import { readFileSync } from 'node:fs';
import { Command } from 'commander';
import { usualGroup } from '../../bridge/can-datagram.js';
import { frameSizes } from '../../bridge/can-frame.js';
import { CanMulticast } from '../../bridge/can-multicast.js';
import { interfaceStates, noteKinds } from '../../bridge/can-notes.js';
import { CanSocket } from '../../bridge/can-socket.js';
import { candumpLine, parseCandump } from '../../bridge/candump.js';
import { FrameText } from '../../bridge/frame-text.js';
import type { LinkSpec } from '../../bridge/message-map.js';
import { readBenchFile } from '../run/plan.js';
import { CommandError } from './failure.js';

type Bus = (CanSocket | CanMulticast) & { readonly stamp: Float64Array };

/** Frames taken in a row before the process looks at its signals again. */
const batch = 256;

export function listenCommand(): Command {
  return new Command('listen')
    .description('prints the traffic on a CAN link of a bench in words, or as a log of can-utils')
    .argument('BENCH', 'bench file')
    .option('--link <NAME>', 'default: the first link that is CAN')
    .option('--candump', 'as candump -L writes it, to be read by canplayer and by replay')
    .option('--count <N>', 'end after so many frames', Number)
    .addHelpText(
      'after',
      '\nExamples:\n  oilspring listen configs/harbour-truck/bench-can.yaml\n  oilspring listen configs/harbour-truck/bench-multicast.yaml --candump > drive.log',
    )
    .action(async (bench: string, options: { link?: string; candump?: boolean; count?: number }) => {
      const { spec } = readBenchFile(bench);
      const link = chooseLink(spec.map.links, bench, options.link);
      const words = new FrameText(spec.map, link.name);
      const name = link.interface ?? link.name;
      const bus = openBus(link);
      const frame = new Uint8Array(frameSizes.flexible);
      let left = options.count ?? Number.POSITIVE_INFINITY;
      let stopped = false;
      const stop = () => {
        stopped = true;
      };
      process.once('SIGINT', stop);
      process.once('SIGTERM', stop);
      try {
        while (!stopped && left > 0) {
          for (let i = 0; i < batch && left > 0; i += 1) {
            const size = bus.poll(frame);
            if (size < 0) break;
            if (size !== frameSizes.classic && size !== frameSizes.flexible) {
              process.stderr.write(`${noteText(frame, name)}\n`);
              continue;
            }
            left -= 1;
            const line = candumpLine(frame, size, name, bus.stamp[0]!, bus.stamp[1]!);
            process.stdout.write(
              options.candump
                ? `${line}\n`
                : `${line.slice(0, line.indexOf(')') + 1)} ${words.describe(frame, size)}\n`,
            );
          }
          bus.wait(20);
          await new Promise((done) => setImmediate(done));
        }
      } finally {
        bus.close();
      }
    });
}

export function replayCommand(): Command {
  return new Command('replay')
    .description('sends the frames of a can-utils log on a CAN link of a bench, with their own timing')
    .argument('LOG', 'file in the format of candump -L')
    .argument('BENCH', 'bench file that says the link')
    .option('--link <NAME>', 'default: the first link that is CAN')
    .option(
      '--only <received|sent>',
      'only what the bench receives (in place of a controller), or only what it sends',
      side,
    )
    .addHelpText(
      'after',
      '\nExample:\n  oilspring run bench-can.yaml --controller external --for 20s &\n  oilspring replay drive.log bench-can.yaml --only received',
    )
    .action(async (file: string, bench: string, options: { link?: string; only?: 'received' | 'sent' }) => {
      const { spec } = readBenchFile(bench);
      const link = chooseLink(spec.map.links, bench, options.link);
      const { frames, unread } = parseCandump(readFileSync(file, 'utf8'));
      if (unread.length > 0)
        process.stderr.write(
          `${file}: ${unread.length} lines are no frames and are passed over, the first is line ${unread[0]}\n`,
        );
      const own = new Set(
        spec.map.messages
          .filter((message) => message.link === link.name && message.direction === options.only)
          .map((message) => message.identifier),
      );
      const chosen =
        options.only === undefined
          ? frames
          : frames.filter(({ frame }) =>
              own.has((frame[0]! | (frame[1]! << 8) | (frame[2]! << 16) | (frame[3]! << 24)) & 0x1fffffff),
            );
      if (chosen.length === 0) throw new CommandError(`${file} has no frame to send`);
      const bus = openBus(link);
      let unsent = 0;
      let stopped = false;
      process.once('SIGINT', () => {
        stopped = true;
      });
      const began = performance.now();
      const first = chosen[0]!.time;
      for (const { frame, time } of chosen) {
        const wait = (time - first) * 1000 - (performance.now() - began);
        if (wait > 1) await new Promise((done) => setTimeout(done, wait));
        if (stopped) break;
        if (bus.send(frame, frame.length) < 0) unsent += 1;
      }
      bus.close();
      process.stderr.write(`${chosen.length} frames${unsent > 0 ? `, ${unsent} of them not sent` : ' sent'}\n`);
    });
}

function chooseLink(links: readonly LinkSpec[], bench: string, wanted: string | undefined): LinkSpec {
  const cans = links.filter((link) => link.kind !== 'udp');
  const found = wanted === undefined ? cans[0] : cans.find((link) => link.name === wanted);
  if (!found)
    throw new CommandError(
      `${bench} has no ${wanted === undefined ? 'link that is CAN' : `CAN link ${wanted}`}: its links are ${links.map((link) => `${link.name} (${link.kind})`).join(', ') || 'none'}`,
    );
  return found;
}

function openBus(link: LinkSpec): Bus {
  try {
    return link.kind === 'can'
      ? new CanSocket({ interface: link.interface ?? 'can0', flexibleDataRate: flexible(link.interface ?? 'can0') })
      : new CanMulticast({
          group: link.remoteAddress ?? usualGroup.address,
          port: link.remotePort ?? usualGroup.port,
          interfaceAddress: link.localAddress ?? '127.0.0.1',
        });
  } catch (error) {
    throw new CommandError((error as Error).message);
  }
}

/** Whether an interface takes CAN FD: a spy asks for what there is. */
function flexible(name: string): boolean {
  try {
    return Number(readFileSync(`/sys/class/net/${name}/mtu`, 'utf8')) >= frameSizes.flexible;
  } catch {
    return false;
  }
}

function noteText(note: Uint8Array, name: string): string {
  const count = note[4]! + note[5]! * 256 + note[6]! * 65536;
  if (note[0] === noteKinds.interface)
    return `${name} is ${note[1] === interfaceStates.up ? 'up' : note[1] === interfaceStates.down ? 'down' : 'not there any more'}`;
  return note[0] === noteKinds.dropped
    ? `${name}: the kernel dropped ${count} frames`
    : `${name}: ${count} datagrams are no frames`;
}

function side(text: string): 'received' | 'sent' {
  if (text === 'received' || text === 'sent') return text;
  throw new CommandError(`--only ${text}: received or sent`);
}
