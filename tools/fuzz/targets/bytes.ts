import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { CanDatagram, greatestDatagram } from '../../../bridge/can-datagram.js';
import { frameSizes, makeFrame } from '../../../bridge/can-frame.js';
import { refuses } from '../../../bridge/live/guard.js';
import { decode, encode, type PageMessage, readPageMessage } from '../../../bridge/live/wire.js';
import { HAND, type HandMessage, handBytes, readHand, writeHand } from '../../../runtime/hand-wire.js';
import { crc32 } from '../../../runtime/recording/crc32.js';
import { FRAME, MAGIC, RecordingError } from '../../../runtime/recording/format.js';
import { Recording } from '../../../runtime/recording/reader.js';
import { UnpackError, unpack } from '../../../runtime/recording/unpack.js';
import type { Target } from '../fuzzer.js';
import { sampleRecording } from './sample-recording.js';

const frame = new Uint8Array(frameSizes.flexible);
const twice = new Uint8Array(frameSizes.flexible);
const datagram = new CanDatagram();
const again = new CanDatagram();
const stamp = Float64Array.of(12.5);

function written(one: Uint8Array): Uint8Array {
  const length = datagram.write(one, one.length, stamp, 0);
  return datagram.bytes.slice(0, length);
}
const frames = [
  makeFrame(0x123, Uint8Array.of(1, 2, 3)),
  makeFrame(0x18ff0102, new Uint8Array(8), { extended: true }),
  makeFrame(0x7ff, new Uint8Array(48), { flexible: true, bitRateSwitch: true }),
];

export const multicastFrame: Target = {
  name: 'multicast',
  about: 'a CAN frame as a multicast datagram',
  seeds: frames.map(written),
  words: [],
  longest: greatestDatagram + 40,
  decode: (input) => {
    const room = input.subarray(0, greatestDatagram);
    datagram.bytes.fill(0);
    datagram.bytes.set(room);
    frame.fill(0);
    const size = datagram.read(input.length, frame);
    if (size < 0) return undefined;
    const length = again.write(frame, size, stamp, 0);
    twice.fill(0);
    if (again.read(length, twice) !== size || Buffer.compare(frame, twice) !== 0)
      throw new Error('written and read again it is another frame');
    return { size, length: frame[4]!, first: frame[8]! };
  },
  planted: (found) =>
    (found as { size: number; length: number }).size === frameSizes.flexible &&
    (found as { length: number }).length < 16,
};

const signals = 10;
const messages: PageMessage[] = [
  { type: 'subscribe', subscription: 1, signals: [0, 3] },
  { type: 'history', request: 2, signals: [1], from: 0, to: 100, bins: 50 },
  { type: 'token', request: 3, token: 'abc' },
  { type: 'command', request: 4, who: 'A', command: { kind: 'set', path: 'driver.brake', value: 0.5 } },
  { type: 'command', request: 4, who: 'A', command: { kind: 'note', text: 'hello' } },
  { type: 'shelf' },
  { type: 'open', request: 5, name: 'a.osrec' },
  { type: 'moment', request: 6, tick: 12 },
];
export const pageMessage: Target = {
  name: 'page',
  about: 'a message of a page, by websocket',
  seeds: messages.map((message) => Uint8Array.from(encode(message))),
  words: [],
  longest: 2000,
  decode: (input) => {
    let value: unknown;
    try {
      value = decode(Buffer.from(input));
    } catch {
      // the server counts it
      return undefined;
    }
    const message = readPageMessage(value, signals);
    if (message.type === 'wrong') return undefined;
    if (message.type === 'subscribe' || message.type === 'history')
      for (const signal of message.signals)
        if (!Number.isInteger(signal) || signal < 0 || signal >= signals)
          throw new Error(`signal ${signal} of ${signals}`);
    if (message.type === 'command' && message.command.kind === 'set' && !Number.isFinite(message.command.value))
      throw new Error(`a hand of ${message.command.value}`);
    return message;
  },
  planted: (found) => {
    const message = found as PageMessage;
    return message.type === 'history' && message.bins !== 50;
  },
};

