import { nameLimits } from '../bridge/j1939/name.js';
import { severities } from '../runtime/judge/formula.js';
import { flag, mapping, named, quantitySchema, type Schema, text, texts } from './schema-parts.js';

/** Schemas of the parts of a bench file that no kind declares: links, messages, watch, life and the like. */
export function runningSchemas(): Record<string, Schema> {
  const time = quantitySchema({ unit: 's' });
  const share = quantitySchema({ unit: '1' });
  const whole = (minimum: number): Schema => ({ type: 'integer', minimum });
  const value: Schema = { type: ['string', 'number'] };
  const units = named(
    mapping({ address: whole(0), ...Object.fromEntries(Object.keys(nameLimits).map((part) => [part, whole(0)])) }, [
      'address',
    ]),
    'control units whose addresses the bench claims (SAE J1939-81), with the parts of their NAME',
  );
  const procedure: Schema = {
    type: 'array',
    items: mapping({ at: time, set: text, to: { type: ['string', 'number', 'boolean'] } }, ['at', 'set', 'to']),
  };
  return {
    ambient: mapping(
      { temperature: quantitySchema({ unit: 'K' }), pressure: quantitySchema({ unit: 'Pa' }) },
      [],
      'surroundings',
    ),
    budgets: mapping(
      {
        lateness: time,
        worstLateness: time,
        overruns: share,
        drift: time,
        lostFrames: share,
        energyResidual: share,
        oilResidual: share,
      },
      [],
      'past these a run is not valid',
    ),
    links: named(
      {
        oneOf: [
          mapping({ is: { const: 'udp' }, about: text, local: text, remote: text }, ['is', 'local', 'remote']),
          mapping({ is: { const: 'can' }, about: text, interface: text, bitRate: text, dataBitRate: text, units }, [
            'is',
            'interface',
          ]),
          mapping(
            {
              is: { const: 'can-multicast' },
              about: text,
              group: text,
              by: text,
              bitRate: text,
              dataBitRate: text,
              units,
            },
            ['is'],
          ),
        ],
      },
      'links to controllers',
    ),
    messages: named(messageSchema(time, whole, value), 'messages by name'),
    watch: {
      type: 'object',
      description: 'what to watch beside the limits of the elements, by signal',
      additionalProperties: mapping({
        above: value,
        below: value,
        level: text,
        meaning: text,
        vicinity: share,
        lookAhead: time,
        relief: text,
      }),
    },
    life: mapping(
      {
        supply: flag,
        key: flag,
        preRoll: time,
        bootWindow: time,
        afterRun: time,
        hands: { enum: ['allowed', 'not allowed'], description: 'allowed: hands in a run do not spoil it' },
        frames: mapping({ preRoll: frames, afterRun: frames }, [], 'what the controller sees'),
        reset: mapping(
          { before: procedure, after: procedure },
          [],
          'what the bench does between runs: from the beginning of the pre-roll, and of the after-run',
        ),
      },
      [],
      'the life of the bench',
    ),
    requirements: requirementsSchema(),
    duty: { ...text, description: 'scenario that check drives' },
    controller: mapping({ module: text, command: text, period: time, patience: time }, [], 'the controller to start'),
    record: mapping({ signals: texts, peaks: texts }, [], 'what is recorded'),
  };
}

/** The section `requirements` of bench and scenario files. */
export function requirementsSchema(): Schema {
  return {
    type: 'object',
    description: 'what runs are judged by, by id',
    propertyNames: { pattern: '^[A-Za-z0-9][A-Za-z0-9 ._-]{0,60}$' },
    additionalProperties: {
      anyOf: [
        text,
        mapping(
          {
            holds: { ...text, description: 'such as: always highLine.pressure < 345 bar(g)' },
            text: { ...text, description: 'for people' },
            severity: { enum: [...severities] },
            source: text,
            link: text,
            openAtEnd: { enum: ['undecided', 'pass', 'fail'] },
            exercise: {
              enum: ['required', 'optional'],
              description: 'optional: a run may pass in which its trigger never came',
            },
          },
          ['holds'],
        ),
      ],
    },
  };
}

const frames: Schema = { enum: ['plant', 'silence'] };

function messageSchema(time: Schema, whole: (minimum: number) => Schema, value: Schema): Schema {
  const number: Schema = { type: 'number' };
  const can = mapping(
    {
      start: whole(0),
      length: whole(1),
      order: { enum: ['little', 'big'] },
      signed: flag,
      float: flag,
      scale: number,
      offset: number,
      selector: flag,
      when: { type: 'object', additionalProperties: { anyOf: [value, { type: 'array', items: value }] } },
    },
    ['start', 'length'],
    'layout on CAN',
  );
  const signal = mapping({
    from: { ...value, description: 'sent: the signal that it carries, or a number or an expression with units' },
    to: { ...text, description: 'received: the command that it drives' },
    about: text,
    unit: { ...text, description: 'unit on the wire, such as bar(a), N m, %' },
    range: { ...text, description: 'range in that unit, such as 0 .. 400' },
    type: { enum: ['u8', 'i8', 'u16', 'i16', 'u32', 'i32', 'f32', 'f64'] },
    scale: number,
    offset: number,
    substitute: { ...value, description: 'received: what counts after a time-out' },
    names: { type: 'object', additionalProperties: number },
    can,
    trouble: mapping({ spn: whole(1), fmi: whole(0) }, ['spn', 'fmi'], 'trouble code of SAE J1939-73, in place of can'),
    lamp: { enum: ['malfunction', 'stop', 'warning', 'protect'], description: 'lamp of SAE J1939-73, in place of can' },
  });
  return mapping(
    {
      about: text,
      link: text,
      direction: { enum: ['sent', 'received'], description: 'seen from the bench' },
      standsFor: { ...text, description: 'sent: the control unit for which the bench stands in' },
      while: { ...text, description: 'sent: it goes only while this holds, such as: life.key is on' },
      id: { anyOf: [whole(0), text] },
      every: time,
      phase: time,
      startDelay: time,
      fastEvery: time,
      timeout: time,
      trigger: { enum: ['cyclic', 'on-change', 'cyclic-and-change', 'on-request'] },
      outOfRange: { enum: ['saturate', 'refuse'] },
      extended: flag,
      j1939: mapping(
        { pgn: whole(0), source: whole(0), priority: whole(0), destination: whole(0) },
        ['pgn', 'source'],
        'parameter group of SAE J1939, in place of id',
      ),
      flexibleDataRate: flag,
      bitRateSwitch: flag,
      bytes: whole(0),
      protection: { type: 'object', required: ['is'] },
      signals: named(signal, 'signals by name'),
    },
    ['direction', 'signals'],
  );
}
