import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { HandCommand, LiveStatus } from '../../bridge/live/source.js';
import type {
  Answer,
  Frame,
  Hello,
  HistoryAnswer,
  Opened,
  ServerMessage,
  StatusMessage,
} from '../../bridge/live/wire.js';
import { doublesOf, floatsOf } from '../../bridge/live/wire.js';
import { handEventNames } from '../../runtime/hand-events.js';
import { HAND, type HandMessage, readHand } from '../../runtime/hand-wire.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import type { EventsBlock, InputsBlock, RowsBlock } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import type { RunSummary } from '../../runtime/run-summary.js';
import { PageClient } from '../bridge/live/page-client.js';
import { type ChildResult, finished } from '../support/child.js';
import { runCommand, scratch, startCommand, truck } from './command.js';

/** Ticks that the truck's bench goes on behind the end of a run. */
const afterRun = 300;

/**
 * A live run of the reference truck with its page, ten pages open, one of which does not read, and hands on the pedals.
 * The last hand ends it, so that nothing depends on how fast this computer is.
 */
const folder = scratch();
const file = folder.file('live.osrec');
let running: ReturnType<typeof startCommand> | undefined;
afterAll(() => {
  // it has ended by itself unless something failed
  running?.kill('SIGKILL');
  folder.remove();
});

const isHello = (message: ServerMessage): message is Hello => message.type === 'hello';
const isFrame = (message: ServerMessage): message is Frame => message.type === 'frame';
const isStatus = (message: ServerMessage): message is StatusMessage => message.type === 'status';
const pause = (time: number) => new Promise((resolve) => setTimeout(resolve, time));

/** The recording, whole. */
interface Recorded {
  readonly paths: readonly string[];
  readonly firstTick: number;
  readonly rows: readonly Float32Array[];
  readonly hands: readonly { readonly tick: number; readonly hand: HandMessage }[];
  readonly events: readonly { readonly tick: number; readonly name: string; readonly subject: string }[];
}

function readAll(): Recorded {
  const recording = new Recording(file);
  const { header } = recording;
  const rows: Float32Array[] = [];
  const hands: { tick: number; hand: HandMessage }[] = [];
  const events: { tick: number; name: string; subject: string }[] = [];
  const take = {
    rows: ({ count, ticks, data }: RowsBlock) => {
      for (let r = 0; r < count; r += 1) {
        if (ticks[r]! < 0) continue;
        expect(ticks[r]).toBe(rows.length);
        rows.push(Float32Array.from(header.signals, (_, c) => data[c * count + r]!));
      }
    },
    inputs: (block: InputsBlock) => {
      for (let i = 0; i < block.count; i += 1) {
        if (header.links[block.links[i]!] !== 'hands') continue;
        const hand = readHand(block.bytes.subarray(block.offsets[i], block.offsets[i + 1]));
        hands.push({ tick: block.ticks[i]!, hand: hand! });
      }
    },
    events: (block: EventsBlock) => {
      for (let i = 0; i < block.count; i += 1)
        events.push({
          tick: block.ticks[i]!,
          name: header.events.kinds[block.codes[i]!]!.name,
          subject: header.events.subjects[block.subjects[i]!]!,
        });
    },
  };
  for (const block of recording.blocks()) if (block.kind in take) take[block.kind as keyof typeof take](block as never);
  recording.close();
  return { paths: header.signals.map((signal) => signal.path), firstTick: 0, rows, hands, events };
}

/** Waits for the page's address, which goes to standard error beside `--json`. */
async function addressOf(child: ReturnType<typeof startCommand>): Promise<URL> {
  let said = '';
  for await (const chunk of child.stderr!) {
    said += String(chunk);
    const found = /live page (http:\S+)/.exec(said);
    if (found !== null) return new URL(found[1]!);
  }
  throw new Error(`no address of a live page: ${said}`);
}

/** A busy computer may take its time. */
async function find<T extends ServerMessage>(
  client: PageClient,
  wanted: (message: ServerMessage) => message is T,
): Promise<T> {
  for (let tries = 0; ; tries += 1) {
    try {
      return await client.find(wanted);
    } catch (error) {
      if (tries === 5 || client.closeCode !== 0) throw error;
    }
  }
}

async function connect(url: URL): Promise<PageClient> {
  for (let tries = 0; ; tries += 1) {
    try {
      return await PageClient.connect(Number(url.port));
    } catch (error) {
      // it is being built
      if (tries === 300) throw error;
      await pause(100);
    }
  }
}

