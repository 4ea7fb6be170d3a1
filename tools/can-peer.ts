import { createSocket } from 'node:dgram';
import { createRequire } from 'node:module';
import { CanControllerEndpoint } from '../bridge/can-controller.js';
import { CanDatagram, usualGroup } from '../bridge/can-datagram.js';
import {
  frameFlags,
  frameSizes,
  identifierFlags,
  identifierMasks,
  identifierWord,
  payloadAt,
  writeFrameHead,
} from '../bridge/can-frame.js';
import type { ControllerModule } from '../bridge/controller-side.js';
import type { LinkSpec } from '../bridge/message-map.js';
import type { BenchSpec } from '../configs/bench-spec.js';
import type { ControllerFactory } from './loop/controller-module.js';

/** What of the package socketcan is used here. */
interface RawChannel {
  addListener(event: 'onMessage', listener: (message: PeerMessage) => void): void;
  start(): void;
  stop(): void;
  /** Bytes that the kernel took, or -1. */
  send(message: PeerMessage): number;
  sendFD(message: PeerMessage): number;
}
interface PeerMessage {
  id: number;
  ext?: boolean;
  rtr?: boolean;
  err?: boolean;
  fd_brs?: boolean;
  data: Buffer;
}
interface SocketCan {
  createRawChannelWithOptions(channel: string, options: { non_block_send: boolean }): RawChannel;
}

export interface CanPeer {
  /** Frames that could not be sent. */
  unsent: number;
  readonly endpoint: CanControllerEndpoint;
  close(): void;
}

/**
 * The controller of a bench on its CAN links, in a process of its own: by the package socketcan on real and virtual
 * interfaces, so that bench and controller share no code below the message map, and by datagrams on multicast links.
 */
export async function startCanPeer(spec: BenchSpec, factory: ControllerFactory): Promise<CanPeer> {
  const links = spec.map.links.filter((link) => link.kind !== 'udp');
  const senders: ((frame: Uint8Array, size: number) => boolean)[] = [];
  const closers: (() => void)[] = [];
  let controller: ControllerModule | undefined;
  let heard = 0;
  const peer: CanPeer = {
    unsent: 0,
    endpoint: new CanControllerEndpoint({
      map: spec.map,
      links: links.map((link) => link.name),
      controller: { step: (tick, read, write) => controller!.step(tick, read, write) },
      send: (link, frame, size) => {
        if (!senders[link]!(frame, size)) peer.unsent += 1;
      },
    }),
    close: () => {
      for (const close of closers) close();
    },
  };
  controller = factory.createController(peer.endpoint.mirror, spec.step);
  for (const [i, link] of links.entries()) {
    const take = (frame: Uint8Array, size: number) => {
      heard = Date.now();
      peer.endpoint.receive(i, frame, size);
    };
    if (link.kind === 'can') openInterface(spec, link, take, senders, closers);
    else await openGroup(link, take, senders, closers);
  }
  // A control unit on its own timer goes on by itself when the bench falls silent.
  const every = 20;
  const timer = setInterval(() => {
    if (heard !== 0 && Date.now() - heard > every) peer.endpoint.elapse(Math.round(every / 1000 / spec.step));
  }, every);
  closers.push(() => clearInterval(timer));
  return peer;
}

function openInterface(
  spec: BenchSpec,
  link: LinkSpec,
  take: (frame: Uint8Array, size: number) => void,
  senders: ((frame: Uint8Array, size: number) => boolean)[],
  closers: (() => void)[],
): void {
  const name = link.interface ?? 'can0';
  // socketcan does not tell a received FD frame from a classic one: the map does.
  const flexible = new Set(
    spec.map.messages
      .filter((message) => message.link === link.name && message.flexibleDataRate)
      .map((message) => message.identifier | (message.extended ? identifierFlags.extended : 0)),
  );
  const channel = openChannel(name);
  const frame = new Uint8Array(frameSizes.flexible);
  channel.addListener('onMessage', (message) => {
    if (message.err || message.rtr) return;
    const word = message.id | (message.ext ? identifierFlags.extended : 0);
    const size = flexible.has(word) || message.data.length > 8 ? frameSizes.flexible : frameSizes.classic;
    writeFrameHead(frame, word, message.data.length, size === frameSizes.flexible ? frameFlags.flexible : 0);
    frame.fill(0, payloadAt);
    frame.set(message.data, payloadAt);
    take(frame, size);
  });
  senders.push((sent, size) => {
    const word = identifierWord(sent);
    const extended = (word & identifierFlags.extended) !== 0;
    // The package copies what it is given without a look at the length: it is never more than the frame's own.
    const length = Math.min(sent[4]!, size === frameSizes.flexible ? 64 : 8);
    const message: PeerMessage = {
      id: word & (extended ? identifierMasks.extended : identifierMasks.standard),
      ext: extended,
      data: Buffer.from(sent.subarray(payloadAt, payloadAt + length)),
    };
    if (size === frameSizes.classic) return channel.send(message) > 0;
    return channel.sendFD({ ...message, fd_brs: (sent[5]! & frameFlags.bitRateSwitch) !== 0 }) > 0;
  });
  channel.start();
  closers.push(() => channel.stop());
}

function openChannel(name: string): RawChannel {
  let socketcan: SocketCan;
  try {
    socketcan = createRequire(import.meta.url)('socketcan') as SocketCan;
  } catch (error) {
    throw new Error(
      `the package socketcan does not load (${(error as Error).message}): it is optional and is built when it is installed, which needs g++, make and python3; or use a link of kind can-multicast`,
    );
  }
  try {
    return socketcan.createRawChannelWithOptions(name, { non_block_send: true });
  } catch (error) {
    throw new Error(
      `CAN interface ${name} cannot be opened (${(error as Error).message}): see \`ip link\`; a virtual one is made by \`ip link add dev ${name} type vcan && ip link set ${name} mtu 72 up\``,
    );
  }
}

async function openGroup(
  link: LinkSpec,
  take: (frame: Uint8Array, size: number) => void,
  senders: ((frame: Uint8Array, size: number) => boolean)[],
  closers: (() => void)[],
): Promise<void> {
  const address = link.remoteAddress ?? usualGroup.address;
  const port = link.remotePort ?? usualGroup.port;
  const own = link.localAddress ?? '127.0.0.1';
  const receiver = createSocket({ type: 'udp4', reuseAddr: true });
  const sender = createSocket('udp4');
  await new Promise<void>((resolve, reject) => {
    receiver.once('error', reject);
    receiver.bind(port, address, resolve);
  });
  await new Promise<void>((resolve, reject) => {
    sender.once('error', reject);
    sender.bind(0, own, resolve);
  });
  receiver.addMembership(address, own);
  sender.setMulticastInterface(own);
  sender.setMulticastTTL(1);
  const ownPort = sender.address().port;
  const incoming = new CanDatagram();
  const outgoing = new CanDatagram();
  const frame = new Uint8Array(frameSizes.flexible);
  receiver.on('message', (bytes, from) => {
    if ((from.port === ownPort && from.address === own) || bytes.length > incoming.bytes.length) return;
    incoming.bytes.set(bytes);
    const size = incoming.read(bytes.length, frame);
    if (size >= 0) take(frame, size);
  });
  const stamp = new Float64Array(1);
  senders.push((sent, size) => {
    stamp[0] = Date.now() / 1000;
    const length = outgoing.write(sent, size, stamp, 0);
    sender.send(Uint8Array.from(outgoing.bytes.subarray(0, length)), port, address);
    return true;
  });
  closers.push(() => {
    receiver.close();
    sender.close();
  });
}