const heads = [
  '127.0.0.1:47180\nhttp://127.0.0.1:47180\nsame-origin',
  'localhost:47180\nhttp://localhost:47180\nnone',
  '[::1]:47180\nhttp://[::1]:47180\n',
];
export const requestHead: Target = {
  name: 'request',
  about: 'Host, Origin and Sec-Fetch-Site of a request',
  seeds: heads.map((head) => Uint8Array.from(Buffer.from(head))),
  words: [
    'localhost',
    '127.0.0.1',
    ':47180',
    '[::1]',
    '::ffff:',
    'http://',
    'evil.example',
    '.',
    ':',
    '@',
    '#',
    '\n',
    'null',
    '%00',
  ],
  longest: 300,
  repair: (input) => {
    // the same name in Origin as in Host, as far as there is room
    const line = input.indexOf(10);
    for (let at = 0; line > 0 && at < line && line + 8 + at < input.length; at += 1) input[line + 8 + at] = input[at]!;
  },
  decode: (input) => {
    const [host, origin, site] = Buffer.from(input).toString('latin1').split('\n');
    const headers = { host, origin, 'sec-fetch-site': site };
    const request = { headers, method: 'GET', socket: { localAddress: '127.0.0.1' } };
    const refused = refuses(request as never, { names: [], port: 47180 }, true);
    if (refused !== undefined) return undefined;
    if (origin !== `http://${host}`) throw new Error(`let in from ${origin}`);
    // what a browser makes of the name must be this computer
    const { hostname, port } = new URL(`http://${host}/`);
    if (
      port !== '47180' ||
      !/^(?:localhost\.?|127\.\d+\.\d+\.\d+|\[::1\]|\[::ffff:7f[\da-f]{2}:[\da-f]+\])$/.test(hostname)
    )
      throw new Error(`let in as ${host}`);
    return hostname;
  },
  planted: (found) => /^127\.0\.0\.[2-9]|^127\.\d\d/.test(found as string),
};

const text = { who: 'A', address: '127.0.0.1', said: 'why' };
const hand = (kind: number, target: number, value: number): Uint8Array => {
  const into = new Uint8Array(handBytes.most);
  return into.slice(0, writeHand({ kind, request: 7, target, deadMan: 500, value, text }, into));
};
export const handInput: Target = {
  name: 'hand',
  about: 'a hand as bytes',
  seeds: [hand(HAND.set, 3, 0.5), hand(HAND.note, 0, 0)],
  words: [],
  longest: handBytes.most,
  decode: (input) => readHand(input),
  planted: (found) => (found as HandMessage).kind === HAND.scenario && (found as HandMessage).text.said === '',
};

export const packedValue: Target = {
  name: 'msgpack',
  about: 'the contents of a block of a recording',
  seeds: messages.map((message) => Uint8Array.from(encode(message))),
  words: [],
  longest: 1000,
  decode: (input) => {
    try {
      return { value: unpack(input) };
    } catch (error) {
      if (error instanceof UnpackError) return undefined;
      throw error;
    }
  },
  planted: (found) =>
    Object.values(((found as { value: unknown }).value ?? {}) as object).some(
      (one) => typeof one === 'number' && one < -5,
    ),
};

const place = path.join(fs.existsSync('/dev/shm') ? '/dev/shm' : os.tmpdir(), `oilspring-fuzz-${process.pid}.osrec`);
process.once('exit', () => fs.rmSync(place, { force: true }));
export const recordingFile: Target = {
  name: 'recording',
  about: 'a recording',
  seeds: [sampleRecording()],
  words: [],
  longest: 20_000,
  repair: (input) => {
    // as long as the lengths make sense, the checksums do too
    const view = new DataView(input.buffer, input.byteOffset, input.byteLength);
    for (let at = MAGIC.length; at + FRAME <= input.length; ) {
      const length = view.getUint32(at, true);
      if (length === 0 || at + FRAME + length > input.length) return;
      view.setUint32(
        at + 4,
        crc32(input.subarray(at + FRAME, at + FRAME + length), crc32(input.subarray(at, at + 4))),
        true,
      );
      at += FRAME + length;
    }
  },
  decode: (input) => {
    fs.writeFileSync(place, input);
    try {
      const recording = new Recording(place);
      try {
        const overview = recording.examine();
        if (overview.ending.atByte > input.length) throw new Error('it ends behind its end');
        return overview;
      } finally {
        recording.close();
      }
    } catch (error) {
      if (error instanceof RecordingError) return undefined;
      throw error;
    }
  },
  planted: (found) =>
    (found as { events: number; ending: { how: string } }).ending.how === 'damaged' &&
    (found as { snapshots: number }).snapshots > 0,
};
