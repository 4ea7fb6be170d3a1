import { describe, expect, test } from 'vitest';
import { BlockLayout } from '../../runtime/block.js';
import { HandStage, type HandTarget } from '../../runtime/hand.js';
import { createHandRing, HandRing, HandRingWriter } from '../../runtime/hand-ring.js';
import { HAND, type HandMessage, handBytes, readHand, writeHand } from '../../runtime/hand-wire.js';
import { EventCatalogue, type Journal, noJournal } from '../../runtime/journal.js';

const text = { who: 'N.', address: '127.0.0.1', said: '' };
function hand(kind: number, target: number, value = 0, deadMan = 0, request = 1): HandMessage {
  return { kind, target, value, deadMan, request, text };
}

/** Three commands and a pedal; what `others` writes into the commands in a tick goes ahead of the hands. */
function bench(targetCount = 3) {
  const layout = new BlockLayout();
  const events = new EventCatalogue();
  const targets: HandTarget[] = Array.from({ length: targetCount }, (_, i) => ({
    path: `valve${i}.command`,
    unit: '1',
    slot: layout.add(`valve${i}.command`, 0.25),
    signal: -1,
  }));
  targets.push({ path: 'driver.brake', unit: '1', slot: -1, signal: 0 });
  const heldSlot = layout.add('held');
  const acknowledged: number[] = [];
  const stage = new HandStage({
    targets,
    reach: {
      heldSlot,
      scenario: 'hill',
      acknowledge: (_block, warning) => (warning === 0 ? acknowledged.push(warning) : 0),
      warnings: ['highLine.pressure', 'lowLine.pressure'],
    },
    layout,
    events,
    step: 0.001,
    link: 2,
  });
  const block = layout.create();
  const signals = new Float64Array(1);
  const ring = createHandRing();
  const writer = new HandRingWriter(ring);
  stage.source = new HandRing(ring);
  const said: string[] = [];
  const inputs: { tick: number; link: number; bytes: Uint8Array }[] = [];
  const journal: Journal = {
    ...noJournal,
    input: (tick, link, bytes, length) => inputs.push({ tick, link, bytes: bytes.slice(0, length) }),
    event: (tick, code, subject, a, _b, c) =>
      said.push(`${tick} ${events.kinds[code]!.name} ${events.subjects[subject]} ${a} ${c}`),
  };
  let tick = 0;
  /** One tick as runtime/tick.ts has it. */
  const run = (others: (block: Float64Array) => void = () => {}) => {
    stage.lift(block);
    others(block);
    stage.take(block, tick, journal);
    signals[0] = 0.125;
    stage.applySignals(block, signals);
    stage.apply(block);
    tick += 1;
  };
  return { stage, block, signals, writer, run, said, inputs, heldSlot, acknowledged, targets };
}

