import { writeFileSync } from 'node:fs';
import type { ElementKind, ParameterDeclaration } from '../runtime/contract.js';
import type { InstrumentKind } from '../runtime/instrument.js';
import type { Catalogue } from './bench-spec.js';
import { rangeKeys } from './parameters.js';
import { mapping, named, quantitySchema, rangeSchema, type Schema, text, texts } from './schema-parts.js';
import { runningSchemas } from './schema-running.js';
import { formatQuantity, tradeUnit } from './units.js';

/**
 * JSON schema (draft 2020-12) of bench files for editors: completion, descriptions and the coarse checks. Made from the
 * declarations that reading uses; what needs more than one place of the file is left to reading.
 */
export function benchSchema(catalogue: Catalogue): Schema {
  const definitions: Record<string, Schema> = {};
  const choose = (
    group: string,
    kinds: readonly { readonly kind: string }[],
    schemaOf: (kind: never) => Schema,
  ): Schema => {
    for (const kind of kinds) definitions[`${group}.${kind.kind}`] = schemaOf(kind as never);
    return { oneOf: kinds.map((kind) => ({ $ref: `#/$defs/${group}.${kind.kind}` })) };
  };
  const elements = (role: 'store' | 'branch') =>
    choose(
      role,
      catalogue.elements.filter((kind) => kind.role === role),
      (kind: ElementKind) => elementSchema(kind),
    );
  const fluids = choose('fluid', catalogue.fluids, (kind: Catalogue['fluids'][number]) =>
    withKind(kind, parameterSchemas(kind.parameters), requiredOf(kind.parameters)),
  );
  const instruments = choose('instrument', catalogue.instruments, (kind: InstrumentKind) => instrumentSchema(kind));
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    title: 'oilspring bench file',
    type: 'object',
    properties: {
      bench: { ...text, description: 'name of the bench' },
      about: text,
      include: { ...texts, description: 'further files or folders beside this one' },
      base: {
        ...texts,
        description: 'a bench of which this one is a variant: what this file does not say is as there',
      },
      step: { ...quantitySchema({ unit: 's' }), description: 'length of a tick' },
      substeps: { type: 'integer', minimum: 1, maximum: 64, description: 'substeps of the solver in a tick' },
      seed: { type: 'integer', minimum: 0, description: 'seed of the noise' },
      fluids: named(fluids, 'fluids by name'),
      stores: named(elements('store'), 'elements that hold something'),
      branches: named(elements('branch'), 'elements that join ports of stores'),
      instruments: named(instruments, 'driver, sensors, power stages'),
      without: { ...texts, description: 'control units that the bench does not stand in for: the real ones are there' },
      ...runningSchemas(),
    },
    additionalProperties: false,
    $defs: definitions,
  };
}

/** Writes the schema to a file, for `# yaml-language-server: $schema=...` at the head of a bench file. */
export function writeBenchSchema(catalogue: Catalogue, path: string): void {
  writeFileSync(path, `${JSON.stringify(benchSchema(catalogue), null, 2)}\n`);
}

function withKind(
  kind: { readonly kind: string; readonly about: string },
  properties: Record<string, Schema>,
  required: readonly string[],
): Schema {
  return mapping(
    { is: { const: kind.kind, description: kind.about }, about: text, ...properties },
    ['is', ...required],
    kind.about,
  );
}

function elementSchema(kind: ElementKind): Schema {
  const ports: Record<string, Schema> = {};
  if (kind.role === 'branch') {
    for (const [port, portKind] of Object.entries(kind.ports)) ports[port] = portSchema(port, portKind);
  }
  const needed =
    kind.role === 'branch' ? Object.keys(kind.ports).filter((port) => !kind.optionalPorts?.includes(port)) : [];
  return withKind(
    kind,
    {
      ...(kind.fluid ? { fluid: { ...text, description: 'name of a fluid' } } : {}),
      ...ports,
      ...parameterSchemas(kind.parameters),
      ...(Object.keys(kind.starts).length === 0
        ? {}
        : { start: mapping(parameterSchemas(kind.starts), [], 'the state at the start') }),
    },
    [...needed, ...requiredOf(kind.parameters)],
  );
}

