import type { MessageSpec } from './message-map.js';
import { type Crc, crcs } from './protection/crc.js';
import { ListProfile, LongProfile, NibbleProfile, ShortProfile } from './protection/end-to-end.js';
import { makeProtector } from './protection/make.js';
import type { PlainProtector } from './protection/plain.js';

/** `protect` and `verify` of a protected message in C; nothing for others. */
export function protectionText(message: MessageSpec): string {
  const protector = makeProtector(message);
  if (protector === undefined) return '';
  const { name } = message;
  const length = message.bytes ?? 8;
  const bodies =
    protector instanceof NibbleProfile
      ? nibble(protector, length)
      : protector instanceof ListProfile
        ? list(protector, length)
        : protector instanceof LongProfile
          ? long(protector, length)
          : protector instanceof ShortProfile
            ? short(protector, length)
            : plain(protector as PlainProtector);
  return `
#define OILSPRING_${name}_COUNTER_MODULO ${protector.modulo}u

static inline uint32_t oilspring_checksum_${name}(const uint8_t *payload, unsigned counter)
{
${lines(bodies.checksum)}
}

/* Writes counter and checksum (${message.protection!.kind}) into a payload that oilspring_pack_${name} made. */
static inline void oilspring_protect_${name}(uint8_t *payload, unsigned counter)
{
${lines(bodies.protect)}
}

/* The counter of a payload whose checksum is right (0 without a counter), or -1. */
static inline int32_t oilspring_verify_${name}(const uint8_t *payload)
{
${lines(bodies.verify)}
}
`;
}

interface Bodies {
  readonly checksum: readonly string[];
  readonly protect: readonly string[];
  readonly verify: readonly string[];
}

const lines = (all: readonly string[]): string => all.map((line) => `    ${line}`).join('\n');
const hex = (value: number): string => `0x${(value >>> 0).toString(16).toUpperCase()}u`;

/** One step of a check. */
function step(crc: Crc, byte: string): string {
  return crc.reflected
    ? `value = oilspring_crc_right(${hex(crc.polynomial)}, value, ${byte});`
    : `value = oilspring_crc_left(${crc.width}u, ${hex(crc.polynomial)}, value, ${byte});`;
}

/** Payload bytes from .. to. */
function run(crc: Crc, from: number, to: number): string[] {
  return from < to ? [`for (i = ${from}u; i < ${to}u; i += 1u)`, `    ${step(crc, 'payload[i]')}`] : [];
}

const finish = (crc: Crc): string =>
  `return value ^ ${hex(crc.width === 32 ? crc.final : crc.final & ((1 << crc.width) - 1))};`;
const start = (crc: Crc): string[] => [`uint32_t value = ${hex(crc.initial)};`, 'unsigned i;'];

function nibble({ dataId, mode, offset, crc }: NibbleProfile, length: number): Bodies {
  const low = `${dataId & 255}u`;
  const high = `${(dataId >>> 8) & 255}u`;
  const first =
    mode === 'both'
      ? [step(crc, low), step(crc, high)]
      : mode === 'nibble'
        ? [step(crc, low), step(crc, '0u')]
        : mode === 'low'
          ? [step(crc, low)]
          : [step(crc, `counter % 2u == 0u ? ${low} : ${high}`)];
  const id = ((dataId >>> 8) & 15) << 4;
  return {
    checksum: [
      ...start(crc),
      ...(mode === 'alternating' ? [] : ['(void)counter;']),
      ...first,
      ...run(crc, 0, offset),
      ...run(crc, offset + 1, length),
      finish(crc),
    ],
    protect: [
      `payload[${offset + 1}] = (uint8_t)(${mode === 'nibble' ? `${id}u` : `(payload[${offset + 1}] & 0xF0u)`} | (counter & 15u));`,
      `payload[${offset}] = (uint8_t)oilspring_checksum_NAME(payload, counter);`,
    ],
    verify: [
      `unsigned counter = payload[${offset + 1}] & 15u;`,
      `if (counter >= 15u || payload[${offset}] != oilspring_checksum_NAME(payload, counter))`,
      '    return -1;',
      ...(mode === 'nibble' ? [`if ((payload[${offset + 1}] & 0xF0u) != ${id}u)`, '    return -1;'] : []),
      'return (int32_t)counter;',
    ],
  };
}

function list({ dataIds, offset }: ListProfile, length: number): Bodies {
  const crc = crcs['crc8-h2f'];
  return {
    checksum: [
      `static const uint8_t identifiers[16] = { ${[...dataIds].map((one) => `${one}u`).join(', ')} };`,
      ...start(crc),
      ...run(crc, 0, offset),
      ...run(crc, offset + 1, length),
      step(crc, 'identifiers[counter & 15u]'),
      finish(crc),
    ],
    protect: [
      `payload[${offset + 1}] = (uint8_t)((payload[${offset + 1}] & 0xF0u) | (counter & 15u));`,
      `payload[${offset}] = (uint8_t)oilspring_checksum_NAME(payload, counter);`,
    ],
    verify: [
      `unsigned counter = payload[${offset + 1}] & 15u;`,
      `return payload[${offset}] == oilspring_checksum_NAME(payload, counter) ? (int32_t)counter : -1;`,
    ],
  };
}

