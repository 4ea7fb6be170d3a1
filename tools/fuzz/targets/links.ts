import path from 'node:path';
import { frameSizes, identifierFlags, identifierWord, payloadAt } from '../../../bridge/can-frame.js';
import { crc32 } from '../../../bridge/checksums.js';
import { makeProtector } from '../../../bridge/protection/make.js';
import type { Transport } from '../../../bridge/transport.js';
import { header } from '../../../bridge/udp-layout.js';
import { type Assembly, assemble } from '../../../configs/assemble.js';
import { noJournal } from '../../../runtime/journal.js';
import { loadController, moduleBarrier, packageRoot } from '../../loop/controller-module.js';
import { readBenchFile } from '../../run/plan.js';
import type { Target } from '../fuzzer.js';

/** What the demo controller of a bench says in its first ticks. */
async function spoken(assembly: Assembly, folder: string): Promise<Uint8Array[]> {
  const { spec } = assembly;
  const factory = await loadController(folder, spec.controller!.module!);
  const { barrier, transports } = moduleBarrier(
    spec.map,
    assembly.exchange.checksum,
    factory,
    spec.step,
    spec.controller!.period ?? 1,
  );
  const heard = new Map<string, Uint8Array>();
  for (const { link, transport } of transports) {
    const between: Transport = {
      poll: (into) => {
        const length = transport.poll(into);
        // one of each message: told apart by length and first bytes
        if (length > 0) heard.set(`${length} ${into.slice(0, 8)}`, into.slice(0, length));
        return length;
      },
      send: (bytes, length) => transport.send(bytes, length),
    };
    assembly.exchange.attach(link, between);
  }
  for (let tick = assembly.firstTick; tick < assembly.firstTick + 60; tick += 1) {
    assembly.tick.run(tick);
    barrier.end(tick);
  }
  assembly.reset();
  return [...heard.values()];
}

/** The exchange of a bench, from what comes in on its first link to the values that the plant is told. */
async function exchangeTarget(name: string, about: string, file: string): Promise<Target> {
  const { spec, folder } = readBenchFile(path.join(packageRoot(), 'configs', 'harbour-truck', file));
  const assembly = assemble(spec, { seed: 1 });
  const seeds = await spoken(assembly, folder);
  const { exchange, block, signals, table } = assembly;
  exchange.setJournal(noJournal);
  let waiting: Uint8Array | undefined;
  exchange.attach(spec.map.links[0]!.name, {
    poll: (into) => {
      if (waiting === undefined) return -1;
      const length = Math.min(waiting.length, into.length);
      for (let i = 0; i < length; i += 1) into[i] = waiting[i]!;
      waiting = undefined;
      return length;
    },
    send: (_bytes, length) => length,
  });
  const bounds = spec.map.messages
    .filter((message) => message.direction === 'received')
    .flatMap((message) =>
      message.signals.map((signal) => ({ ...signal, index: table.find(`${message.name}.${signal.name}`) })),
    );
  let tick = 0;
  let count = 0;
  const protectors = new Map(
    spec.map.messages.map((message) => [
      message.identifier | (message.extended ? identifierFlags.extended : 0),
      makeProtector(message),
    ]),
  );
  const udp = spec.map.links[0]!.kind === 'udp';
  return {
    name,
    about,
    seeds,
    words: [],
    longest: 200,
    repair: (input) => {
      count += 1;
      const view = new DataView(input.buffer, input.byteOffset, input.byteLength);
      if (udp) {
        if (input.length < header.length + 4) return;
        view.setUint32(header.sequence, count, true);
        view.setInt32(input.length - 4, crc32(input, 0, input.length - 4), true);
      } else if (input.length >= frameSizes.classic) {
        const room = input.subarray(payloadAt);
        protectors.get(identifierWord(input))?.protect(room, Math.min(input[4]!, room.length), count & 15);
      }
    },
    decode: (input) => {
      waiting = input;
      tick += 1;
      exchange.take(block, signals, tick);
      let far = 0;
      for (const { index, least, most, unitScale, unitOffset, path: to } of bounds) {
        const value = (signals[index]! - (unitOffset ?? 0)) / unitScale;
        // a rounding of the unit's conversion is no fault
        const slack = 1e-9 * Math.max(Math.abs(least), Math.abs(most));
        if (!(value >= least - slack && value <= most + slack))
          throw new Error(`${to} is ${value}, not ${least} .. ${most}`);
        if (value > 1.5 && most > 100) far += 1;
      }
      return { far };
    },
    planted: (found) => (found as { far: number }).far > 0,
  };
}

export const links = async (): Promise<Target[]> => [
  await exchangeTarget('udp', 'a datagram of the controller', 'bench.yaml'),
  await exchangeTarget('can', 'a frame of the controller', 'bench-can.yaml'),
];
