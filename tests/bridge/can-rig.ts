import { CanCodec } from '../../bridge/can-codec.js';
import { frameFlags, frameSizes, identifierFlags, payloadAt, writeFrameHead } from '../../bridge/can-frame.js';
import { Exchange, type ExchangeOptions } from '../../bridge/exchange.js';
import { DatagramQueue, MemoryTransport } from '../../bridge/memory-transport.js';
import type { CanLayout, LinkSpec, MapSignal, MessageMap, MessageSpec } from '../../bridge/message-map.js';
import { makeProtector } from '../../bridge/protection/make.js';
import { BlockLayout } from '../../runtime/block.js';
import { EventCatalogue, type Journal } from '../../runtime/journal.js';
import { SignalTable } from '../../runtime/signals.js';
import { message, signal } from './sample-map.js';

export const layout: CanLayout = {
  startBit: 0,
  length: 8,
  byteOrder: 'little',
  signed: false,
  float: false,
  scale: 1,
  offset: 0,
};

export function field(
  name: string,
  path: string,
  can: Partial<CanLayout>,
  changes: Partial<MapSignal> = {},
): MapSignal {
  return signal(name, path, { least: -1e9, most: 1e9, ...changes, can: { ...layout, ...can } });
}

export function frameMessage(
  name: string,
  identifier: number,
  direction: 'sent' | 'received',
  signals: readonly MapSignal[],
  changes: Partial<MessageSpec> = {},
): MessageSpec {
  return message(name, identifier, direction, signals, {
    bytes: 8,
    link: 'bus',
    outOfRange: direction === 'sent' ? 'saturate' : 'refuse',
    ...changes,
  });
}

export function canMap(
  messages: readonly MessageSpec[],
  links: readonly LinkSpec[] = [{ name: 'bus', kind: 'can', interface: 'vcan0' }],
): MessageMap {
  return { links, messages };
}

/** A pressure and a speed out (classic, and FD with a profile), a torque request and a multiplexed tuning message in. */
export function sampleCanMap(): MessageMap {
  return canMap([
    frameMessage(
      'pressures',
      0x120,
      'sent',
      [
        field(
          'high',
          'highLine.pressure',
          { startBit: 24, length: 16, scale: 0.01 },
          { unit: 'bar(a)', unitScale: 1e5, least: 0, most: 450 },
        ),
        field(
          'low',
          'lowLine.pressure',
          { startBit: 40, length: 12, scale: 0.02 },
          { unit: 'bar(a)', unitScale: 1e5, least: 0, most: 50 },
        ),
      ],
      { protection: { kind: 'e2e-5', settings: { dataId: 0x1234 } } },
    ),
    frameMessage(
      'speeds',
      0x18ff0102,
      'sent',
      [
        field(
          'shaft',
          'propShaft.speed',
          { startBit: 7, length: 16, byteOrder: 'big', signed: true },
          { least: -6000, most: 6000 },
        ),
      ],
      { extended: true, flexibleDataRate: true, bitRateSwitch: true, bytes: 12, every: 10, phase: 3 },
    ),
    frameMessage(
      'requests',
      0x200,
      'received',
      [
        field(
          'torque',
          'pumpMotor.torqueRequest',
          { startBit: 16, length: 16, signed: true, scale: 0.1 },
          { least: -800, most: 800 },
        ),
        field('valve', 'isolation.open', { startBit: 32, length: 1 }, { least: 0, most: 1 }),
      ],
      { protection: { kind: 'e2e-1', settings: { dataId: 0x123 } } },
    ),
    frameMessage(
      'tuning',
      0x201,
      'received',
      [
        field('page', '', { length: 8, selector: true }, { least: 0, most: 255 }),
        field(
          'gain',
          'strategy.gain',
          { startBit: 8, length: 16, selectedBy: { signal: 'page', values: [[1, 1]] } },
          { least: 0, most: 65535 },
        ),
        field(
          'limit',
          'strategy.limit',
          { startBit: 8, length: 16, selectedBy: { signal: 'page', values: [[2, 4]] } },
          { least: 0, most: 65535, substitute: 7 },
        ),
      ],
      { every: 10, timeout: 100 },
    ),
  ]);
}

