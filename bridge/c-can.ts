import { protectionText } from './c-protection.js';
import { CanCodec, Field, piecesOf } from './can-codec.js';
import type { MapSignal, MessageSpec } from './message-map.js';

/** How texts of the map stand in C: the same for datagrams and frames. */
export interface CNames {
  member(name: string): string;
  number(value: number): string;
  comment(text: string): string;
  timing(message: MessageSpec): string;
  enumeration(message: MessageSpec, signal: MapSignal): string;
}

/**
 * One CAN message in C: identifier and form as macros, a struct of its values in the units of the map, `pack` and `unpack`
 * between it and a payload, and `protect` and `verify` where it has a counter or a checksum.
 */
export function canMessageText(message: MessageSpec, link: string, names: CNames): string {
  const { name } = message;
  const struct = `struct oilspring_${name}`;
  const length = message.bytes ?? 8;
  const head = `/* ${message.direction === 'sent' ? 'From' : 'To'} bench on ${link}: ${names.comment(message.about || name)}
 * ${names.comment(names.timing(message))} */
#define OILSPRING_${name}_IDENTIFIER 0x${message.identifier.toString(16).toUpperCase()}u
#define OILSPRING_${name}_EXTENDED ${message.extended ? 1 : 0}
#define OILSPRING_${name}_FLEXIBLE ${message.flexibleDataRate ? 1 : 0}
#define OILSPRING_${name}_BIT_RATE_SWITCH ${message.bitRateSwitch ? 1 : 0}
#define OILSPRING_${name}_LENGTH ${length}u
`;
  if (message.signals.some((signal) => signal.trouble !== undefined))
    return `${head}/* Its payload is a list of trouble codes after SAE J1939-73, of no fixed form: it is not written here. */
`;
  const order = new CanCodec(message).order;
  const members = message.signals.map(
    (signal) =>
      `    /* ${names.comment(signal.about || signal.name)}; ${names.comment(signal.unit)}, ${signal.least} .. ${signal.most} */
    double ${names.member(signal.name)};`,
  );
  const parts = [...order].map((i) => signalText(message, i, names));
  const doubles = [...order].map((i) => `    double raw${i};\n    int here${i};`).join('\n');
  return `${head}
${struct} {
${members.length > 0 ? members.join('\n') : '    char nothing_;'}
};
${message.signals.map((signal) => names.enumeration(message, signal)).join('')}
OILSPRING_ASSERT(OILSPRING_${name}_LENGTH <= ${message.j1939 ? 1785 : message.flexibleDataRate ? 64 : 8}u, "${name}");

/* Writes the payload. The number of values brought into their range; -1, and nothing written, when one is not finite.
 * A value that the selectors leave out is not looked at. */
static inline int oilspring_pack_${name}(uint8_t payload[OILSPRING_${name}_LENGTH], const ${struct} *message)
{
    int limited = 0;
    uint64_t bits;
    double value;
${doubles}
    memset(payload, 0, OILSPRING_${name}_LENGTH);
    (void)message;
    (void)bits;
    (void)value;
${parts.map((part) => part.check).join('')}${parts.map((part) => part.pack).join('')}    return limited;
}

/* Reads a payload. 0: all values in range; 1: some brought into it; -1: not to be used. A value that the selectors
 * leave out stays as it is. */
static inline int oilspring_unpack_${name}(${struct} *message, const uint8_t payload[OILSPRING_${name}_LENGTH])
{
    int verdict = 0;
    uint64_t bits;
    double value;
${doubles}
    (void)message;
    (void)payload;
    (void)bits;
    (void)value;
${parts.map((part) => part.unpack).join('')}    return verdict;
}
${protectionText(message).replaceAll('checksum_NAME', `checksum_${name}`)}`;
}

interface SignalText {
  readonly check: string;
  readonly pack: string;
  readonly unpack: string;
}