const here = whyNotLive();
if (here !== '') console.log(`not run: a live run with its page: ${here}`);
describe.skipIf(here !== '')('a live run with its page', () => {
  let result: ChildResult;
  let summary: RunSummary;
  let recorded: Recorded;
  let hello: Hello;
  let page: PageClient;
  let others: PageClient[];
  const answers = new Map<string, Answer['acknowledgement']>();
  let warned: LiveStatus;
  let acknowledged: LiveStatus;
  let placeholder: { status: number; text: string };

  beforeAll(async () => {
    const child = startCommand([
      ...['run', truck, '--pace', 'live', '--for', '10min', '--controller', 'module', '--json', '--record', file],
      ...['--page', '127.0.0.1:0', '--control'],
    ]);
    running = child;
    let output = '';
    child.stdout!.setEncoding('utf8').on('data', (text: string) => (output += text));
    const url = await addressOf(child);
    const early = await fetch(new URL('/', url.origin));
    placeholder = { status: early.status, text: await early.text() };
    const end = finished(child);
    page = await connect(url);
    hello = await find(page, isHello);
    page.send({ type: 'subscribe', subscription: 1, signals: hello.signals.map((_, i) => i) });
    others = await Promise.all(Array.from({ length: 9 }, () => connect(url)));
    others.forEach((other, i) => {
      other.send({ type: 'subscribe', subscription: i, signals: hello.signals.map((_, k) => k) });
      if (i === 0) other.socket.pause();
    });
    let request = 1;
    const ask = async (name: string, message: (number: number) => Parameters<PageClient['send']>[0]) => {
      const number = (request += 1);
      page.send(message(number));
      const found = await find(page, (one): one is Answer => one.type === 'answer' && one.request === number);
      answers.set(name, found.acknowledgement);
    };
    const order = (name: string, command: HandCommand) =>
      ask(name, (number) => ({ type: 'command', request: number, who: 'the tester', command }));
    const status = async (wanted: (status: LiveStatus) => boolean) =>
      (await find(page, (one): one is StatusMessage => isStatus(one) && wanted(one.status))).status;

    await order('without token', { kind: 'set', path: 'driver.accelerator', value: 1 });
    await ask('wrong token', (number) => ({ type: 'token', request: number, token: 'not the token at all' }));
    await order('after the wrong token', { kind: 'scenario', action: 'end' });
    const token = new URLSearchParams(url.hash.slice(1)).get('token')!;
    await ask('token', (number) => ({ type: 'token', request: number, token }));
    await status((now) => now.run.tick > 20);
    await order('note', { kind: 'note', text: 'the oil looks milky' });
    await order('hold', { kind: 'scenario', action: 'hold' });
    await order('pedal', { kind: 'set', path: 'driver.accelerator', value: 0.375 });
    await pause(300);
    await order('renewed', { kind: 'set', path: 'driver.accelerator', value: 0.375 });
    await order('leak', { kind: 'set', path: 'highAccumulator.gasLeak', value: 10 });
    warned = await status((now) => now.warnings.some((warning) => warning.path === 'highAccumulator.pressure'));
    await order('acknowledge', {
      kind: 'acknowledge',
      warning: warned.warnings.find((warning) => warning.path === 'highAccumulator.pressure')!.identifier,
    });
    acknowledged = await status((now) => now.warnings.some((warning) => warning.acknowledged));
    await order('no leak', { kind: 'set', path: 'highAccumulator.gasLeak', value: 0 });
    await order('outside', { kind: 'set', path: 'driver.accelerator', value: 2 });
    await order('continue', { kind: 'scenario', action: 'continue' });
    await status((now) => now.run.tick > answers.get('continue')!.tick + 500);
    others[0]!.socket.resume();
    await order('end', { kind: 'scenario', action: 'end' });
    result = await end;
    result = { ...result, output };
    summary = JSON.parse(output) as RunSummary;
    recorded = readAll();
  });

  it('says before the bench is built that it is being built', () => {
    expect(placeholder.status).toBe(503);
    expect(placeholder.text).toContain('being built');
  });

  it('shows what the recording holds: least and greatest value over the very same ticks', () => {
    expect(hello.signals.map((signal) => signal.path)).toEqual(recorded.paths);
    let compared = 0;
    for (const frame of page.received.filter(isFrame)) {
      const [starts, least, most] = [doublesOf(frame.ticks), floatsOf(frame.least), floatsOf(frame.most)];
      for (let k = 0; k < starts.length; k += 1) {
        const from = starts[k]!;
        const to = (k + 1 < starts.length ? starts[k + 1]! : frame.to + 1) - 1;
        if (from < frame.from) continue;
        for (let c = 0; c < recorded.paths.length; c += 1) {
          let low = recorded.rows[from]![c]!;
          let high = low;
          for (let tick = from + 1; tick <= to; tick += 1) {
            low = Math.min(low, recorded.rows[tick]![c]!);
            high = Math.max(high, recorded.rows[tick]![c]!);
          }
          if (low !== least[c * starts.length + k] || high !== most[c * starts.length + k])
            expect.fail(
              `${recorded.paths[c]} over ${from} .. ${to}: ${least[c * starts.length + k]} .. ${most[c * starts.length + k]} on the page, ${low} .. ${high} in the recording`,
            );
          compared += 1;
        }
      }
    }
    expect(compared).toBeGreaterThan(10 * recorded.paths.length);
    expect(page.received.filter(isFrame).at(-1)!.to).toBeGreaterThan(recorded.rows.length - 100);
  });

  it('refuses hands without the token, and with a wrong one', () => {
    expect(hello.control).toBe('token');
    for (const name of ['without token', 'wrong token', 'after the wrong token'])
      expect(answers.get(name)).toMatchObject({ ok: false, tick: -1 });
    expect(answers.get('token')).toMatchObject({ ok: true });
    expect(recorded.hands.every(({ hand }) => hand.value !== 1)).toBe(true);
  });

  it('has each hand act in the tick of the record that it names', () => {
    const column = (path: string) => recorded.paths.indexOf(path);
    const value = (path: string, tick: number) => recorded.rows[tick]![column(path)]!;
    const at = (name: string) => {
      const answer = answers.get(name)!;
      expect(answer).toMatchObject({ ok: true });
      return answer.tick;
    };
    const done = recorded.hands.map(({ tick, hand }) => [tick, hand.kind, hand.text.who]);
    for (const [name, kind] of [
      ['note', HAND.note],
      ['hold', HAND.scenario],
      ['pedal', HAND.set],
      ['leak', HAND.set],
      ['acknowledge', HAND.acknowledge],
      ['no leak', HAND.release],
    ] as const)
      expect(done).toContainEqual([at(name), kind, 'the tester']);
    expect(recorded.hands.find(({ hand }) => hand.kind === HAND.note)!.hand.text.said).toBe('the oil looks milky');
    for (const name of ['pedal', 'renewed']) expect(value('driver.accelerator', at(name))).toBe(0.375);
    expect(value('driver.accelerator', at('pedal') - 1)).not.toBe(0.375);
    expect(value('highAccumulator.gasLeak', at('leak'))).toBe(10);
    expect(value('highAccumulator.gasLeak', at('no leak') - 1)).toBe(10);
    expect(value('highAccumulator.gasLeak', at('no leak'))).toBe(0);
    expect(answers.get('outside')).toMatchObject({ ok: false });
  });

  it('holds a pedal as long as it is renewed in time, and no longer', () => {
    const column = recorded.paths.indexOf('driver.accelerator');
    const sets = recorded.hands.filter(({ hand }) => hand.kind === HAND.set && hand.deadMan > 0);
    const ends = recorded.events.filter(
      ({ name, subject }) =>
        (name === handEventNames.lapses || name === handEventNames.releases) && subject === 'driver.accelerator',
    );
    expect(sets.map(({ tick }) => tick)).toEqual([answers.get('pedal')!.tick, answers.get('renewed')!.tick]);
    for (const { tick, hand } of sets) {
      const end = ends.find((event) => event.tick > tick)!.tick;
      const renewed = sets.findLast((other) => other.tick < end)!.tick;
      expect(end).toBeLessThanOrEqual(renewed + hand.deadMan + 1);
      for (let at = tick; at < end; at += 1) expect(recorded.rows[at]![column]).toBe(0.375);
      expect(recorded.rows[end]![column]).not.toBe(0.375);
    }
  });

  it('holds the scenario: its time stands, and goes on where it stood', () => {
    const time = recorded.paths.indexOf('scenario.time');
    const [from, to] = [answers.get('hold')!.tick, answers.get('continue')!.tick];
    const stood = recorded.rows[from - 1]![time]!;
    for (let tick = from; tick < to; tick += 1) expect(recorded.rows[tick]![time]).toBe(stood);
    expect(recorded.rows[to]![time]).toBeCloseTo(stood + 0.001, 5);
  });

  it('ends the run in the tick of the hand that ends it, and says so', () => {
    expect(answers.get('end')).toMatchObject({ ok: true, tick: recorded.rows.length - 1 - afterRun });
    expect(summary).toMatchObject({ ending: 'stopped' });
  });

  it('acknowledges a warning', () => {
    expect(warned.warnings.find((warning) => warning.path === 'highAccumulator.pressure')).toMatchObject({
      level: 'below precharge',
      active: true,
      acknowledged: false,
    });
    expect(acknowledged.warnings.find((warning) => warning.path === 'highAccumulator.pressure')!.acknowledged).toBe(
      true,
    );
    expect(summary.warnings.find((warning) => warning.path === 'highAccumulator.pressure')!.acknowledged).toBe(true);
  });

  it('says in its verdict that there was a hand in the run', () => {
    expect(result.code).toBe(3);
    expect(summary).toMatchObject({ verdict: 'not valid', valid: false });
    expect(summary.reasons.filter(({ reason }) => reason === 'hand in the run').map(({ what }) => what)).toEqual([
      expect.stringMatching(/^scenario by hand of the tester, 3 times/),
      expect.stringMatching(/^driver\.accelerator by hand of the tester/),
      expect.stringMatching(/^highAccumulator\.gasLeak by hand of the tester, 2 times/),
    ]);
  });

  it('owns up to every row, whatever ten pages do, of which one does not read', () => {
    expect(result.output.trimEnd().split('\n')).toHaveLength(1);
    expect(recorded.rows.length - afterRun + summary.rowsLost).toBe(Math.round(summary.simulated * 1000));
    expect(summary.rowsLost).toBe(0);
    const statuses = page.received.filter(isStatus);
    expect(Math.max(...statuses.map((one) => one.clients))).toBe(10);
    expect(statuses.at(-1)!.status).toMatchObject({
      run: { phase: 'ended', droppedRows: 0 },
      scenario: { state: 'ended' },
    });
  });

  it('tells of messages, timing and requirements', () => {
    const { status } = page.received.filter(isStatus).at(-1)!;
    expect(status.messages).toHaveLength(hello.bench.messages.length);
    for (const message of status.messages) {
      expect(message.count).toBeGreaterThan(50);
      expect(message).toMatchObject({ lost: 0, late: 0, malformed: 0, timedOut: false });
    }
    const counted = status.timing.stepTime.counts.reduce((sum, count) => sum + count, 0);
    expect(counted).toBe(recorded.rows.length - afterRun);
    expect(hello.bench.requirements.map(({ name }) => name)).toEqual(summary.requirements.map(({ id }) => id));
    expect(status.requirements).toHaveLength(summary.requirements.length);
    expect(status.requirements.some(({ verdict }) => verdict === 'holds so far')).toBe(true);
  });

  it('ends every page cleanly', () => {
    expect([page, ...others].map(({ closeCode }) => closeCode)).toEqual(Array(10).fill(1001));
  });

  it('is derived again from its record, hands and all', async () => {
    const derived = await runCommand('rederive', file, '--json');
    expect(derived.code).toBe(0);
    expect(JSON.parse(derived.output)).toMatchObject({ identical: true, missing: 0, hash: summary.stateHash });
  });

  it('is looked back at in the same page, with what hands did', async () => {
    const child = startCommand(['view', file, '--page', '127.0.0.1:0']);
    let said = '';
    for await (const chunk of child.stdout!) if ((said += String(chunk)).includes('\n')) break;
    const end = finished(child);
    const client = await connect(new URL(said.trim()));
    const opened = await find(client, (message): message is Opened => message.type === 'opened');
    expect(opened).toMatchObject({ name: 'live.osrec', firstTick: 0, lastTick: recorded.rows.length - 1 });
    expect(opened.events.subjects).toContain('the oil looks milky (the tester)');
    const asked = answers.get('pedal')!.tick;
    client.send({ type: 'moment', request: 77, tick: asked });
    const moment = await find(
      client,
      (message): message is StatusMessage => isStatus(message) && message.request === 77,
    );
    expect(moment.status.run).toMatchObject({ phase: 'recorded', tick: asked, hands: 3 });
    client.send({
      type: 'history',
      request: 78,
      signals: [opened.signals.findIndex(({ path }) => path === 'driver.accelerator')],
      from: asked - 1,
      to: asked,
      bins: 2,
    });
    const history = await find(client, (message): message is HistoryAnswer => message.type === 'history');
    expect([...floatsOf(history.most)][1]).toBe(0.375);
    client.close();
    child.kill('SIGTERM');
    expect((await end).code).toBe(0);
  });
});
