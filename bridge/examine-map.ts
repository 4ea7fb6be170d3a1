import { BuildError, type Problem } from '../runtime/contract.js';
import { bitsOf } from './can-bits.js';
import { flexibleLengths, identifierMasks } from './can-frame.js';
import { longestMessage } from './j1939/transport.js';
import { reservedNames } from './link-counts.js';
import type { MapSignal, MessageMap, MessageSpec } from './message-map.js';
import { readProtection } from './protection/make.js';
import { goesByCycle } from './schedule.js';
import { greatestLength, limits, udpLayout, wireNumber } from './udp-layout.js';

const identifier = /^[A-Za-z][A-Za-z0-9]*$/;

/** Everything that is wrong with a map on its own, without a bench. Empty when it can be compiled. */
export function examineMap(map: MessageMap): Problem[] {
  const problems: Problem[] = [];
  const links = new Set<string>();
  for (const link of map.links) {
    if (links.has(link.name))
      problems.push({ path: `links.${link.name}`, what: 'the link is there twice', remedy: 'give each its own name' });
    links.add(link.name);
  }
  const names = new Set<string>();
  const numbers = new Map<string, string>();
  for (const message of map.messages) {
    const path = `messages.${message.name}`;
    const add = (what: string, value: string, bound: string, remedy: string): void => {
      problems.push({ path, what, value, bound, remedy });
    };
    if (!identifier.test(message.name))
      add('the name cannot be used in C', message.name, 'letters and digits, a letter first', 'rename it');
    if (names.has(message.name) || links.has(message.name))
      add('the name is taken', message.name, 'one message or link per name', 'rename it');
    names.add(message.name);
    const link = map.links.find((one) => one.name === message.link);
    if (!link) add('unknown link', message.link, `known: ${[...links].join(', ') || 'none'}`, 'declare it under links');
    const number = `${message.link} ${message.identifier}${message.extended ? ' extended' : ''}`;
    const other = numbers.get(number);
    if (other !== undefined)
      add(
        'the number is taken on this link',
        `${message.identifier}`,
        `by ${other}`,
        'number the messages of a link apart',
      );
    numbers.set(number, message.name);
    examineTiming(message, add);
    if (link?.kind === 'udp') {
      if (!(Number.isInteger(message.identifier) && message.identifier >= 1 && message.identifier <= 0xffff))
        add('the number does not fit a datagram', `${message.identifier}`, '1 to 65535', 'choose another number');
      const { length } = udpLayout(message);
      if (length > greatestLength)
        add('the datagram is too long', `${length} bytes`, `at most ${greatestLength} bytes`, 'split the message');
    }
    if (link && link.kind !== 'udp') examineFrame(message, add);
    examineSignals(message, path, problems);
  }
  return problems;
}

/** Throws a BuildError with all problems of the map, if there are any. */
export function requireSoundMap(map: MessageMap): void {
  const problems = examineMap(map);
  if (problems.length > 0) throw new BuildError(problems);
}

/** What a CAN frame must be beyond what the reader of a file checks. */
function examineFrame(
  message: MessageSpec,
  add: (what: string, value: string, bound: string, remedy: string) => void,
): void {
  const most = message.extended ? identifierMasks.extended : identifierMasks.standard;
  if (!(Number.isInteger(message.identifier) && message.identifier >= 0 && message.identifier <= most))
    add('the identifier does not fit', `${message.identifier}`, `0 to ${most}`, 'choose another or make it extended');
  const bytes = message.bytes ?? 8;
  const lengths = message.flexibleDataRate ? flexibleLengths : flexibleLengths.filter((length) => length <= 8);
  const long = message.j1939 === true && bytes > 8;
  if (long && bytes > longestMessage)
    add('no message has this length', `${bytes} bytes`, `at most ${longestMessage}`, 'split it');
  if (long && (message.flexibleDataRate || message.protection))
    add('a message of the transport protocol is neither FD nor protected', `${bytes} bytes`, '', 'leave both away');
  if (message.trigger === 'on-request' && message.j1939 !== true)
    add('on request, and no parameter group', 'trigger: on-request', '', 'say j1939: { pgn: …, source: … }');
  if (!long && !lengths.includes(bytes))
    add('no CAN frame has this length', `${bytes} bytes`, `one of ${lengths.join(', ')}`, 'take the next longer one');
  if (message.bitRateSwitch && !message.flexibleDataRate)
    add('a classic frame has no bit-rate switch', 'bitRateSwitch: on', '', 'add flexibleDataRate: on');
  for (const signal of message.signals)
    if (!signal.can && !signal.trouble && signal.lamp === undefined)
      add(`${signal.name} has no layout on CAN`, 'no can:', '', 'add can: { start: 0, length: 8 } to it');
  const { bits, faults } = readProtection(message);
  for (const fault of faults) add(fault.what, fault.value, fault.bound, fault.remedy);
  for (const signal of message.signals) {
    const shared = signal.can && bitsOf(signal.can).find((bit) => bits.includes(bit));
    if (shared !== undefined)
      add(
        `${signal.name} lies on the bits of the protection`,
        `bit ${shared}`,
        `${message.protection?.kind}`,
        'move one of the two',
      );
  }
}

