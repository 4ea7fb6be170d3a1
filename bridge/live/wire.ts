import { Packr, Unpackr } from 'msgpackr';
import type { SignalInfo } from '../../runtime/contract.js';
import type {
  Acknowledgement,
  BenchFacts,
  EventNames,
  HandCommand,
  LiveEvent,
  LiveStatus,
  RecordingEntry,
} from './source.js';

/** Raised whenever a message changes its meaning; the page reloads when it does not match its own. */
export const wireVersion = 1;
/** Largest message that the server takes, bytes. */
export const largestRequest = 16 * 1024;

/** What the server sends. Every message is one msgpack map; numbers of signals index `hello.signals`. */
export type ServerMessage =
  | Names
  | Hello
  | Frame
  | HistoryAnswer
  | StatusMessage
  | EventsMessage
  | Answer
  | Refusal
  | Shelf
  | Opened;

export interface Hello {
  readonly type: 'hello';
  readonly version: number;
  /** Changes with every start of the server, so that a page knows that it met a new one. */
  readonly serverStart: number;
  readonly bench: BenchFacts;
  readonly signals: readonly SignalInfo[];
  readonly events: EventNames;
  /** Ticks of a display interval. */
  readonly interval: number;
  readonly lastTick: number;
  readonly oldestTick: number;
  /** `none`: started without control; `token`: send the token first; `granted`. */
  readonly control: 'none' | 'token' | 'granted';
  readonly recordings: boolean;
}
/** Display intervals of the subscribed signals; several, or merged into wider ones, when a client lags. */
export interface Frame {
  readonly type: 'frame';
  readonly subscription: number;
  /** First and last tick covered. */
  readonly from: number;
  readonly to: number;
  /** First tick of each interval (f64), least and most (f32, signal after signal), last value (f32). */
  readonly ticks: Uint8Array;
  readonly least: Uint8Array;
  readonly most: Uint8Array;
  readonly last: Uint8Array;
  /** True when this client's picture was thinned because it reads too slowly. */
  readonly thinned: boolean;
}
export interface HistoryAnswer {
  readonly type: 'history';
  readonly request: number;
  readonly ticks: Uint8Array;
  readonly least: Uint8Array;
  readonly most: Uint8Array;
}
export interface StatusMessage {
  readonly type: 'status';
  readonly status: LiveStatus;
  readonly clients: number;
  /** Set when it answers a `moment` of a recording. */
  readonly request?: number;
}
export interface EventsMessage {
  readonly type: 'events';
  readonly events: readonly LiveEvent[];
  /** True for those from before the connection. */
  readonly past: boolean;
}
export interface Answer {
  readonly type: 'answer';
  readonly request: number;
  readonly acknowledgement: Acknowledgement;
}
/** Kinds or subjects of events have been added since the greeting. */
export interface Names {
  readonly type: 'names';
  readonly events: EventNames;
}
/** A message that was not understood or not allowed. */
export interface Refusal {
  readonly type: 'refusal';
  readonly request: number;
  readonly what: string;
  readonly remedy: string;
}
export interface Shelf {
  readonly type: 'shelf';
  readonly recordings: readonly RecordingEntry[];
}
export interface Opened {
  readonly type: 'opened';
  readonly name: string;
  readonly bench: BenchFacts;
  readonly signals: readonly SignalInfo[];
  readonly events: EventNames;
  readonly firstTick: number;
  readonly lastTick: number;
}

/** What a page sends. */
export type PageMessage =
  | { readonly type: 'subscribe'; readonly subscription: number; readonly signals: readonly number[] }
  | {
      readonly type: 'history';
      readonly request: number;
      readonly signals: readonly number[];
      readonly from: number;
      readonly to: number;
      readonly bins: number;
    }
  | { readonly type: 'token'; readonly request: number; readonly token: string }
  | { readonly type: 'command'; readonly request: number; readonly who: string; readonly command: HandCommand }
  | { readonly type: 'shelf' }
  | { readonly type: 'open'; readonly request: number; readonly name: string }
  | { readonly type: 'moment'; readonly request: number; readonly tick: number }
  | { readonly type: 'live' };

const packer = new Packr({ useRecords: false });
const unpacker = new Unpackr({ useRecords: false, mapsAsObjects: true });

export function encode(message: ServerMessage | PageMessage): Uint8Array {
  return packer.pack(message);
}

/** Throws on bytes that are no msgpack. */
export function decode(bytes: Uint8Array): unknown {
  return unpacker.unpack(bytes);
}

export function bytesOf(array: Float32Array | Float64Array): Uint8Array {
  return new Uint8Array(array.buffer, array.byteOffset, array.byteLength);
}

