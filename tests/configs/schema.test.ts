import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { z } from 'zod';
import { catalogue as library } from '../../configs/catalogue.js';
import { benchSchema, writeBenchSchema } from '../../configs/schema.js';
import { catalogue } from './catalogue.js';
import { smallBench } from './small-bench.js';

type Json = Parameters<typeof z.fromJSONSchema>[0];

// zod reads JSON schema by itself and knows nothing of how this one was made.
const validator = z.fromJSONSchema(benchSchema(catalogue) as Json);
const accepts = (text: string) => validator.safeParse(parse(text, { version: '1.2' })).success;

describe('the schema for editors', () => {
  it('accepts what reading accepts', () => {
    const result = validator.safeParse(parse(smallBench, { version: '1.2' }));
    expect(result.error?.issues ?? []).toEqual([]);
  });

  it.each([
    ['a pressure without (a) or (g)', 'precharge: 150 bar(g) at 20 degC', 'precharge: 150 bar'],
    ['a quantity without a unit', 'volume: 50 L', 'volume: 50'],
    ['a gauge difference', 'cracking: 330 bar(g),', 'cracking: 330 bar(g), hysteresis: 1 bar(g),'],
    ['an unknown key', 'maximumAllowable', 'maximumAllowabel'],
    ['an unknown kind', 'is: shaft', 'is: shaftt'],
    ['a missing port', 'from: highAccumulator, ', ''],
    ['a missing parameter', ', opens: 30 ms', ''],
    ['an unknown choice', 'separator: bladder', 'separator: blader'],
    ['a name that is no name', 'propShaft: {', 'prop-shaft: {'],
    ['an unknown direction', 'direction: received', 'direction: in'],
    ['an unknown section', 'duty: round', 'dutty: round'],
  ])('refuses %s', (_title, from, to) => {
    expect(smallBench).toContain(from);
    expect(accepts(smallBench.replace(from, to))).toBe(false);
  });

  it('accepts the short forms', () => {
    expect(accepts(smallBench.replace('range: 0 .. 400 bar(g)', 'least: 0 bar(g), most: 400 bar(g)'))).toBe(true);
    expect(accepts(smallBench.replace('cracking: 330 bar(g),', 'cracking: 330 bar(g), hysteresis: 1 bar,'))).toBe(true);
    expect(accepts(smallBench.replace('id: 1\n', 'id: 0x101\n'))).toBe(true);
  });

  it('names every kind of the plant library, with every parameter and its description', () => {
    const schema = benchSchema(library) as {
      $defs: Record<string, { properties: Record<string, { description?: string }>; additionalProperties: boolean }>;
    };
    const kinds = [
      ...library.elements.map((kind) => [kind.role, kind] as const),
      ...library.instruments.map((kind) => ['instrument', kind] as const),
      ...library.fluids.map((kind) => ['fluid', kind] as const),
    ];
    expect(Object.keys(schema.$defs).sort()).toEqual(kinds.map(([group, kind]) => `${group}.${kind.kind}`).sort());
    for (const [group, kind] of kinds) {
      const definition = schema.$defs[`${group}.${kind.kind}`]!;
      expect(definition.additionalProperties).toBe(false);
      for (const [name, parameter] of Object.entries(kind.parameters)) {
        expect(definition.properties[name]?.description, `${kind.kind}.${name}`).toContain(parameter.about);
      }
    }
    z.fromJSONSchema(schema as Json);
  });

  it('is written as JSON', () => {
    const folder = mkdtempSync(join(tmpdir(), 'schema-'));
    try {
      writeBenchSchema(catalogue, join(folder, 'bench.schema.json'));
      expect(JSON.parse(readFileSync(join(folder, 'bench.schema.json'), 'utf8'))).toEqual(
        JSON.parse(JSON.stringify(benchSchema(catalogue))),
      );
    } finally {
      rmSync(folder, { recursive: true });
    }
  });
});
