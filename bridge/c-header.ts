import { type CNames, canMessageText } from './c-can.js';
import { canHelpers } from './c-can-text.js';
import { checksumText, checkText, numbersText } from './c-header-text.js';
import { requireSoundMap } from './examine-map.js';
import type { MapSignal, MessageMap, MessageSpec } from './message-map.js';
import { goesByChange, goesByCycle } from './schedule.js';
import { controlLength, header, kinds, magic, mapChecksum, type UdpLayout, udpLayout, version } from './udp-layout.js';

/**
 * The C header of the messages of a map, for the controller's side: C11 or C++11, freestanding but for string.h.
 * Structs that are the datagrams byte for byte, static asserts on their layout, numbers of the messages, values of
 * enumerations, checksum, and per message `finish` (header, padding, checksum) and per signal `get` and `set` in its
 * unit. Names of messages and signals are used as they are.
 */
export function cHeader(map: MessageMap, bench: string): string {
  requireSoundMap(map);
  const udp = new Set(map.links.filter((link) => link.kind === 'udp').map((link) => link.name));
  const layouts = map.messages.filter((message) => udp.has(message.link)).map(udpLayout);
  const frames = map.messages.filter((message) => !udp.has(message.link));
  const names: CNames = { member, number, comment, timing, enumeration: enumerationText };
  const parts = [
    opening(map, bench, layouts.length > 0),
    ...(layouts.length > 0 ? [messageNumbers(layouts), helpers(layouts)] : []),
    numbersText,
    ...layouts.map(messageText),
    ...(frames.length > 0 ? [canHelpers] : []),
    ...frames.map((message) => canMessageText(message, message.link, names)),
    closing,
  ];
  return parts.join('\n');
}

function opening(map: MessageMap, bench: string, datagrams: boolean): string {
  return `/*
 * Messages of the bench "${comment(bench)}": datagrams of oilspring's UDP links, payloads of CAN frames.
 * Made by \`oilspring wire\` from the message map; make it again when the map changes, do not edit it.
 *
 * "to bench" and "from bench" are said from the controller's side. All numbers in datagrams are little-endian.
 * oilspring is not a safety device: a bench has its own relief valves, interlocks and emergency stop.
 */
#ifndef OILSPRING_MESSAGES_H
#define OILSPRING_MESSAGES_H

#include <stddef.h>
#include <stdint.h>
#include <string.h>

${
  datagrams
    ? `#if defined(__BYTE_ORDER__) && __BYTE_ORDER__ != __ORDER_LITTLE_ENDIAN__
#error "these structs are the datagrams themselves: they need a little-endian processor"
#endif

`
    : ''
}#ifdef __cplusplus
#define OILSPRING_ASSERT(condition, text) static_assert(condition, text)
#else
#define OILSPRING_ASSERT(condition, text) _Static_assert(condition, text)
#endif

OILSPRING_ASSERT(sizeof(float) == 4 && sizeof(double) == 8, "IEEE 754 numbers of 4 and 8 bytes");

${datagrams ? datagramConstants(map) : ''}`;
}

function datagramConstants(map: MessageMap): string {
  return `#define OILSPRING_MAGIC ${hex(magic)} /* "OILS" */
#define OILSPRING_VERSION ${version}u
/* Checksum of the message map: both ends must have been built from the same. */
#define OILSPRING_MAP_CHECKSUM ${hex(mapChecksum(map))}

enum oilspring_kind {
    OILSPRING_KIND_MESSAGE = ${kinds.message}, /* a message of the map */
    OILSPRING_KIND_END = ${kinds.end},     /* from bench, lockstep: all messages of the tick in the header have been sent */
    OILSPRING_KIND_DONE = ${kinds.done},    /* to bench, lockstep: all answers to that tick have been sent */
    OILSPRING_KIND_HELLO = ${kinds.hello}    /* the sender has just started */
};
`;
}

function messageNumbers(layouts: readonly UdpLayout[]): string {
  const lines = layouts.map(({ message }) => `    OILSPRING_MESSAGE_${message.name} = ${message.identifier}`);
  return `enum oilspring_message {
${lines.length > 0 ? lines.join(',\n') : '    OILSPRING_MESSAGE_none = 0'}
};
`;
}

