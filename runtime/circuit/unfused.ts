import type { ElementFunction, ElementInstance } from '../contract.js';
import type { Circuit } from './build.js';

/**
 * The same circuit without fusing: the very same element functions run on plain objects, one after another. For the
 * debugger (set a breakpoint in an element) and for tests: both forms give the same bits. Slow, allocates.
 */
export interface Unfused {
  rates(y: Float64Array, u: Float64Array, m: Float64Array, d: Float64Array): void;
  update(y: Float64Array, u: Float64Array, m: Float64Array, h: number, out: Float64Array): void;
  /** Own readings only, by path. */
  readings(y: Float64Array, u: Float64Array, m: Float64Array): Map<string, number>;
}

interface Live {
  readonly element: ElementInstance;
  readonly argument: Record<string, unknown>;
  readonly tables: Record<'state' | 'memory' | 'command' | 'reading' | 'derivative' | 'next', Record<string, number>>;
  readonly ports: Record<string, Record<string, number>>;
}

export function unfuse(circuit: Circuit): Unfused {
  const { spec } = circuit;
  const live = new Map<string, Live>();
  for (const element of spec.elements) {
    const tables = { state: {}, memory: {}, command: {}, reading: {}, derivative: {}, next: {} };
    const ports: Record<string, Record<string, number>> = {};
    for (const port of Object.keys(element.kind.ports)) ports[port] = {};
    const argument = {
      parameter: element.parameters,
      fluid: element.fluid ?? {},
      law: element.kind.laws,
      state: tables.state,
      memory: tables.memory,
      command: tables.command,
      reading: tables.reading,
      derivative: tables.derivative,
      ...ports,
    };
    live.set(element.name, { element, tables, ports, argument });
  }
  const all = [...live.values()];
  const stores = all.filter((one) => one.element.kind.role === 'store');
  const branches = all.filter((one) => one.element.kind.role === 'branch');
  const portKind = (element: ElementInstance, port: string) => spec.portKinds[element.kind.ports[port]!]!;

  const load = (y: Float64Array, u: Float64Array, m: Float64Array) => {
    circuit.states.forEach((slot, i) => {
      live.get(slot.element)!.tables.state[slot.name] = y[i]!;
    });
    circuit.commands.forEach((slot, i) => {
      live.get(slot.element)!.tables.command[slot.name] = u[i]!;
    });
    circuit.memory.forEach((slot, i) => {
      live.get(slot.element)!.tables.memory[slot.name] = m[i]!;
    });
  };

  const evaluate = (y: Float64Array, u: Float64Array, m: Float64Array) => {
    load(y, u, m);
    for (const one of stores) {
      for (const port of Object.keys(one.ports))
        for (const flow of Object.keys(portKind(one.element, port).flows)) one.ports[port]![flow] = -0;
      one.element.kind.efforts?.(one.argument);
    }
    for (const one of branches) {
      for (const port of Object.keys(one.ports)) one.argument[port] = branchView(one, port);
      one.element.kind.flows?.(one.argument);
    }
    for (const one of stores) one.element.kind.derivatives?.(one.argument);
  };

  const branchView = (one: Live, port: string): Record<string, number> => {
    const kind = portKind(one.element, port);
    const connection = one.element.connections[port];
    const view: Record<string, number> = {};
    const target = connection ? live.get(connection.store)!.ports[connection.port]! : undefined;
    for (const effort of Object.keys(kind.efforts)) {
      const scaled = kind.scaled?.effort === effort && connection;
      view[effort] = !target ? 0 : scaled ? connection.ratio * target[effort]! : target[effort]!;
    }
    // `port.flow += x` reads -0 here, so that what is written is x to the bit; the store then gets sum + ratio * x
    return new Proxy(view, {
      get: (_, key: string) => (key in kind.flows ? -0 : view[key]),
      set: (_, key: string, added: number) => {
        if (!target) return true;
        const scaled = kind.scaled?.flow === key ? connection!.ratio * added : added;
        target[key] = target[key]! + scaled;
        return true;
      },
    });
  };

  const runUpdate = (one: Live, h: number) => {
    const { next, memory } = one.tables;
    Object.assign(next, memory);
    const proxy = new Proxy(memory, {
      get: (_, key: string) => memory[key],
      set: (_, key: string, value: number) => {
        next[key] = Number(value);
        return true;
      },
    });
    (one.element.kind.update as ElementFunction)({ ...one.argument, memory: proxy, step: h });
  };

  return {
    rates(y, u, m, d) {
      evaluate(y, u, m);
      circuit.states.forEach((slot, i) => {
        d[i] = live.get(slot.element)!.tables.derivative[slot.name]!;
      });
    },
    update(y, u, m, h, out) {
      evaluate(y, u, m);
      for (const one of all) {
        if (one.element.kind.update) runUpdate(one, h);
        else Object.assign(one.tables.next, one.tables.memory);
      }
      circuit.memory.forEach((slot, i) => {
        out[i] = live.get(slot.element)!.tables.next[slot.name]!;
      });
    },
    readings(y, u, m) {
      evaluate(y, u, m);
      const result = new Map<string, number>();
      for (const one of all)
        for (const [name, value] of Object.entries(one.tables.reading))
          result.set(`${one.element.name}.${name}`, Number(value));
      return result;
    },
  };
}
