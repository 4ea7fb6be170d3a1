import { existsSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';
import { CanControllerEndpoint } from '../../bridge/can-controller.js';
import { frameSizes } from '../../bridge/can-frame.js';
import { ControllerEndpoint, type ControllerMirror, type ControllerModule } from '../../bridge/controller-side.js';
import { LockstepTransport } from '../../bridge/lockstep.js';
import { type MemoryTransport, memoryPair } from '../../bridge/memory-transport.js';
import type { MessageMap } from '../../bridge/message-map.js';
import type { Transport } from '../../bridge/transport.js';
import { BuildError } from '../../runtime/contract.js';

/** What a controller's module exports. `step` is the length of a tick, s. */
export interface ControllerFactory {
  createController(mirror: ControllerMirror, step: number): ControllerModule;
}

/** The project's own folder, whether this runs from dist/ or from the sources. */
export function packageRoot(): string {
  const here = path.dirname(fileURLToPath(import.meta.url));
  const up = path.resolve(here, '..', '..');
  return path.basename(up) === 'dist' ? path.dirname(up) : up;
}

/**
 * Loads the module of a controller named in a bench file. A ready bench's module is TypeScript and stands compiled
 * under dist/ at the same place; a user's own is plain JavaScript beside the bench file.
 */
export async function loadController(folder: string, file: string): Promise<ControllerFactory> {
  const wanted = path.resolve(folder, file);
  const root = packageRoot();
  const relative = path.relative(root, wanted);
  const compiled = relative.startsWith('..') ? undefined : path.join(root, 'dist', relative);
  const source = wanted.replace(/\.js$/, '.ts');
  const fromSources = !fileURLToPath(import.meta.url).startsWith(path.join(root, 'dist'));
  const found = [wanted, ...(fromSources ? [source] : []), ...(compiled ? [compiled] : [])].find((one) =>
    existsSync(one),
  );
  if (!found) {
    throw new BuildError([
      {
        path: 'controller.module',
        what: 'there is no such file',
        value: wanted,
        remedy: 'name a JavaScript module beside the bench file, or build the project first',
      },
    ]);
  }
  const module = (await import(pathToFileURL(found).href)) as Partial<ControllerFactory>;
  if (typeof module.createController !== 'function') {
    throw new BuildError([
      {
        path: 'controller.module',
        what: 'it exports no function createController(mirror, step)',
        value: wanted,
        remedy: 'export one; see DEVELOPERS.md, a controller as a module',
      },
    ]);
  }
  return module as ControllerFactory;
}

/**
 * A controller module at the other end of a link in memory, in lockstep, with the same bytes as over UDP. The first
 * link of the map; `every`: ticks of the barrier.
 */
export function moduleTransport(
  map: MessageMap,
  checksum: number,
  factory: ControllerFactory,
  step: number,
  every: number,
): LockstepTransport {
  const link = map.links[0]!.name;
  const [bench, far] = memoryPair();
  const endpoint = makeEndpoint(map, link, factory, step, far);
  bench.turn = () => endpoint.pump(far);
  // Nothing else runs meanwhile: the patience is a number of turns, not a time.
  let turns = 0;
  const now = () => {
    turns = (turns + 1) & 0x3fffffff;
    return turns;
  };
  return new LockstepTransport(bench, { link, mapChecksum: checksum, every, now, limit: 8 });
}

/** What is told the end of each tick. */
export interface Barrier {
  end(tick: number): void;
}

export interface ModuleBarrier {
  readonly barrier: Barrier;
  /** What the bench's links are to be attached to. */
  readonly transports: readonly { readonly link: string; readonly transport: Transport }[];
  /** Starts the controller anew, where the link has no word for it. */
  readonly restart?: () => void;
}

/**
 * A controller module at the other end of the first link of the map, or, when that is a CAN link, of all CAN links. On
 * CAN the frames are in memory, in lockstep: what the controller answers to tick k is taken in tick k + 1.
 */
export function moduleBarrier(
  map: MessageMap,
  checksum: number,
  factory: ControllerFactory,
  step: number,
  every: number,
): ModuleBarrier {
  const first = map.links[0]!;
  if (first.kind === 'udp') {
    const transport = moduleTransport(map, checksum, factory, step, every);
    return { barrier: transport, transports: [{ link: first.name, transport }] };
  }
  const links = map.links.filter((link) => link.kind !== 'udp').map((link) => link.name);
  const pairs = links.map(() => memoryPair(1024, frameSizes.flexible));
  let controller: ControllerModule | undefined;
  const endpoint: CanControllerEndpoint = new CanControllerEndpoint({
    map,
    links,
    controller: {
      step: (tick, read, write) => controller!.step(tick, read, write),
      restart: () => controller!.restart?.(),
    },
    send: (link, frame, size) => {
      pairs[link]![1].send(frame, size);
    },
  });
  controller = factory.createController(endpoint.mirror, step);
  const barrier: Barrier = {
    end(tick) {
      endpoint.setTick(tick);
      for (let i = 0; i < pairs.length; i += 1) endpoint.pump(i, pairs[i]![1]);
      if (tick % every === 0) endpoint.answer(every);
    },
  };
  return {
    barrier,
    transports: links.map((link, i) => ({ link, transport: pairs[i]![0] })),
    restart: () => endpoint.restart(),
  };
}

function makeEndpoint(
  map: MessageMap,
  link: string,
  factory: ControllerFactory,
  step: number,
  far: MemoryTransport,
): ControllerEndpoint {
  let controller: ControllerModule | undefined;
  const endpoint: ControllerEndpoint = new ControllerEndpoint({
    map,
    link,
    mode: 'lockstep',
    send: (bytes, length) => {
      far.send(bytes, length);
    },
    controller: {
      step: (tick, read, write) => controller!.step(tick, read, write),
      restart: () => controller!.restart?.(),
    },
  });
  controller = factory.createController(endpoint.mirror, step);
  return endpoint;
}