function helpers(layouts: readonly UdpLayout[]): string {
  const greatest = Math.max(controlLength, ...layouts.map((layout) => layout.length));
  const lengths = layouts.map(
    ({ message, length }) => `    case OILSPRING_MESSAGE_${message.name}:\n        return ${length}u;`,
  );
  return `/* The longest datagram, bytes: room for one more tells a longer one. */
#define OILSPRING_GREATEST_LENGTH ${greatest}u

#pragma pack(push, 1)
struct oilspring_header {
    uint32_t magic;
    uint8_t version;
    uint8_t kind;
    uint16_t message;
    /* Counts up by one with each datagram of this message, or of this kind, modulo 2^32. */
    uint32_t sequence;
    /* Of the bench, modulo 2^32. To bench: the newest one seen. */
    uint32_t tick;
    uint32_t map;
};
/* A datagram without fields: end, done, hello. */
struct oilspring_control {
    struct oilspring_header header;
    uint32_t checksum;
};
#pragma pack(pop)

OILSPRING_ASSERT(sizeof(struct oilspring_header) == ${header.length}, "header");
OILSPRING_ASSERT(offsetof(struct oilspring_header, message) == ${header.message}, "header.message");
OILSPRING_ASSERT(offsetof(struct oilspring_header, sequence) == ${header.sequence}, "header.sequence");
OILSPRING_ASSERT(offsetof(struct oilspring_header, tick) == ${header.tick}, "header.tick");
OILSPRING_ASSERT(offsetof(struct oilspring_header, map) == ${header.map}, "header.map");
OILSPRING_ASSERT(sizeof(struct oilspring_control) == ${controlLength}, "control");

${checksumText}
/* Length of a message by its number, bytes; 0 when there is no such message. */
static inline size_t oilspring_length(unsigned message)
{
    switch (message) {
${lengths.join('\n')}
    default:
        return 0u;
    }
}

${checkText}`;
}

const cTypes = {
  u8: 'uint8_t',
  i8: 'int8_t',
  u16: 'uint16_t',
  i16: 'int16_t',
  u32: 'uint32_t',
  i32: 'int32_t',
  f32: 'float',
  f64: 'double',
} as const;

function messageText(layout: UdpLayout): string {
  const { message } = layout;
  const struct = `struct oilspring_${message.name}`;
  const members: [number, string][] = layout.fields.map(({ signal, offset }) => [offset, fieldText(signal)]);
  layout.padding.forEach(([offset, count], i) => {
    members.push([offset, `    uint8_t padding${i}_[${count}];`]);
  });
  members.sort((a, b) => a[0] - b[0]);
  const asserts = layout.fields.map(
    ({ signal, offset }) =>
      `OILSPRING_ASSERT(offsetof(${struct}, ${member(signal.name)}) == ${offset}, "${message.name}.${signal.name}");`,
  );
  const clear = layout.padding
    .map((_, i) => `    memset(message->padding${i}_, 0, sizeof message->padding${i}_);\n`)
    .join('');
  return `/* ${message.direction === 'sent' ? 'From' : 'To'} bench: ${comment(message.about || message.name)}
 * ${comment(timing(message))} */
#pragma pack(push, 1)
${struct} {
    struct oilspring_header header;
${members.map(([, text]) => text).join('\n')}
    uint32_t checksum;
};
#pragma pack(pop)

OILSPRING_ASSERT(sizeof(${struct}) == ${layout.length}, "${message.name}");
OILSPRING_ASSERT(offsetof(${struct}, checksum) == ${layout.checksumAt}, "${message.name}.checksum");
${asserts.join('\n')}

/* Fills in header, padding and checksum once the fields are set; the length of the datagram, bytes. */
static inline size_t oilspring_finish_${message.name}(${struct} *message, uint32_t sequence, uint32_t tick)
{
    message->header = oilspring_make_header(OILSPRING_KIND_MESSAGE, ${message.identifier}u, sequence, tick);
${clear}    message->checksum = oilspring_crc32(message, sizeof *message - 4);
    return sizeof *message;
}
${message.signals.map((signal) => signalText(message, signal)).join('')}`;
}

