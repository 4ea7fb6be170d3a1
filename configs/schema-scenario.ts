import { mapping, quantitySchema, type Schema, text } from './schema-parts.js';
import { requirementsSchema } from './schema-running.js';

/** JSON schema (draft 2020-12) of scenario files for editors; what needs the bench is left to reading. */
export function scenarioSchema(): Schema {
  const parameter: Schema = { type: 'string', pattern: '\\$' };
  const or = (schema: Schema): Schema => ({ anyOf: [schema, parameter] });
  const time = or(quantitySchema({ unit: 's' }));
  const value: Schema = { type: ['string', 'number', 'boolean'] };
  const points: Schema = {
    type: 'array',
    minItems: 1,
    items: { type: 'array', minItems: 2, maxItems: 2, items: value },
  };
  const file = { file: text, time: text, column: text };
  const trace: Schema = {
    anyOf: [
      points,
      mapping({
        of: text,
        points,
        ...file,
        between: { enum: ['linear', 'hold'] },
        over: { enum: ['time', 'distance'] },
      }),
    ],
  };
  const names: Schema = {
    type: 'object',
    propertyNames: { pattern: '^[A-Za-z][A-Za-z0-9]*$' },
    additionalProperties: value,
  };
  const step: Schema = mapping(
    {
      at: { ...time, description: 'at this time' },
      wait: { ...time, description: 'so long after the step before' },
      when: { ...text, description: 'when this condition becomes true: body.velocity > 40 km/h' },
      atDistance: { ...text, description: 'after this way' },
      for: { ...time, description: 'how long the condition has to hold' },
      within: { ...time, description: 'given up after this time' },
      set: text,
      ramp: text,
      hold: text,
      release: text,
      fault: text,
      clear: text,
      to: value,
      over: time,
      note: text,
      repeat: { anyOf: [{ type: 'integer', minimum: 1, maximum: 1000 }, parameter] },
      steps: { type: 'array', items: { $ref: '#/$defs/step' } },
    },
    [],
    'one step of the timeline',
  );
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    title: 'oilspring scenario file',
    type: 'object',
    properties: {
      scenario: { ...text, description: 'name of the scenario' },
      about: text,
      include: { anyOf: [text, { type: 'array', items: text }] },
      lasts: time,
      preview: time,
      parameters: { ...names, description: 'names that stand for values, written $name' },
      cases: {
        type: 'object',
        additionalProperties: names,
        description: 'other values of the parameters, each a run of its own',
      },
      start: {
        type: 'object',
        description: 'state at the start, over that of the bench: speed, gear, temperature, or start values by element',
        properties: {
          speed: or(quantitySchema({ unit: 'm/s' })),
          temperature: or(quantitySchema({ unit: 'K' })),
          gear: value,
        },
        additionalProperties: { type: 'object', additionalProperties: value },
      },
      drive: { anyOf: [text, points, mapping(file, ['file'])], description: 'speed that the driver follows' },
      grade: trace,
      traces: { type: 'object', additionalProperties: trace },
      steps: { type: 'array', items: { $ref: '#/$defs/step' } },
      waive: {
        type: 'object',
        additionalProperties: text,
        description: 'requirements of the bench that are not asked of this run, and why',
      },
      requirements: requirementsSchema(),
    },
    required: ['scenario'],
    additionalProperties: false,
    $defs: { step },
  };
}
