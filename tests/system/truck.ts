import type { LockstepTransport } from '../../bridge/lockstep.js';
import type { Transport } from '../../bridge/transport.js';
import { type Assembly, assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import type { ElementKind } from '../../runtime/contract.js';
import { type ControllerFactory, loadController, moduleTransport } from '../../tools/loop/controller-module.js';

/** The reference truck as `run --pace fast` puts it together: duty, demo controller as a module, no journal. */
export interface Truck {
  readonly spec: BenchSpec;
  readonly assembly: Assembly;
  readonly barrier: LockstepTransport;
  readonly ticks: number;
  /** Runs the ticks from where it stands up to `last`, pre-roll included; `each` after every one. */
  run(last: number, each?: (tick: number) => void): void;
  value(path: string): number;
}

const folder = new URL('../../configs/harbour-truck/', import.meta.url).pathname;

export async function loadTruckController(): Promise<ControllerFactory> {
  return loadController(folder, 'controller.js');
}

export interface TruckOptions {
  readonly seed?: number;
  /** Replaces an element's kind. */
  readonly kind?: (name: string, kind: ElementKind) => ElementKind;
  /** Stands between the bench and the controller's link. */
  readonly between?: (transport: LockstepTransport) => Transport;
  readonly substeps?: number;
}

export function makeTruck(factory: ControllerFactory, options: TruckOptions = {}): Truck {
  const spec = readBench(`${folder}bench.yaml`, catalogue);
  const { script } = readScenario(`${folder}${spec.duty}`, spec);
  const changed = options.kind
    ? {
        ...spec,
        circuit: {
          ...spec.circuit,
          elements: spec.circuit.elements.map((one) => ({ ...one, kind: options.kind!(one.name, one.kind) })),
        },
      }
    : spec;
  const assembly = assemble(changed, {
    seed: options.seed ?? 1,
    script,
    ...(options.substeps === undefined ? {} : { substeps: options.substeps }),
  });
  const barrier = moduleTransport(
    spec.map,
    assembly.exchange.checksum,
    factory,
    spec.step,
    spec.controller?.period ?? 1,
  );
  assembly.exchange.attach(spec.map.links[0]!.name, options.between ? options.between(barrier) : barrier);
  let next = assembly.firstTick;
  return {
    spec,
    assembly,
    barrier,
    ticks: script.ticks,
    run(last, each) {
      for (; next < last; next += 1) {
        assembly.tick.run(next);
        barrier.end(next);
        each?.(next);
      }
    },
    value: (path) => {
      const at = assembly.table.find(path);
      if (at < 0) throw new Error(`no signal ${path}`);
      return assembly.signals[at]!;
    },
  };
}
