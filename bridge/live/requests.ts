import type { Client } from './client.js';
import type { Desk } from './server.js';
import type { RecordingView } from './source.js';
import { bytesOf, decode, type PageMessage, readPageMessage, wireVersion } from './wire.js';

/** Wrong messages after which a connection is ended. */
const mostWrong = 50;

/** Greets a client and answers what it asks. */
export function serve(client: Client, desk: Desk): void {
  const { source } = desk;
  client.send({
    type: 'hello',
    version: wireVersion,
    serverStart: desk.serverStart,
    bench: source.bench,
    signals: source.signals,
    events: { kinds: source.events.kinds, subjects: source.events.subjects },
    interval: desk.decimator.interval,
    lastTick: desk.decimator.lastTick,
    oldestTick: desk.decimator.oldestTick,
    control: source.command === undefined ? 'none' : client.authorised ? 'granted' : 'token',
    recordings: desk.options.recordings !== undefined,
  });
  greet(client, desk);
  if (desk.options.opening !== undefined)
    open(client, desk, desk.options.opening).catch((error: Error) =>
      client.send({ type: 'refusal', request: 0, what: error.message, remedy: 'choose another recording' }),
    );
  client.socket.on('message', (data, binary) => {
    if (!client.requests.take()) {
      desk.counts.tooManyMessages += 1;
      if ((client.wrong += 1) > mostWrong) client.socket.close(1008, 'too many messages');
      else if (client.reads)
        client.send({ type: 'refusal', request: 0, what: 'too many messages', remedy: 'at most 60 a second' });
      return;
    }
    let value: unknown;
    try {
      if (!binary) throw new Error('text');
      value = decode(data as Buffer);
    } catch {
      refuseMessage(client, desk, 0, 'the message is no msgpack map in a binary message');
      return;
    }
    const signals = client.recording?.signals.length ?? source.signals.length;
    const message = readPageMessage(value, signals);
    if (message.type === 'wrong') {
      refuseMessage(client, desk, message.request, message.what);
      return;
    }
    answer(client, desk, message).catch((error: unknown) => {
      const request = 'request' in message ? message.request : 0;
      client.send({
        type: 'refusal',
        request,
        what: error instanceof Error ? error.message : 'it failed',
        remedy: 'see the log of the bench',
      });
    });
  });
}

function greet(client: Client, desk: Desk): void {
  client.send({ type: 'events', events: desk.events, past: true });
  client.send({ type: 'status', status: desk.source.status(), clients: 0 });
}

function refuseMessage(client: Client, desk: Desk, request: number, what: string): void {
  desk.counts.wrongMessages += 1;
  client.send({ type: 'refusal', request, what, remedy: 'reload the page' });
  if ((client.wrong += 1) > mostWrong) client.socket.close(1008, 'too many wrong messages');
}

async function answer(client: Client, desk: Desk, message: PageMessage): Promise<void> {
  switch (message.type) {
    case 'subscribe':
      client.subscribe(message.subscription, message.signals, desk.decimator);
      return;
    case 'history': {
      if (client.choked) throw new Error('this page reads too slowly for more history');
      const { signals, from, to, bins } = message;
      const history = client.recording
        ? await client.recording.history(signals, from, to, bins)
        : desk.decimator.history(signals, from, to, bins);
      client.send({
        type: 'history',
        request: message.request,
        ticks: bytesOf(history.ticks),
        least: bytesOf(history.least),
        most: bytesOf(history.most),
      });
      return;
    }
    case 'token':
      authorise(client, desk, message.request, message.token);
      return;
    case 'command':
      return command(client, desk, message);
    case 'shelf':
      client.send({ type: 'shelf', recordings: (await desk.options.recordings?.list()) ?? [] });
      return;
    case 'open':
      return open(client, desk, message.name);
    case 'moment': {
      if (client.recording === undefined) throw new Error('no recording is open');
      const status = await client.recording.statusAt(message.tick);
      client.send({ type: 'status', status, clients: 0, request: message.request });
      return;
    }
    case 'live':
      await client.recording?.close();
      client.recording = undefined;
      greet(client, desk);
  }
}

function authorise(client: Client, desk: Desk, request: number, token: string): void {
  const say = (ok: boolean, text: string) =>
    client.send({ type: 'answer', request, acknowledgement: { ok, tick: -1, text } });
  if (desk.gate === undefined || desk.source.command === undefined) {
    say(false, 'the bench was started without control; start it with --control');
    return;
  }
  const result = desk.gate.try(token, client.address);
  if (result === 'right') client.authorised = true;
  say(
    result === 'right',
    result === 'right'
      ? 'control granted'
      : result === 'wait'
        ? 'too many wrong tokens from there: wait a minute'
        : 'that is not the token',
  );
}

async function command(client: Client, desk: Desk, message: PageMessage & { type: 'command' }): Promise<void> {
  let acknowledgement = { ok: false, tick: -1, text: '' };
  if (client.recording !== undefined) acknowledgement.text = 'a recording cannot be steered';
  else if (desk.source.command === undefined)
    acknowledgement.text = 'the bench was started without control; start it with --control';
  else if (!client.authorised)
    acknowledgement.text = 'control needs the token that was printed where the bench was started';
  else {
    const who = message.who.trim();
    if (who === '') acknowledgement.text = 'say who you are first: every hand goes into the record';
    else
      acknowledgement = await desk.hands.act(client, message.command, { who, address: client.address, at: desk.now() });
  }
  if (acknowledgement.ok) desk.counts.commands += 1;
  else desk.counts.refusedCommands += 1;
  client.send({ type: 'answer', request: message.request, acknowledgement });
}

/** A name is only ever compared with the names on the shelf; it is never made into a path here. */
async function open(client: Client, desk: Desk, name: string): Promise<void> {
  const shelf = desk.options.recordings;
  if (shelf === undefined) throw new Error('this server offers no recordings');
  if (!(await shelf.list()).some((entry) => entry.name === name))
    throw new Error(`there is no recording called ${JSON.stringify(name.slice(0, 80))}`);
  const view: RecordingView = await shelf.open(name);
  await client.recording?.close();
  client.recording = view;
  client.send({
    type: 'opened',
    name,
    bench: view.bench,
    signals: view.signals,
    events: view.events,
    firstTick: view.firstTick,
    lastTick: view.lastTick,
  });
  client.send({ type: 'events', events: await view.eventsIn(view.firstTick, view.lastTick, 2000), past: true });
  client.send({ type: 'status', status: await view.statusAt(view.lastTick), clients: 0 });
}