function examineTiming(
  message: MessageSpec,
  add: (what: string, value: string, bound: string, remedy: string) => void,
): void {
  const whole = (value: number | undefined, least: number): boolean =>
    value === undefined || (Number.isInteger(value) && value >= least);
  if (!whole(message.every, goesByCycle(message) ? 1 : 0))
    add(
      'the cycle is not a whole number of ticks',
      `${message.every} ticks`,
      'at least 1 tick',
      'give a cycle that the step divides',
    );
  if (!whole(message.phase, 0) || (message.every > 0 && message.phase >= message.every))
    add(
      'the phase lies outside the cycle',
      `${message.phase} ticks`,
      `0 to ${Math.max(0, message.every - 1)} ticks`,
      'reduce it by the cycle',
    );
  if (!whole(message.startDelay, 0))
    add('the start delay is no whole number of ticks', `${message.startDelay} ticks`, 'at least 0', 'change it');
  if (!whole(message.timeout, 0))
    add('the time-out is no whole number of ticks', `${message.timeout} ticks`, 'at least 0', 'change it (0: never)');
  if (!whole(message.fastEvery, 1))
    add('the fast cycle is no whole number of ticks', `${message.fastEvery} ticks`, 'at least 1 tick', 'change it');
}

function examineSignals(message: MessageSpec, path: string, problems: Problem[]): void {
  const names = new Set<string>();
  for (const signal of message.signals) {
    const add = (what: string, value: string, bound: string, remedy: string): void => {
      problems.push({ path: `${path}.${signal.name}`, what, value, bound, remedy });
    };
    if (!identifier.test(signal.name))
      add('the name cannot be used in C', signal.name, 'letters and digits, a letter first', 'rename it');
    if (names.has(signal.name))
      add('the message has this signal twice', signal.name, 'one signal per name', 'rename one');
    if (reservedNames.includes(signal.name))
      add('the name belongs to the link itself', signal.name, `not one of ${reservedNames.join(', ')}`, 'rename it');
    names.add(signal.name);
    examineNumbers(signal, message.direction === 'received', add);
  }
}

function examineNumbers(
  signal: MapSignal,
  received: boolean,
  add: (what: string, value: string, bound: string, remedy: string) => void,
): void {
  const { least, most, unit } = signal;
  for (const name of ['scale', 'offset', 'unitScale', 'unitOffset', 'least', 'most'] as const)
    if (!Number.isFinite(signal[name])) {
      add(`${name} is not a finite number`, `${signal[name]}`, '', 'give a number');
      return;
    }
  if (signal.scale === 0 || signal.unitScale === 0) {
    add('the scale is zero', '0', 'not 0', 'give the size of one wire step');
    return;
  }
  if (least > most) {
    add('the range is upside down', `${least} .. ${most} ${unit}`, 'least first', 'swap the ends');
    return;
  }
  const [low, high] = limits[signal.type];
  for (const end of [least, most]) {
    const wire = (end - signal.offset) / signal.scale;
    if (wire < low - 0.5 || (signal.type[0] === 'f' ? wire > high : wire >= high + 0.5)) {
      const ends = [low * signal.scale + signal.offset, high * signal.scale + signal.offset].sort((a, b) => a - b);
      add(
        `the range does not fit ${signal.type}`,
        `${end} ${unit}`,
        `${ends[0]} .. ${ends[1]} ${unit}`,
        'take a wider type or another scale',
      );
    }
  }
  const wire = wireNumber(signal, most) - wireNumber(signal, least);
  if (wire === 0 && least !== most)
    add(
      'the range is smaller than one wire step',
      `${least} .. ${most} ${unit}`,
      `step ${signal.scale} ${unit}`,
      'take a finer scale',
    );
  if (received && !(signal.substitute >= least && signal.substitute <= most))
    add(
      'the substitute lies outside the range',
      `${signal.substitute} ${unit}`,
      `${least} .. ${most} ${unit}`,
      'choose one inside',
    );
}