function timing(message: MessageSpec): string {
  const parts: string[] = [];
  if (goesByCycle(message)) parts.push(`every ${message.every} ticks, in ticks with remainder ${message.phase}`);
  if (goesByChange(message)) parts.push(`when a value moves, at most every ${message.fastEvery ?? 1} ticks`);
  if (message.trigger === 'on-request') parts.push('when it is asked for');
  if (message.startDelay > 0) parts.push(`from tick ${message.startDelay} of the bench's life on`);
  if (message.direction === 'received') {
    parts.push(message.timeout > 0 ? `time-out after ${message.timeout} ticks` : 'no time-out');
    parts.push(
      `a value out of range is ${message.outOfRange === 'refuse' ? 'refused with its message' : 'brought into range'}`,
    );
  }
  return `${parts.join('; ')}.`;
}

function fieldText(signal: MapSignal): string {
  const scaled =
    signal.scale === 1 && signal.offset === 0
      ? ''
      : ` = field * ${signal.scale}${signal.offset === 0 ? '' : ` + ${signal.offset}`}`;
  const range = `${signal.least} .. ${signal.most}`;
  return `    /* ${comment(signal.about || signal.name)}; ${comment(signal.unit)}${scaled}, ${range} */
    ${cTypes[signal.type]} ${member(signal.name)};`;
}

function signalText(message: MessageSpec, signal: MapSignal): string {
  const struct = `struct oilspring_${message.name}`;
  const name = `${message.name}_${signal.name}`;
  const field = `message->${member(signal.name)}`;
  const plain = signal.scale === 1 && signal.offset === 0;
  const type = cTypes[signal.type];
  const wire = plain ? 'value' : `(value - ${number(signal.offset)}) / ${number(signal.scale)}`;
  const stored =
    signal.type[0] === 'f'
      ? plain && type === 'double'
        ? wire
        : `(${type})(${wire})`
      : `(${type})oilspring_round(${wire})`;
  const value = plain ? `(double)${field}` : `(double)${field} * ${number(signal.scale)} + ${number(signal.offset)}`;
  return `${enumerationText(message, signal)}
/* In ${comment(signal.unit)}. */
static inline double oilspring_get_${name}(const ${struct} *message)
{
    return ${value};
}

/* In ${comment(signal.unit)}. 0: set; 1: brought into range and set; -1: not finite, not set. */
static inline int oilspring_set_${name}(${struct} *message, double value)
{
    int verdict = oilspring_limit(&value, ${number(signal.least)}, ${number(signal.most)});
    if (verdict >= 0)
        ${field} = ${stored};
    return verdict;
}
`;
}

/** Names of the values of a signal, where it has any. */
function enumerationText(message: MessageSpec, signal: MapSignal): string {
  const name = `${message.name}_${signal.name}`;
  const names = Object.entries(signal.names ?? {}).filter(
    ([, one]) => Number.isSafeInteger(one) && Math.abs(one) < 2 ** 31,
  );
  if (names.length === 0) return '';
  return `
enum oilspring_${name} {
${names.map(([text, one]) => `    OILSPRING_${name}_${text.replace(/[^A-Za-z0-9_]/g, '_')} = ${one}`).join(',\n')}
};
`;
}

const closing = `#endif
`;

/** Words that C11 or C++20 keep for themselves, among those that a signal could be called; and the struct's own. */
const keywords = new Set(
  (
    'alignas alignof and asm auto bitand bitor bool break case catch char class compl concept const consteval constexpr ' +
    'constinit continue decltype default delete do double else enum explicit export extern false float for friend goto if ' +
    'inline int long mutable namespace new noexcept not nullptr operator or private protected public register reinterpret ' +
    'requires restrict return short signed sizeof static struct switch template this throw true try typedef typeid ' +
    'typename union unsigned using virtual void volatile while xor header checksum errno linux unix'
  ).split(' '),
);

function member(name: string): string {
  return keywords.has(name) ? `${name}_` : name;
}

/** A number as a double literal. */
function number(value: number): string {
  const text = `${value}`;
  return /[.e]/.test(text) ? text : `${text}.0`;
}

function hex(value: number): string {
  return `0x${(value >>> 0).toString(16).toUpperCase().padStart(8, '0')}u`;
}

/** Text that may stand inside a C comment. */
function comment(text: string): string {
  return text
    .replace(/\s+/g, ' ')
    .replace(/\*\//g, '* /')
    .replace(/\/\*/g, '/ *')
    .replace(/\\$/, '\\ ')
    .replace(/\?\?/g, '? ?')
    .trim();
}
