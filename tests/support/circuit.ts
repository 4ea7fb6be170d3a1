import { portKinds } from '../../plants/ports.js';
import { buildCircuit, places } from '../../runtime/circuit/build.js';
import type { Connection, ElementInstance, ElementKind } from '../../runtime/contract.js';
import { Plant } from '../../runtime/plant.js';

/** What a test says of an element; parameters and start values not given take their defaults. */
export interface Given {
  readonly parameters?: Readonly<Record<string, number>>;
  readonly start?: Readonly<Record<string, number>>;
  readonly fluid?: Readonly<Record<string, number>>;
  /** `port: 'store.port'` or `port: ['store.port', ratio]`. */
  readonly to?: Readonly<Record<string, string | readonly [string, number]>>;
}

/** An element of a test circuit. Throws on names that the kind does not declare and on values that are missing. */
export function element(name: string, kind: ElementKind, given: Given = {}): ElementInstance {
  const fill = (
    declared: Readonly<Record<string, { readonly default?: number }>>,
    values: Readonly<Record<string, number>>,
  ) => {
    for (const key of Object.keys(values))
      if (!(key in declared)) throw new Error(`${name}: no ${key} in ${kind.kind}`);
    return Object.fromEntries(
      Object.entries(declared).map(([key, { default: standard }]) => {
        const value = values[key] ?? standard;
        if (value === undefined) throw new Error(`${name}: ${key} is required`);
        return [key, value];
      }),
    );
  };
  const connections: Record<string, Connection> = {};
  for (const [port, target] of Object.entries(given.to ?? {})) {
    const [path, ratio] = typeof target === 'string' ? [target, 1] : target;
    const [store, storePort] = path!.split('.') as [string, string];
    connections[port] = { store, port: storePort, ratio: ratio as number };
  }
  return {
    name,
    kind,
    parameters: fill(kind.parameters, given.parameters ?? {}),
    start: fill(kind.starts, given.start ?? {}),
    ...(given.fluid ? { fluid: given.fluid } : {}),
    connections,
  };
}

/** A small circuit and a plant on it, read and driven by signal path. */
export class Bench {
  readonly plant: Plant;
  readonly circuit;
  private readonly at = new Map<string, () => number>();
  private readonly commandAt = new Map<string, number>();
  private readonly energyAtStart: number;

  constructor(
    elements: readonly ElementInstance[],
    settings: { step?: number; substeps?: number; net?: boolean; longest?: number } = {},
  ) {
    this.circuit = buildCircuit({ name: 'test', portKinds, elements });
    this.plant = Plant.alone(this.circuit, {
      step: settings.step ?? 1e-3,
      substeps: settings.substeps ?? 4,
      net: settings.net ?? true,
      ...(settings.longest === undefined ? {} : { longest: settings.longest }),
    });
    const { plant, circuit } = this;
    circuit.states.forEach((slot, i) => {
      this.at.set(slot.path, () => plant.y[i]!);
    });
    circuit.memory.forEach((slot, i) => {
      this.at.set(slot.path, () => plant.m[i]!);
    });
    circuit.readings.forEach((slot, i) => {
      this.at.set(slot.path, () => plant.observed[i]!);
    });
    circuit.commands.forEach((slot, i) => {
      this.commandAt.set(slot.path, i);
    });
    this.energyAtStart = this.storedEnergy();
  }

  get(path: string): number {
    const read = this.at.get(path);
    if (!read) throw new Error(`no signal ${path}`);
    return read();
  }

  set(path: string, value: number): void {
    const index = this.commandAt.get(path);
    if (index === undefined) throw new Error(`no command ${path}`);
    this.plant.u[index] = value;
  }

  /** Runs for `seconds`; `each` is called before every step with the time. */
  run(seconds: number, each?: (time: number) => void): void {
    const { step } = this.plant.settings;
    const count = Math.round(seconds / step);
    for (let i = 0; i < count; i += 1) {
      each?.(i * step);
      this.plant.step();
    }
  }

  storedEnergy(): number {
    return this.plant.observed[places(this.circuit).energy]!;
  }

  /** Stored energy gained less what was supplied and plus what left, J; zero for a ledger that closes. */
  energyResidual(): number {
    return this.storedEnergy() - this.energyAtStart - this.plant.ledger[0]! + this.plant.ledger[1]!;
  }
}
