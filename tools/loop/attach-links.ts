import { usualGroup } from '../../bridge/can-datagram.js';
import { kernelFilters, needsFlexibleDataRate } from '../../bridge/can-link.js';
import { CanMulticast } from '../../bridge/can-multicast.js';
import { CanError, CanSocket } from '../../bridge/can-socket.js';
import type { Exchange } from '../../bridge/exchange.js';
import { LockstepTransport } from '../../bridge/lockstep.js';
import type { LinkSpec } from '../../bridge/message-map.js';
import { UdpSocket } from '../../bridge/udp-socket.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { BuildError } from '../../runtime/contract.js';
import { Clock } from '../../runtime/realtime/clock.js';
import { type Barrier, type ControllerFactory, loadController, moduleBarrier } from './controller-module.js';
import type { RunOrder } from './run-order.js';

export interface AttachedLinks {
  /** To be told the end of each tick. */
  readonly barriers: readonly Barrier[];
  close(): void;
}

/** Ties the links of a bench to what moves their messages: a module in this thread, or sockets. */
export async function attachLinks(order: RunOrder, spec: BenchSpec, exchange: Exchange): Promise<AttachedLinks> {
  const barriers: Barrier[] = [];
  const sockets: { close(): void }[] = [];
  const close = () => {
    for (const socket of sockets) socket.close();
  };
  if (order.controller.kind === 'none' || spec.map.links.length === 0) return { barriers, close };
  if (order.controller.kind === 'module') {
    const factory = await loadController(order.folder, order.controller.file);
    barriers.push(attachModule(spec, exchange, factory, spec.controller?.period ?? 1));
    return { barriers, close };
  }
  try {
    for (const link of spec.map.links) {
      if (link.kind !== 'udp' && order.pace === 'fast') throw notAtFastPace(link);
      if (link.kind === 'can') {
        const socket = openCan(spec, link);
        sockets.push(socket);
        exchange.attach(link.name, socket);
        continue;
      }
      if (link.kind === 'can-multicast') {
        const bus = new CanMulticast({
          group: link.remoteAddress ?? usualGroup.address,
          port: link.remotePort ?? usualGroup.port,
          interfaceAddress: link.localAddress ?? '127.0.0.1',
        });
        sockets.push(bus);
        exchange.attach(link.name, bus);
        continue;
      }
      const socket = new UdpSocket({
        local: { address: link.localAddress ?? '127.0.0.1', port: link.localPort ?? 0 },
        peer: { address: link.remoteAddress ?? '127.0.0.1', port: link.remotePort ?? 0 },
      });
      sockets.push(socket);
      if (order.pace === 'live') {
        exchange.attach(link.name, socket);
        continue;
      }
      const barrier = lockstep(spec, link, socket, exchange);
      exchange.attach(link.name, barrier);
      barriers.push(barrier);
    }
  } catch (error) {
    close();
    throw error;
  }
  return { barriers, close };
}

/** A controller module on the bench's first link, and on all CAN links when that is one. */
export function attachModule(spec: BenchSpec, exchange: Exchange, factory: ControllerFactory, every: number): Barrier {
  const module = moduleBarrier(spec.map, exchange.checksum, factory, spec.step, every);
  for (const { link, transport } of module.transports) exchange.attach(link, transport);
  if (module.restart) exchange.onHello = module.restart;
  return module.barrier;
}

function openCan(spec: BenchSpec, link: LinkSpec): CanSocket {
  try {
    return new CanSocket({
      interface: link.interface ?? 'can0',
      filters: kernelFilters(spec.map.messages, link.name),
      flexibleDataRate: needsFlexibleDataRate(spec.map.messages, link.name),
    });
  } catch (error) {
    if (!(error instanceof CanError)) throw error;
    throw new BuildError([
      {
        path: `links.${link.name}`,
        what: error.message,
        value: link.interface ?? 'can0',
        remedy: 'or run the bench against its controller module',
      },
    ]);
  }
}

function lockstep(spec: BenchSpec, link: LinkSpec, socket: UdpSocket, exchange: Exchange): LockstepTransport {
  const clock = new Clock();
  const times = new Float64Array(1);
  const barrier = new LockstepTransport(socket, {
    link: link.name,
    mapChecksum: exchange.checksum,
    every: spec.controller?.period ?? 1,
    limit: 1000 * (spec.controller?.patience ?? 5),
    now: () => {
      clock.now(times, 0);
      return times[0]! * 1e-6;
    },
  });
  barrier.awaitHello(1000 * Math.max(10, spec.controller?.patience ?? 5));
  return barrier;
}

function notAtFastPace(link: LinkSpec): BuildError {
  return new BuildError([
    {
      path: `links.${link.name}`,
      what: 'a CAN bus cannot run faster than real time: CAN frames carry no barrier between ticks',
      value: `kind ${link.kind}`,
      remedy:
        'run it with --pace live, or at fast pace against the controller module of the bench, over frames in memory',
    },
  ]);
}