describe('hands', () => {
  test('go over what the others say, which counts again in the tick in which the hand lets go', () => {
    const { block, writer, run, said } = bench();
    writer.put(hand(HAND.set, 1, 0.75));
    run((values) => (values[1] = 0.5));
    expect(block[1]).toBe(0.75);
    run((values) => (values[1] = 0.625));
    expect(block[1]).toBe(0.75);
    // nobody says anything in this tick: what was said last still counts below
    writer.put(hand(HAND.release, 1, 0, 0, 2));
    run();
    expect(block[1]).toBe(0.625);
    expect([...block.subarray(0, 3)]).toEqual([0.25, 0.625, 0.25]);
    expect(said).toEqual(['0 hand sets, 1 valve1.command 0.75 1', '2 hand lets go valve1.command 0 2']);
  });

  test('a command that nobody else drives goes back to what it was', () => {
    const { block, writer, run } = bench();
    writer.put(hand(HAND.set, 0, 1));
    for (let i = 0; i < 5; i += 1) run();
    expect(block[0]).toBe(1);
    writer.put(hand(HAND.release, 0));
    run();
    expect(block[0]).toBe(0.25);
  });

  test('go over what an instrument says', () => {
    const { signals, writer, run } = bench();
    writer.put(hand(HAND.set, 3, 0.9));
    run();
    expect(signals[0]).toBe(0.9);
    writer.put(hand(HAND.release, 3));
    run();
    expect(signals[0]).toBe(0.125);
  });

  test('let go when they are not renewed in time, to the tick', () => {
    const { block, writer, run, said, stage } = bench();
    writer.put(hand(HAND.set, 2, 0.5, 3));
    for (let i = 0; i < 3; i += 1) run();
    writer.put(hand(HAND.set, 2, 0.5, 3, 2));
    for (let i = 0; i < 4; i += 1) run();
    expect(block[2]).toBe(0.5);
    run();
    expect(block[2]).toBe(0.25);
    expect(block[stage.countSlot]).toBe(0);
    expect(said).toEqual([
      '0 hand sets, 1 valve2.command 0.5 1',
      '3 hand renewed valve2.command 0.5 2',
      '7 hand not renewed valve2.command 0.004 0',
    ]);
  });

  test('are journaled before they act, as inputs behind the links', () => {
    const { writer, run, inputs } = bench();
    writer.put({ ...hand(HAND.note, 0, 0, 0, 7), text: { ...text, said: 'oil looks\nmilky µ' } });
    run();
    expect(inputs.map(({ tick, link }) => [tick, link])).toEqual([[0, 2]]);
    expect(readHand(inputs[0]!.bytes)).toEqual({
      kind: HAND.note,
      request: 7,
      target: 0,
      deadMan: 0,
      value: 0,
      text: { ...text, said: 'oil looks milky µ' },
    });
  });

  test('hold, continue and end the scenario; what is so already is refused', () => {
    const { block, stage, writer, run, said, heldSlot } = bench();
    writer.put(hand(HAND.scenario, 2));
    run();
    writer.put(hand(HAND.scenario, 1));
    run();
    expect(block[heldSlot]).toBe(1);
    writer.put(hand(HAND.scenario, 1));
    writer.put(hand(HAND.scenario, 2));
    writer.put(hand(HAND.scenario, 3));
    writer.put(hand(HAND.scenario, 4));
    run();
    expect(block[heldSlot]).toBe(0);
    expect(block[stage.endedSlot]).toBe(1);
    expect(said.map((line) => line.split(' ').slice(1, 4).join(' '))).toEqual([
      'hand refused: there',
      'scenario held by',
      'hand refused: there',
      'scenario continued by',
      'scenario ended by',
      'hand refused: it',
    ]);
  });

  test('acknowledge a warning; one that is not open is refused', () => {
    const { writer, run, said, acknowledged } = bench();
    for (const warning of [0, 1, 2, -1]) writer.put(hand(HAND.acknowledge, warning));
    run();
    expect(acknowledged).toEqual([0]);
    expect(said[0]).toBe('0 hand acknowledged a warning highLine.pressure 0 1');
    expect(said.slice(1).every((line) => line.includes('hand refused'))).toBe(true);
    expect(said).toHaveLength(4);
  });

  test('hold sixteen targets at most, and come eight a tick', () => {
    const { block, stage, writer, run, said } = bench(20);
    for (let i = 0; i < 18; i += 1) writer.put(hand(HAND.set, i, 1));
    run();
    expect(block[stage.countSlot]).toBe(8);
    run();
    run();
    expect(block[stage.countSlot]).toBe(16);
    expect(said.filter((line) => line.includes('too many hands'))).toHaveLength(2);
    expect([...block.subarray(0, 20)].filter((value) => value === 1)).toHaveLength(16);
  });

  test('what is no hand is refused and changes nothing', () => {
    const { block, stage, writer, run, said } = bench();
    const before = block.slice();
    for (const wrong of [hand(HAND.set, -1, 1), hand(HAND.set, 4, 1), hand(HAND.set, 0, Number.NaN), hand(9, 0, 1)])
      writer.put(wrong);
    writer.put(hand(HAND.set, 0, Number.POSITIVE_INFINITY));
    run();
    expect(block).toEqual(before);
    expect(said.every((line) => line.includes('hand refused: it was not understood'))).toBe(true);
    expect(said).toHaveLength(5);
    expect(stage.source.poll(new Uint8Array(handBytes.most))).toBe(-1);
  });

  test('text that does not fit is cut, and bytes that are no hand are not read', () => {
    const bytes = new Uint8Array(handBytes.most);
    const length = writeHand({ ...hand(HAND.note, 0), text: { ...text, said: 'x'.repeat(20_000) } }, bytes);
    expect(length).toBe(handBytes.most);
    expect(readHand(bytes)?.text.said).toHaveLength(handBytes.most - handBytes.head - 'N.\n127.0.0.1\n'.length);
    expect(readHand(bytes.subarray(0, 20))).toBeUndefined();
    expect(readHand(bytes.subarray(0, 100))).toBeUndefined();
  });
});