function portSchema(port: string, portKind: string): Schema {
  const store: Schema = { type: 'string', pattern: '^[a-z][A-Za-z0-9]*(\\.[A-Za-z][A-Za-z0-9]*)?$' };
  return {
    description: `${port}: the store, or store.port, with a port of kind ${portKind}`,
    anyOf: [store, mapping({ to: store, ratio: quantitySchema({ unit: '1' }) }, ['to'])],
  };
}

function instrumentSchema(kind: InstrumentKind): Schema {
  const inputs: Record<string, Schema> = {};
  for (const [input, declaration] of Object.entries(kind.inputs)) {
    inputs[input] = {
      ...text,
      description: `signal, ${declaration.about}${declaration.anyUnit ? '' : `, ${declaration.unit}`}`,
    };
  }
  const outputs: Record<string, Schema> = {};
  for (const [output, declaration] of Object.entries(kind.outputs))
    outputs[output] = { ...text, description: `command that takes: ${declaration.about}` };
  return withKind(
    kind,
    { ...inputs, ...parameterSchemas(kind.parameters), drives: { anyOf: [text, mapping(outputs)] } },
    [...Object.keys(kind.inputs).filter((input) => !kind.inputs[input]!.optional), ...requiredOf(kind.parameters)],
  );
}

/** One schema per parameter, and one per short form for a range. */
function parameterSchemas(declared: Readonly<Record<string, ParameterDeclaration>>): Record<string, Schema> {
  const schemas: Record<string, Schema> = {};
  for (const [name, declaration] of Object.entries(declared)) schemas[name] = parameterSchema(declaration);
  for (const [key, [least]] of rangeKeys(declared)) {
    if (!Object.hasOwn(schemas, key))
      schemas[key] = { ...rangeSchema(declared[least]!), description: `both ends: ${declared[least]!.about}` };
  }
  return schemas;
}

function parameterSchema(declaration: ParameterDeclaration): Schema {
  const description = `${declaration.about}${boundsText(declaration)}`;
  if (declaration.choices) return { enum: [...declaration.choices], description };
  return { ...quantitySchema(declaration), description };
}

function boundsText(declaration: ParameterDeclaration): string {
  if (declaration.choices)
    return declaration.default === undefined ? '' : `; default ${declaration.choices[declaration.default]}`;
  if (declaration.unit === 'input') return ', in the unit of what it is tied to';
  const unit = tradeUnit(declaration.unit, declaration.difference);
  const say = (value: number) => formatQuantity(value, unit, 4);
  const parts: string[] = [];
  if (declaration.default !== undefined) parts.push(`default ${say(declaration.default)}`);
  if (declaration.least !== undefined) parts.push(`at least ${say(declaration.least)}`);
  if (declaration.most !== undefined) parts.push(`at most ${say(declaration.most)}`);
  if (declaration.usual) parts.push(`usually ${say(declaration.usual[0])} .. ${say(declaration.usual[1])}`);
  return parts.length === 0 ? '' : `; ${parts.join(', ')}`;
}

/** Parameters that stand in no short form and have no default: absent, they are an error wherever the file is read. */
function requiredOf(declared: Readonly<Record<string, ParameterDeclaration>>): string[] {
  const elsewhere = new Set<string>(['ambientTemperature', 'ambientPressure']);
  for (const ends of rangeKeys(declared).values()) for (const end of ends) elsewhere.add(end);
  const names = Object.keys(declared);
  return names.filter((name) => {
    if (declared[name]!.default !== undefined || elsewhere.has(name)) return false;
    if (declared[name]!.unit === 'K' && /[tT]emperature$/.test(name)) return false;
    return !names.some((other) => other !== name && name.startsWith(other));
  });
}
