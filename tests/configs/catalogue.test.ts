import { describe, expect, it } from 'vitest';
import { catalogue } from '../../configs/catalogue.js';
import { parseUnit } from '../../configs/units.js';

const keysOfEvery = ['is', 'about', 'fluid', 'start', 'drives'];

describe('the plant library as bench files see it', () => {
  it('has each kind once', () => {
    for (const kinds of [catalogue.elements, catalogue.instruments, catalogue.fluids]) {
      const names = kinds.map((kind) => kind.kind);
      expect(new Set(names).size).toBe(names.length);
      for (const name of names) expect(name).toMatch(/^[a-z]+(-[a-z]+)*$/);
    }
  });

  it.each(catalogue.elements.map((kind) => [kind.kind, kind] as const))(
    '%s: units that can be read, keys that do not clash',
    (_name, kind) => {
      const tables = [kind.states, kind.memory, kind.commands, kind.readings, kind.parameters, kind.starts];
      for (const table of tables) for (const { unit } of Object.values(table)) expect(parseUnit(unit).factor).toBe(1);
      const keys = [
        ...keysOfEvery,
        ...(kind.role === 'branch' ? Object.keys(kind.ports) : []),
        ...Object.keys(kind.parameters),
      ];
      expect(keys.filter((key, i) => keys.indexOf(key) !== i)).toEqual([]);
      const signals = [kind.states, kind.memory, kind.commands, kind.readings].flatMap((table) => Object.keys(table));
      expect(signals.filter((key, i) => signals.indexOf(key) !== i)).toEqual([]);
    },
  );

  it.each(catalogue.elements.map((kind) => [kind.kind, kind] as const))(
    '%s: defaults, bounds and limits agree',
    (_name, kind) => {
      for (const [name, declaration] of Object.entries({ ...kind.parameters, ...kind.starts })) {
        const { default: given, least, most, choices, usual } = declaration;
        if (given !== undefined && choices) expect(choices[given], name).toBeDefined();
        if (given !== undefined && least !== undefined) expect(given, name).toBeGreaterThanOrEqual(least);
        if (given !== undefined && most !== undefined) expect(given, name).toBeLessThanOrEqual(most);
        if (usual) expect(usual[0], name).toBeLessThan(usual[1]);
      }
      for (const limit of kind.limits) {
        expect({ ...kind.readings, ...kind.states }[limit.reading], limit.reading).toBeDefined();
        expect(kind.parameters[limit.parameter], limit.parameter).toBeDefined();
        expect({ ...kind.readings, ...kind.states }[limit.reading]!.unit).toBe(kind.parameters[limit.parameter]!.unit);
      }
      for (const portKind of Object.values(kind.ports)) expect(catalogue.portKinds[portKind]).toBeDefined();
    },
  );

  it.each(catalogue.instruments.map((kind) => [kind.kind, kind] as const))(
    '%s: units that can be read, keys that do not clash',
    (_name, kind) => {
      for (const table of [kind.inputs, kind.outputs, kind.parameters, kind.memory, kind.commands ?? {}]) {
        for (const { unit } of Object.values(table)) if (unit !== 'input') expect(parseUnit(unit).factor).toBe(1);
      }
      const keys = [...keysOfEvery, ...Object.keys(kind.inputs), ...Object.keys(kind.parameters)];
      expect(keys.filter((key, i) => keys.indexOf(key) !== i)).toEqual([]);
    },
  );
});
