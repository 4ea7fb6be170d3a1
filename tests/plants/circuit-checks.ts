import { expect } from 'vitest';
import { portKinds } from '../../plants/ports.js';
import { buildCircuit, type Circuit, places } from '../../runtime/circuit/build.js';
import { unfuse } from '../../runtime/circuit/unfused.js';
import type { Connection, ElementInstance, ElementKind } from '../../runtime/contract.js';
import { Plant } from '../../runtime/plant.js';

/** Helpers for tests that put elements on a small circuit and run them through the real builder and solver. */

/** Connections as text: `store`, `store.port`, or [text, ratio]. A store with one port needs no port name. */
export interface Placed {
  readonly kind: ElementKind;
  readonly parameters?: Record<string, number>;
  readonly start?: Record<string, number>;
  readonly ports?: Record<string, string | readonly [string, number]>;
  readonly fluid?: Record<string, number>;
}

/** Builds a circuit from elements by name. Missing parameters take their defaults; a required one missing is an error. */
export function circuitOf(elements: Record<string, Placed>, fluid?: Record<string, number>): Circuit {
  const instances = Object.entries(elements).map(([name, placed]): ElementInstance => {
    const parameters: Record<string, number> = {};
    for (const [key, declaration] of Object.entries(placed.kind.parameters)) {
      const value = placed.parameters?.[key] ?? declaration.default;
      if (value === undefined) throw new Error(`${name}: parameter ${key} is required`);
      parameters[key] = value;
    }
    for (const key of Object.keys(placed.parameters ?? {}))
      if (!(key in placed.kind.parameters)) throw new Error(`${name}: no parameter ${key}`);
    const start: Record<string, number> = {};
    for (const [key, declaration] of Object.entries(placed.kind.starts))
      if (declaration.default !== undefined) start[key] = declaration.default;
    Object.assign(start, placed.start);
    const connections: Record<string, Connection> = {};
    for (const [port, to] of Object.entries(placed.ports ?? {})) {
      const [text, ratio] = typeof to === 'string' ? [to, 1] : to;
      const [store, named] = text.split('.');
      const ports = elements[store!]?.kind.ports ?? {};
      const kindName = placed.kind.ports[port];
      const port2 = named ?? Object.keys(ports).find((key) => ports[key] === kindName) ?? '?';
      connections[port] = { store: store!, port: port2, ratio };
    }
    const own = placed.fluid ?? fluid;
    return {
      name,
      kind: placed.kind,
      parameters,
      start,
      connections,
      ...(placed.kind.fluid && own ? { fluid: own } : {}),
    };
  });
  return buildCircuit({ name: 'test', portKinds, elements: instances });
}

export function plantOf(circuit: Circuit, substeps = 4, step = 1e-3): Plant {
  return Plant.alone(circuit, { step, substeps });
}

/** Index of a signal of a kind by path; throws on unknown paths. */
export function indexOf(list: readonly { readonly path: string }[], path: string): number {
  const at = list.findIndex((slot) => slot.path === path);
  if (at < 0) throw new Error(`no ${path}; there are ${list.map((slot) => slot.path).join(', ')}`);
  return at;
}
export function reading(plant: Plant, path: string): number {
  return plant.observed[indexOf(plant.circuit.readings, path)]!;
}
export function stateOf(plant: Plant, path: string): number {
  return plant.y[indexOf(plant.circuit.states, path)]!;
}
export function command(plant: Plant, path: string, value: number): void {
  plant.u[indexOf(plant.circuit.commands, path)] = value;
}

/**
 * The exact Jacobian against central differences at the plant's present state; the worst error relative to its entry.
 * With several steps each entry counts with the one that fits it best: too long a step bends, too short a one is noise.
 * `negligible`, 1/s: an error below that much of the states' scales does not count.
 */
