import { Exchange, type ExchangeOptions } from '../../bridge/exchange.js';
import { type DatagramQueue, type MemoryTransport, memoryPair } from '../../bridge/memory-transport.js';
import type { MessageMap } from '../../bridge/message-map.js';
import { Datagram, UdpCodec, writeControl } from '../../bridge/udp-codec.js';
import { BlockLayout } from '../../runtime/block.js';
import { EventCatalogue, type Journal } from '../../runtime/journal.js';
import { SignalTable } from '../../runtime/signals.js';

export interface SeenEvent {
  readonly tick: number;
  readonly name: string;
  readonly subject: string;
  readonly a: number;
  readonly b: number;
}

/** An exchange on a bench that is nothing but the signals its messages carry and the commands they drive. */
export class Rig {
  readonly layout = new BlockLayout();
  readonly signals = new SignalTable();
  readonly events = new EventCatalogue();
  readonly commands = new Map<string, number>();
  readonly exchange: Exchange;
  readonly block: Float64Array;
  readonly values: Float64Array;
  readonly transport: MemoryTransport;
  readonly controller: MemoryTransport;
  readonly seen: SeenEvent[] = [];
  readonly inputs: { tick: number; link: number; bytes: Uint8Array }[] = [];
  private readonly codecs = new Map<string, UdpCodec>();

  constructor(
    readonly map: MessageMap,
    options: Partial<ExchangeOptions> = {},
  ) {
    for (const message of map.messages)
      for (const { path } of message.signals) {
        if (path === '' || this.signals.find(path) >= 0) continue;
        this.signals.add({ path, unit: '1', about: '', group: message.direction === 'sent' ? 'reading' : 'command' });
        if (message.direction === 'received') this.commands.set(path, this.layout.add(path, Number.NaN));
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
    [this.transport, this.controller] = memoryPair(1000);
    this.exchange.attach('powertrain', this.transport);
    this.exchange.setJournal(this.journal());
    for (const message of map.messages) this.codecs.set(message.name, new UdpCodec(message, this.exchange.checksum));
  }

  get toBench(): DatagramQueue {
    return this.transport.incoming;
  }

  /** Puts a message on the wire to the bench; values in units of the map. */
  say(
    name: string,
    values: readonly number[],
    sequence: number,
    tick = 0,
    change?: (datagram: Datagram) => void,
  ): void {
    const codec = this.codec(name);
    const datagram = new Datagram(codec.length + 16);
    if (codec.quantise(Float64Array.from(values), 0, new Float64Array(codec.count), 0) < 0)
      throw new Error('not finite');
    const length = codec.write(datagram, sequence, tick);
    change?.(datagram);
    this.toBench.push(datagram.bytes, length);
  }

  control(kind: number, tick = 0): void {
    const datagram = new Datagram(64);
    this.toBench.push(datagram.bytes, writeControl(datagram, kind, 0, tick, this.exchange.checksum));
  }

  /** Datagrams that the bench has sent since the last call: kind, number, sequence, tick and bytes. */
  heard(): { kind: number; number: number; sequence: number; tick: number; bytes: Uint8Array }[] {
    const all = [];
    const datagram = new Datagram(2048);
    for (
      let length = this.controller.poll(datagram.bytes);
      length >= 0;
      length = this.controller.poll(datagram.bytes)
    ) {
      const { view } = datagram;
      all.push({
        kind: view.getUint8(5),
        number: view.getUint16(6, true),
        sequence: view.getUint32(8, true),
        tick: view.getInt32(12, true),
        bytes: datagram.bytes.slice(0, length),
      });
    }
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

  codec(name: string): UdpCodec {
    return this.codecs.get(name)!;
  }

  private journal(): Journal {
    return {
      row() {},
      snapshot() {},
      input: (tick, link, bytes, length) => this.inputs.push({ tick, link, bytes: bytes.slice(0, length) }),
      event: (tick, code, subject, a, b) =>
        this.seen.push({ tick, name: this.events.kinds[code].name, subject: this.events.subjects[subject], a, b }),
    };
  }
}