/** Copies, since the bytes of a message need not be aligned. */
export function floatsOf(bytes: Uint8Array): Float32Array {
  return new Float32Array(new Uint8Array(bytes).buffer);
}
export function doublesOf(bytes: Uint8Array): Float64Array {
  return new Float64Array(new Uint8Array(bytes).buffer);
}

/** The message, or what is wrong with it. Nothing that comes from outside is used before it passed here. */
export function readPageMessage(
  value: unknown,
  signals: number,
): PageMessage | { readonly type: 'wrong'; readonly request: number; readonly what: string } {
  if (typeof value !== 'object' || value === null || Array.isArray(value)) return wrong(0, 'a message is a map');
  const map = value as Record<string, unknown>;
  const request = whole(map['request'], 0, 2 ** 31) ? map['request'] : 0;
  switch (map['type']) {
    case 'subscribe':
      if (!whole(map['subscription'], 0, 2 ** 31)) return wrong(request, 'subscription must be a whole number');
      if (!signalList(map['signals'], signals, 512)) return wrong(request, signalText(signals, 512));
      return { type: 'subscribe', subscription: map['subscription'], signals: map['signals'] };
    case 'history':
      if (!signalList(map['signals'], signals, 64)) return wrong(request, signalText(signals, 64));
      if (!tick(map['from']) || !tick(map['to']) || map['to'] < map['from'])
        return wrong(request, 'from and to must be ticks, to not before from');
      if (!whole(map['bins'], 1, 4096)) return wrong(request, 'bins must be a whole number from 1 to 4096');
      return { type: 'history', request, signals: map['signals'], from: map['from'], to: map['to'], bins: map['bins'] };
    case 'token':
      if (!text(map['token'], 256)) return wrong(request, 'token must be a text of at most 256 characters');
      return { type: 'token', request, token: map['token'] };
    case 'command': {
      if (!text(map['who'], 80)) return wrong(request, 'who must be a text of at most 80 characters');
      const command = readCommand(map['command']);
      if (typeof command === 'string') return wrong(request, command);
      return { type: 'command', request, who: map['who'], command };
    }
    case 'shelf':
    case 'live':
      return { type: map['type'] };
    case 'open':
      if (!text(map['name'], 256)) return wrong(request, 'name must be a text of at most 256 characters');
      return { type: 'open', request, name: map['name'] };
    case 'moment':
      if (!tick(map['tick'])) return wrong(request, 'tick must be a tick');
      return { type: 'moment', request, tick: map['tick'] };
    default:
      return wrong(request, `no message is called ${JSON.stringify(String(map['type']).slice(0, 40))}`);
  }
}

function readCommand(value: unknown): HandCommand | string {
  if (typeof value !== 'object' || value === null) return 'command must be a map';
  const map = value as Record<string, unknown>;
  switch (map['kind']) {
    case 'set':
      if (!text(map['path'], 200) || typeof map['value'] !== 'number' || !Number.isFinite(map['value']))
        return 'set needs a path and a finite value';
      return { kind: 'set', path: map['path'], value: map['value'] };
    case 'release':
      if (!text(map['path'], 200)) return 'release needs a path';
      return { kind: 'release', path: map['path'], reason: 'let go' };
    case 'scenario':
      if (
        map['action'] !== 'start' &&
        map['action'] !== 'hold' &&
        map['action'] !== 'continue' &&
        map['action'] !== 'end'
      ) {
        return 'a scenario action is start, hold, continue or end';
      }
      return { kind: 'scenario', action: map['action'] };
    case 'acknowledge':
      if (!whole(map['warning'], 0, 2 ** 31)) return "acknowledge needs a warning's number";
      return { kind: 'acknowledge', warning: map['warning'] };
    case 'note':
      if (!text(map['text'], 2000) || map['text'].trim() === '')
        return 'a note needs a text of at most 2000 characters';
      return { kind: 'note', text: map['text'] };
    default:
      return `no command is called ${JSON.stringify(String(map['kind']).slice(0, 40))}`;
  }
}

function wrong(request: number, what: string): { type: 'wrong'; request: number; what: string } {
  return { type: 'wrong', request, what };
}
function whole(value: unknown, least: number, most: number): value is number {
  return typeof value === 'number' && Number.isInteger(value) && value >= least && value <= most;
}
function tick(value: unknown): value is number {
  return whole(value, 0, 2 ** 52);
}
function text(value: unknown, most: number): value is string {
  return typeof value === 'string' && value.length <= most;
}
function signalList(value: unknown, signals: number, most: number): value is number[] {
  return Array.isArray(value) && value.length <= most && value.every((index) => whole(index, 0, signals - 1));
}
function signalText(signals: number, most: number): string {
  return `signals must be at most ${most} numbers from 0 to ${signals - 1}`;
}