export function jacobianError(
  plant: Plant,
  relativeSteps: number | readonly number[] = 1e-6,
  negligible = 0,
): { error: number; where: string } {
  const { circuit, y, u, m } = plant;
  const n = circuit.states.length;
  const J = new Float64Array(circuit.jacobian.rows.length);
  const d = new Float64Array(places(circuit).rateCount);
  circuit.functions.ratesAndJacobian(y, u, m, d, J);
  const exact = Array.from({ length: n }, () => new Float64Array(n));
  circuit.jacobian.rows.forEach((row, i) => {
    exact[row]![circuit.jacobian.columns[i]!] = J[i]!;
  });
  const steps = typeof relativeSteps === 'number' ? [relativeSteps] : relativeSteps;
  const a = new Float64Array(n);
  const b = new Float64Array(n);
  let worst = 0;
  let where = '';
  for (let k = 0; k < n; k += 1) {
    const least = new Float64Array(n).fill(Number.POSITIVE_INFINITY);
    const slopes = new Float64Array(n);
    for (const step of steps) {
      const size = step * (Math.abs(y[k]!) + circuit.states[k]!.scale);
      const up = Float64Array.from(y);
      const down = Float64Array.from(y);
      up[k]! += size;
      down[k]! -= size;
      circuit.functions.rates(up, u, m, a);
      circuit.functions.rates(down, u, m, b);
      for (let i = 0; i < n; i += 1) {
        const slope = (a[i]! - b[i]!) / (up[k]! - down[k]!);
        // rounding noise of the difference quotient itself
        const noise = (4e-16 * (Math.abs(a[i]!) + Math.abs(b[i]!)) * 1e3) / size;
        const scale = Math.max(Math.abs(slope), Math.abs(exact[i]![k]!), 1e-12);
        const small = (negligible * circuit.states[i]!.scale) / circuit.states[k]!.scale;
        const error = Math.max(0, Math.abs(slope - exact[i]![k]!) - noise - small) / scale;
        // false for NaN too
        if (error < least[i]!) {
          least[i] = error;
          slopes[i] = slope;
        }
      }
    }
    for (let i = 0; i < n; i += 1) {
      if (least[i]! > worst) {
        worst = least[i]!;
        where = `d(${circuit.states[i]!.path})/d(${circuit.states[k]!.path}): exact ${exact[i]![k]}, difference ${slopes[i]}`;
      }
    }
  }
  return { error: worst, where };
}

/** Fused and unfused forms agree to the bit in rates, memory and readings at the present state. */
export function expectSameBits(plant: Plant): void {
  const { circuit, y, u, m } = plant;
  const slow = unfuse(circuit);
  const n = circuit.states.length;
  const fused = new Float64Array(n);
  const plain = new Float64Array(n);
  circuit.functions.rates(y, u, m, fused);
  slow.rates(y, u, m, plain);
  circuit.states.forEach((state, i) => {
    if (!Object.is(fused[i], plain[i])) expect.fail(`${state.path}: fused ${fused[i]}, unfused ${plain[i]}`);
  });
  if (circuit.hasMemory) {
    const a = new Float64Array(circuit.memory.length);
    const b = new Float64Array(circuit.memory.length);
    circuit.functions.update(y, u, m, 2.5e-4, a);
    slow.update(y, u, m, 2.5e-4, b);
    circuit.memory.forEach((slot, i) => {
      if (!Object.is(a[i], b[i])) expect.fail(`${slot.path}: fused ${a[i]}, unfused ${b[i]}`);
    });
  }
  const out = new Float64Array(places(circuit).observeCount);
  circuit.functions.observe(y, u, m, out);
  const readings = slow.readings(y, u, m);
  circuit.readings.forEach((slot, i) => {
    const plainValue = readings.get(slot.path);
    if (plainValue !== undefined && slot.group === 'reading' && !Object.is(out[i], plainValue))
      expect.fail(`${slot.path}: fused ${out[i]}, unfused ${plainValue}`);
  });
}

/** Each element's energy balance at the present state: imbalance over the size of its terms; the worst element. */
export function worstImbalance(plant: Plant): { relative: number; element: string } {
  const { circuit } = plant;
  const count = circuit.spec.elements.length;
  const out = new Float64Array(2 * count);
  circuit.functions.audit(plant.y, plant.u, plant.m, out);
  let relative = 0;
  let element = '';
  for (let i = 0; i < count; i += 1) {
    const share = Math.abs(out[i]!) / Math.max(out[count + i]!, 1e-3);
    if (!(share <= relative)) {
      relative = share;
      element = `${circuit.spec.elements[i]!.name}: ${out[i]} W of ${out[count + i]} W`;
    }
  }
  return { relative, element };
}

/** Energy residual of the run so far, J: stored now less stored at the start, less what came in, plus what left. */
export function energyResidual(plant: Plant, energyAtStart: number): number {
  const at = places(plant.circuit);
  return plant.observed[at.energy]! - energyAtStart - plant.ledger[0]! + plant.ledger[1]!;
}
export function energyNow(plant: Plant): number {
  return plant.observed[places(plant.circuit).energy]!;
}
/** What the circuit holds of a stuff now less what was brought, kg. */
export function holding(plant: Plant, stuff: string): number {
  const at = places(plant.circuit);
  const i = plant.circuit.stuffs.indexOf(stuff);
  return plant.observed[at.holdings + i]! - plant.ledger[2 + i]!;
}