function signalText(message: MessageSpec, i: number, { member, number }: CNames): SignalText {
  const signal = message.signals[i];
  const field = new Field(signal, message);
  const layout = signal.can!;
  const pieces = piecesOf(layout);
  const place = `message->${member(signal.name)}`;
  const raw = `raw${i}`;
  const here = presence(field);
  const plain = layout.scale === 1 && layout.offset === 0;
  const wire = plain ? 'value' : `(value - ${number(layout.offset)}) / ${number(layout.scale)}`;
  const back = plain ? raw : `${raw} * ${number(layout.scale)} + ${number(layout.offset)}`;
  const limit = `        if (${raw} < ${number(field.rawLeast)})
            ${raw} = ${number(field.rawLeast)};
        else if (${raw} > ${number(field.rawMost)})
            ${raw} = ${number(field.rawMost)};
`;
  const whole = layout.length <= 32 || layout.float ? '' : '';
  const rounded = layout.float
    ? layout.length === 32
      ? `        ${raw} = (double)(float)${raw};\n`
      : ''
    : `        ${raw} = ${field.signed ? `(double)(int64_t)oilspring_raw(${raw})` : `(double)oilspring_raw(${raw})`};\n`;
  const toBits = layout.float
    ? layout.length === 32
      ? `        {
            float single = (float)${raw};
            uint32_t word;
            memcpy(&word, &single, sizeof word);
            bits = word;
        }
`
      : `        memcpy(&bits, &${raw}, sizeof bits);\n`
    : `        bits = oilspring_raw(${raw});\n`;
  const fromBits = layout.float
    ? layout.length === 32
      ? `        {
            float single;
            uint32_t word = (uint32_t)bits;
            memcpy(&single, &word, sizeof single);
            ${raw} = (double)single;
        }
`
      : `        memcpy(&${raw}, &bits, sizeof bits);\n`
    : layout.signed
      ? `${
          layout.length === 64
            ? ''
            : `        if ((bits >> ${layout.length - 1} & 1u) != 0u)
            bits |= ~(uint64_t)0 << ${layout.length};
`
        }        ${raw} = (double)(int64_t)bits;\n`
      : `        ${raw} = (double)bits;\n`;
  const range = message.outOfRange === 'refuse' ? '            return -1;\n' : '            verdict = 1;\n';
  return {
    check: `    here${i} = ${here};
    ${raw} = 0.0;
    if (here${i}) {
        int brought;
        value = ${place};
        brought = oilspring_limit(&value, ${number(field.least)}, ${number(field.most)});
        if (brought < 0)
            return -1;
        limited += brought;
        ${raw} = ${wire};
${limit}${rounded}    }
`,
    pack: `    if (here${i}) {
${whole}${toBits}${pieces
  .map(
    (piece) =>
      `        payload[${piece.byte}] = (uint8_t)(payload[${piece.byte}] | (bits >> ${piece.place} & ${(1 << piece.count) - 1}u) << ${piece.shift});\n`,
  )
  .join('')}    }
`,
    unpack: `    here${i} = ${here};
    ${raw} = 0.0;
    if (here${i}) {
        bits = 0u;
${pieces
  .map(
    (piece) =>
      `        bits |= (uint64_t)(payload[${piece.byte}] >> ${piece.shift} & ${(1 << piece.count) - 1}u) << ${piece.place};\n`,
  )
  .join('')}${fromBits}        value = ${back};
        if (!(value - value == 0.0))
            return -1;
        if (value < ${number(field.wireLeast)} || value > ${number(field.wireMost)})
${range}        oilspring_limit(&value, ${number(field.least)}, ${number(field.most)});
        ${place} = value;
    }
`,
  };
}

function presence({ selector, selectorValues }: Field): string {
  if (selector < 0) return '1';
  const ranges: string[] = [];
  for (let i = 0; i < selectorValues.length; i += 2)
    ranges.push(`(raw${selector} >= ${selectorValues[i]}.0 && raw${selector} <= ${selectorValues[i + 1]}.0)`);
  return `here${selector} && (${ranges.join(' || ') || '0'})`;
}