/** An exchange on CAN links whose frames are in memory. */
export class CanRig {
  readonly layout = new BlockLayout();
  readonly signals = new SignalTable();
  readonly events = new EventCatalogue();
  readonly commands = new Map<string, number>();
  readonly exchange: Exchange;
  readonly block: Float64Array;
  readonly values: Float64Array;
  readonly toBench: DatagramQueue;
  readonly fromBench: DatagramQueue;
  readonly seen: { tick: number; name: string; subject: string; a: number; b: number }[] = [];
  readonly inputs: { tick: number; link: number; bytes: Uint8Array }[] = [];

  constructor(
    readonly map: MessageMap,
    options: Partial<ExchangeOptions> = {},
  ) {
    for (const one of map.messages)
      for (const { path } of one.signals) {
        if (path === '' || this.signals.find(path) >= 0) continue;
        this.signals.add({ path, unit: '1', about: '', group: one.direction === 'sent' ? 'reading' : 'command' });
        if (one.direction === 'received') this.commands.set(path, this.layout.add(path, Number.NaN));
      }
    this.exchange = new Exchange({
      map,
      layout: this.layout,
      signals: this.signals,
      events: this.events,
      targets: { find: (path) => this.commands.get(path) ?? -1 },
      step: 1e-3,
      ...options,
    });
    this.block = this.layout.create();
    this.values = new Float64Array(this.signals.length);
    this.toBench = new DatagramQueue(20_000, frameSizes.flexible);
    this.fromBench = new DatagramQueue(4096, frameSizes.flexible);
    this.exchange.attach(map.links[0].name, new MemoryTransport(this.toBench, this.fromBench));
    const journal: Journal = {
      row() {},
      snapshot() {},
      input: (tick, link, bytes, length) => this.inputs.push({ tick, link, bytes: bytes.slice(0, length) }),
      event: (tick, code, subject, a, b) =>
        this.seen.push({ tick, name: this.events.kinds[code].name, subject: this.events.subjects[subject], a, b }),
    };
    this.exchange.setJournal(journal);
  }

  /** A frame of a message as its sender writes it; values in units of the map. */
  frame(name: string, values: readonly number[], counter = 0): Uint8Array {
    const spec = this.map.messages.find((one) => one.name === name)!;
    const codec = new CanCodec(spec);
    const frame = new Uint8Array(spec.flexibleDataRate ? frameSizes.flexible : frameSizes.classic);
    codec.quantise(Float64Array.from(values), 0, new Float64Array(codec.count), 0);
    const payload = frame.subarray(payloadAt);
    const length = codec.write(payload);
    makeProtector(spec)?.protect(payload, length, counter);
    writeFrameHead(
      frame,
      spec.identifier | (spec.extended ? identifierFlags.extended : 0),
      length,
      spec.flexibleDataRate ? frameFlags.flexible : 0,
    );
    return frame;
  }

  /** Puts bytes on the bus to the bench. */
  put(bytes: Uint8Array): void {
    this.toBench.push(bytes, bytes.length);
  }

  say(name: string, values: readonly number[], counter = 0): void {
    this.put(this.frame(name, values, counter));
  }

  /** Frames that the bench has sent since the last call. */
  heard(): Uint8Array[] {
    const all: Uint8Array[] = [];
    const into = new Uint8Array(frameSizes.flexible);
    for (let size = this.fromBench.shift(into); size >= 0; size = this.fromBench.shift(into))
      all.push(into.slice(0, size));
    return all;
  }

  take(tick: number): void {
    this.exchange.take(this.block, this.values, tick);
  }

  publish(tick: number): void {
    this.exchange.publish(this.block, this.values, tick);
  }

  value(path: string): number {
    const index = this.signals.find(path);
    if (index < 0) throw new Error(`no signal ${path}`);
    return this.values[index];
  }

  set(path: string, value: number): void {
    this.values[this.signals.find(path)] = value;
  }

  command(path: string): number {
    return this.block[this.commands.get(path)!];
  }
}
