import { buildCircuit, type Circuit } from '../../../runtime/circuit/build.js';
import type { ElementFunction, ElementKind, Laws, StateDeclaration } from '../../../runtime/contract.js';
import { Plant } from '../../../runtime/plant.js';

/** A system of equations as one store without ports, so that it runs through the product's builder and solver. */
export function problem(initial: Record<string, number>, derivatives: ElementFunction, laws: Laws = {}): Circuit {
  const states: Record<string, StateDeclaration> = {};
  for (const [name, value] of Object.entries(initial))
    states[name] = { unit: '1', about: name, initial: value, errorWeight: () => 0 };
  const kind: ElementKind = {
    kind: 'problem',
    role: 'store',
    about: 'a test problem',
    source: 'test',
    ports: {},
    states,
    memory: {},
    commands: {},
    readings: {},
    parameters: {},
    starts: {},
    fluid: false,
    laws,
    limits: [],
    heat: 'kept',
    efforts: () => {},
    derivatives,
  };
  return buildCircuit({
    name: 'problem',
    portKinds: {},
    elements: [{ name: 'problem', kind, parameters: {}, connections: {}, start: {} }],
  });
}

/** Integrates to `until` with constant steps; the end state. */
export function integrate(circuit: Circuit, until: number, steps: number, net = false): Float64Array {
  const plant = Plant.alone(circuit, { step: until / steps, substeps: 1, net });
  for (let i = 0; i < steps; i += 1) plant.step();
  return plant.y;
}
