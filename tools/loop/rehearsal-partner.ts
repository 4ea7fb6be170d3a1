import { crc32 } from '../../bridge/checksums.js';
import { ControllerEndpoint, type ControllerModule } from '../../bridge/controller-side.js';
import type { Exchange } from '../../bridge/exchange.js';
import type { MessageMap } from '../../bridge/message-map.js';
import { header } from '../../bridge/udp-layout.js';
import { UdpSocket } from '../../bridge/udp-socket.js';
import type { Barrier, ControllerFactory } from './controller-module.js';

/** Ticks between two datagrams that are wrong, and the silence in which every time-out comes, ticks. */
const EVERY = 7;
const SILENCE = { every: 1500, from: 900, to: 1200 } as const;
const FAULTS = 10;
/** Longer than any message of a map. */
const TOO_LONG = 4096;

/**
 * The controller's side of one UDP link while the loop warms up: a socket of its own on this computer, so that the
 * bench's socket, codec and counts run as in a live run. It answers as the bench's controller module does (or sweeps
 * every value through its range), and now and then sends what only trouble brings: cut, damaged, doubled, late, lost,
 * from another map, out of range, from a stranger, silence.
 */
export class RehearsalPartner implements Barrier {
  /** What the bench is to be attached to. */
  readonly bench: UdpSocket;
  private readonly own: UdpSocket;
  private readonly stranger: UdpSocket;
  private readonly endpoint: ControllerEndpoint;
  private readonly last = new Uint8Array(TOO_LONG);
  private readonly view = new DataView(this.last.buffer);
  private lastLength = 0;
  private silent = false;
  private faults = 0;

  constructor(map: MessageMap, link: string, factory: ControllerFactory | undefined, step: number) {
    const local = { address: '127.0.0.1', port: 0 };
    this.bench = new UdpSocket({ local });
    const peer = { address: '127.0.0.1', port: this.bench.localPort };
    this.own = new UdpSocket({ local, peer });
    this.stranger = new UdpSocket({ local, peer });
    this.own.send(this.last, 1);
    this.bench.wait(1000);
    this.bench.poll(new Uint8Array(8));
    this.bench.adoptSender();
    let controller: ControllerModule | undefined;
    this.endpoint = new ControllerEndpoint({
      map,
      link,
      mode: 'live',
      controller: {
        step: (tick, read, write) => controller!.step(tick, read, write),
        restart: () => controller!.restart?.(),
      },
      send: (bytes, length) => this.pass(bytes, length),
    });
    controller = factory?.createController(this.endpoint.mirror, step) ?? sweep(this.endpoint);
  }

  /** After each tick of the bench: answers, and spoils something. */
  end(tick: number): void {
    const phase = tick % SILENCE.every;
    this.silent = phase >= SILENCE.from && phase < SILENCE.to;
    this.endpoint.pump(this.own);
    if (tick % EVERY === 0 && this.lastLength > 0) this.spoil(tick / EVERY);
  }

  close(): void {
    for (const socket of [this.bench, this.own, this.stranger]) socket.close();
  }

  private pass(bytes: Uint8Array, length: number): void {
    if (this.silent) return;
    this.own.send(bytes, length);
    this.last.set(bytes.subarray(0, length));
    this.lastLength = length;
  }

  private spoil(round: number): void {
    const { last, view, own } = this;
    const length = this.lastLength;
    this.faults += 1;
    const sequence = view.getInt32(header.sequence, true);
    switch (Math.abs(round) % FAULTS) {
      case 0:
        own.send(last, length);
        break;
      case 1:
        own.send(last, Math.max(1, length - 5));
        break;
      case 2:
        last[length - 1] = last[length - 1]! ^ 1;
        own.send(last, length);
        break;
      case 3:
        view.setInt32(header.map, ~view.getInt32(header.map, true), true);
        this.seal(length);
        break;
      case 4:
        own.send(last, TOO_LONG);
        break;
      case 5:
        view.setInt32(header.sequence, sequence - 5, true);
        this.seal(length);
        break;
      case 6:
        view.setInt32(header.sequence, sequence + 4, true);
        this.seal(length);
        break;
      case 7:
        for (let i = header.length; i < length - 4; i += 1) last[i] = 255;
        view.setInt32(header.sequence, sequence + 1, true);
        this.seal(length);
        break;
      case 8:
        this.stranger.send(last, length);
        view.setUint32(header.magic, 1, true);
        this.seal(length);
        break;
      default:
        if (!this.silent) this.endpoint.hello();
    }
    this.lastLength = 0;
  }

  private seal(length: number): void {
    this.view.setInt32(length - 4, crc32(this.last, 0, length - 4), true);
    this.own.send(this.last, length);
  }
}

/** Moves every value that the bench takes slowly through its range and a little beyond. */
function sweep(endpoint: ControllerEndpoint): ControllerModule {
  const signals = endpoint.mirror.outbound.flatMap((message) => message.signals);
  return {
    step(tick, _read, write) {
      for (let i = 0; i < signals.length; i += 1) {
        const { least, most } = signals[i]!;
        write[i] = 0.5 * (least + most) + 0.51 * (most - least) * Math.sin(0.003 * tick * (i + 1));
      }
    },
  };
}

/** Attaches partners to all UDP links of a bench. */
export function rehearse(
  map: MessageMap,
  exchange: Exchange,
  factory: ControllerFactory | undefined,
  step: number,
): RehearsalPartner[] {
  return map.links
    .filter((link) => link.kind === 'udp' && map.messages.some((message) => message.link === link.name))
    .map((link, i) => {
      const partner = new RehearsalPartner(map, link.name, i === 0 ? factory : undefined, step);
      exchange.attach(link.name, partner.bench);
      return partner;
    });
}