function long({ dataId, offset }: LongProfile, length: number): Bodies {
  const crc = crcs['crc32-p4'];
  const bytes = [length >>> 8, length & 255];
  const id = [24, 16, 8, 0].map((shift) => (dataId >>> shift) & 255);
  const check = [24, 16, 8, 0];
  return {
    checksum: [
      ...start(crc),
      '(void)counter;',
      ...run(crc, 0, offset + 8),
      ...run(crc, offset + 12, length),
      finish(crc),
    ],
    protect: [
      'uint32_t check;',
      ...bytes.map((byte, i) => `payload[${offset + i}] = ${byte}u;`),
      `payload[${offset + 2}] = (uint8_t)(counter >> 8);`,
      `payload[${offset + 3}] = (uint8_t)counter;`,
      ...id.map((byte, i) => `payload[${offset + 4 + i}] = ${byte}u;`),
      'check = oilspring_checksum_NAME(payload, counter);',
      ...check.map((shift, i) => `payload[${offset + 8 + i}] = (uint8_t)(check >> ${shift});`),
    ],
    verify: [
      'uint32_t check = oilspring_checksum_NAME(payload, 0u);',
      `if (${[
        ...bytes.map((byte, i) => `payload[${offset + i}] != ${byte}u`),
        ...id.map((byte, i) => `payload[${offset + 4 + i}] != ${byte}u`),
        ...check.map((shift, i) => `payload[${offset + 8 + i}] != (uint8_t)(check >> ${shift})`),
      ].join(' || ')})`,
      '    return -1;',
      `return (int32_t)((unsigned)payload[${offset + 2}] << 8 | payload[${offset + 3}]);`,
    ],
  };
}

function short({ dataId, offset }: ShortProfile, length: number): Bodies {
  const crc = crcs['crc16-ccitt'];
  return {
    checksum: [
      ...start(crc),
      '(void)counter;',
      ...run(crc, 0, offset),
      ...run(crc, offset + 2, length),
      step(crc, `${dataId & 255}u`),
      step(crc, `${(dataId >>> 8) & 255}u`),
      finish(crc),
    ],
    protect: [
      'uint32_t check;',
      `payload[${offset + 2}] = (uint8_t)counter;`,
      'check = oilspring_checksum_NAME(payload, counter);',
      `payload[${offset}] = (uint8_t)check;`,
      `payload[${offset + 1}] = (uint8_t)(check >> 8);`,
    ],
    verify: [
      'uint32_t check = oilspring_checksum_NAME(payload, 0u);',
      `if (payload[${offset}] != (uint8_t)check || payload[${offset + 1}] != (uint8_t)(check >> 8))`,
      '    return -1;',
      `return (int32_t)payload[${offset + 2}];`,
    ],
  };
}

function plain({ counter, place }: PlainProtector): Bodies {
  const bytes = place === undefined ? 0 : place.crc.width >> 3;
  const shifts = Array.from({ length: bytes }, (_, i) => 8 * (place!.order === 'little' ? i : bytes - 1 - i));
  const bits = counter === undefined ? [] : Array.from({ length: counter.length }, (_, i) => counter.start + i);
  return {
    checksum:
      place === undefined
        ? ['(void)payload;', '(void)counter;', 'return 0u;']
        : [
            ...start(place.crc),
            '(void)counter;',
            ...[...place.prefix].map((byte) => step(place.crc, `${byte}u`)),
            ...run(place.crc, place.from, place.at < place.to ? Math.max(place.from, place.at) : place.to),
            ...run(place.crc, Math.max(place.from, place.at + bytes), place.to),
            ...[...place.suffix].map((byte) => step(place.crc, `${byte}u`)),
            finish(place.crc),
          ],
    protect: [
      ...(place === undefined ? [] : ['uint32_t check;']),
      ...(bits.length === 0 ? ['(void)counter;'] : []),
      ...bits.map(
        (bit, i) =>
          `payload[${bit >> 3}] = (uint8_t)((payload[${bit >> 3}] & ${255 & ~(1 << (bit & 7))}u) | (counter >> ${i} & 1u) << ${bit & 7});`,
      ),
      ...(place === undefined
        ? []
        : [
            'check = oilspring_checksum_NAME(payload, counter);',
            ...shifts.map((shift, i) => `payload[${place.at + i}] = (uint8_t)(check >> ${shift});`),
          ]),
    ],
    verify: [
      'unsigned counter = 0u;',
      ...(place === undefined ? [] : ['uint32_t check = oilspring_checksum_NAME(payload, 0u);']),
      ...shifts.flatMap((shift, i) => [
        `if (payload[${place!.at + i}] != (uint8_t)(check >> ${shift}))`,
        '    return -1;',
      ]),
      ...bits.map((bit, i) => `counter |= ((unsigned)payload[${bit >> 3}] >> ${bit & 7} & 1u) << ${i};`),
      ...(counter === undefined ? [] : [`if (counter >= ${counter.modulo}u)`, '    return -1;']),
      'return (int32_t)counter;',
    ],
  };
}
