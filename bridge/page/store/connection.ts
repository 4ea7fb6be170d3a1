import { computed, signal } from '@preact/signals';
import type { SignalInfo } from '../../../runtime/contract.js';
import type {
  Acknowledgement,
  BenchFacts,
  EventNames,
  HandCommand,
  History,
  LiveEvent,
  LiveStatus,
  RecordingEntry,
} from '../../live/source.js';
import type { Frame, PageMessage, ServerMessage } from '../../live/wire.js';
import { decode, doublesOf, encode, floatsOf, wireVersion } from '../../live/wire.js';
import { who } from './preferences.js';

/** What is being looked at: the bench, or a recording. */
export interface Subject {
  readonly bench: BenchFacts;
  readonly signals: readonly SignalInfo[];
  readonly index: ReadonlyMap<string, number>;
  readonly interval: number;
  /** Name and range of a recording; absent when live. */
  readonly recording?: { readonly name: string; readonly firstTick: number; readonly lastTick: number };
}

export const subject = signal<Subject | undefined>(undefined);
export const eventNames = signal<EventNames>({ kinds: [], subjects: [] });
export const status = signal<LiveStatus | undefined>(undefined);
export const clients = signal(0);
export const events = signal<readonly LiveEvent[]>([]);
export const shelf = signal<readonly RecordingEntry[]>([]);
export const offersRecordings = signal(false);
export const control = signal<'none' | 'token' | 'granted'>('none');
export const connected = signal(false);
export const thinned = signal(false);
/** ms since 1970, of the last message and the last frame. */
export const lastHeard = signal(0);
export const lastFrame = signal(0);
/** Newest tick that was shown. */
export const tick = signal(-1);
/** Ticks on once a second. */
export const wallClock = signal(Date.now());
setInterval(() => (wallClock.value = Date.now()), 500);

/** Since when the picture is not that of the bench (ms since 1970), and why; undefined while it is. */
export const stale = computed<{ since: number; why: string } | undefined>(() => {
  if (subject.value?.recording !== undefined && connected.value) return undefined;
  const now = wallClock.value;
  if (lastHeard.value === 0) return undefined;
  if (!connected.value) return { since: lastHeard.value, why: 'no connection to the bench; trying again' };
  if (now - lastHeard.value > 1500) return { since: lastHeard.value, why: 'the bench does not answer' };
  if (lastFrame.value > 0 && now - lastFrame.value > 1500 && status.value?.run.phase !== 'ended')
    return { since: lastFrame.value, why: 'no new values' };
  return undefined;
});

export function ambient(): number {
  return subject.value?.bench.ambientPressure ?? 101325;
}
export function infoOf(path: string): SignalInfo | undefined {
  const at = subject.value?.index.get(path);
  return at === undefined ? undefined : subject.value?.signals[at];
}

let socket: WebSocket | undefined;
let serverStart = 0;
let retry = 500;
let nextRequest = 1;
const pending = new Map<number, { resolve: (value: never) => void; reject: (error: Error) => void }>();
const frameListeners = new Set<(frame: Frame) => void>();
const resetListeners = new Set<() => void>();
let token: string | undefined;

export function onFrame(listener: (frame: Frame) => void): () => void {
  frameListeners.add(listener);
  return () => frameListeners.delete(listener);
}
/** Called when the subject changed or the connection came back: subscriptions and pictures start anew. */
export function onReset(listener: () => void): () => void {
  resetListeners.add(listener);
  return () => resetListeners.delete(listener);
}

export function send(message: PageMessage): void {
  if (socket?.readyState === WebSocket.OPEN) socket.send(encode(message) as Uint8Array<ArrayBuffer>);
}
function request<T>(make: (request: number) => PageMessage): Promise<T> {
  if (socket?.readyState !== WebSocket.OPEN) return Promise.reject(new Error('no connection to the bench'));
  const number = nextRequest++;
  return new Promise<T>((resolve, reject) => {
    pending.set(number, { resolve: resolve as (value: never) => void, reject });
    send(make(number));
  });
}

export function askHistory(signals: readonly number[], from: number, to: number, bins: number): Promise<History> {
  return request((number) => ({
    type: 'history',
    request: number,
    signals,
    from: Math.max(0, Math.floor(from)),
    to: Math.max(0, Math.floor(to)),
    bins,
  }));
}
export function order(command: HandCommand): Promise<Acknowledgement> {
  return request((number) => ({ type: 'command', request: number, who: who.value, command }));
}
export async function giveToken(text: string): Promise<Acknowledgement> {
  const answer = await request<Acknowledgement>((number) => ({ type: 'token', request: number, token: text }));
  if (answer.ok) {
    token = text;
    control.value = 'granted';
  }
  return answer;
}
export function askShelf(): void {
  send({ type: 'shelf' });
}
export function openRecording(name: string): void {
  send({ type: 'open', request: nextRequest++, name });
}
/** Back to the bench: a new greeting is the simplest way to its whole picture. */
export function goLive(): void {
  serverStart = 0;
  socket?.close();
}
export function askMoment(at: number): void {
  send({ type: 'moment', request: nextRequest++, tick: Math.max(0, Math.round(at)) });
}

export function connect(): void {
  // the token may come behind the # of the printed address: it is not sent with requests and leaves the address bar
  const printed = new URLSearchParams(location.hash.replace(/^#\/?/, '')).get('token');
  if (printed !== null) {
    token = printed;
    history.replaceState(null, '', location.pathname);
  }
  open();
}

function open(): void {
  const mine = new WebSocket(`ws://${location.host}/live`);
  socket = mine;
  mine.binaryType = 'arraybuffer';
  mine.onopen = () => {
    retry = 500;
    connected.value = true;
  };
  mine.onmessage = (message: MessageEvent<ArrayBuffer>) => {
    lastHeard.value = Date.now();
    take(decode(new Uint8Array(message.data)) as ServerMessage);
  };
  mine.onclose = () => {
    if (socket !== mine) return;
    connected.value = false;
    if (control.value === 'granted') control.value = 'token';
    for (const { reject } of pending.values()) reject(new Error('the connection to the bench ended'));
    pending.clear();
    setTimeout(open, retry);
    retry = Math.min(4000, retry * 1.6);
  };
}

function see(next: Omit<Subject, 'index'>): void {
  subject.value = { ...next, index: new Map(next.signals.map((info, i) => [info.path, i])) };
  document.title = `${next.bench.name} – oilspring`;
}

function take(message: ServerMessage): void {
  switch (message.type) {
    case 'hello':
      if (message.version !== wireVersion) {
        location.reload();
        return;
      }
      if (message.serverStart === serverStart && subject.peek()?.recording !== undefined) {
        openRecording(subject.peek()?.recording?.name ?? '');
        return;
      }
      if (message.serverStart !== serverStart) {
        serverStart = message.serverStart;
        events.value = [];
        see({ bench: message.bench, signals: message.signals, interval: message.interval });
      }
      eventNames.value = message.events;
      tick.value = message.lastTick;
      control.value = message.control;
      offersRecordings.value = message.recordings;
      if (message.control === 'token' && token !== undefined) void giveToken(token).catch(() => undefined);
      for (const listener of resetListeners) listener();
      return;
    case 'opened':
      see({ bench: message.bench, signals: message.signals, interval: 1, recording: message });
      eventNames.value = message.events;
      events.value = [];
      tick.value = message.lastTick;
      for (const listener of resetListeners) listener();
      return;
    case 'names':
      eventNames.value = message.events;
      return;
    case 'frame':
      lastFrame.value = Date.now();
      thinned.value = message.thinned;
      tick.value = message.to;
      for (const listener of frameListeners) listener(message);
      return;
    case 'status':
      status.value = message.status;
      if (message.clients > 0) clients.value = message.clients;
      return;
    case 'events':
      if (message.past) events.value = message.events;
      else events.value = [...events.value, ...message.events].slice(-2000);
      return;
    case 'history':
      settle(message.request, {
        ticks: doublesOf(message.ticks),
        least: floatsOf(message.least),
        most: floatsOf(message.most),
      });
      return;
    case 'answer':
      settle(message.request, message.acknowledgement);
      return;
    case 'refusal':
      pending.get(message.request)?.reject(new Error(`${message.what}; ${message.remedy}`));
      pending.delete(message.request);
      return;
    case 'shelf':
      shelf.value = message.recordings;
  }
}
function settle(number: number, value: unknown): void {
  pending.get(number)?.resolve(value as never);
  pending.delete(number);
}
