import fs from 'node:fs';
import path from 'node:path';
import { cHeader } from '../../../bridge/c-header.js';
import { CanCodec } from '../../../bridge/can-codec.js';
import type { MessageSpec } from '../../../bridge/message-map.js';
import { makeProtector } from '../../../bridge/protection/make.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { Clock } from '../../../runtime/realtime/clock.js';
import type { Part } from '../part.js';
import { copyBench, median } from '../workshop.js';

const ROUNDS = 1_000_000;
const TURNS = 3;
/** Message, and the two of its signals that move. */
const measured = [
  ['hydraulicStatus', 'highPressure', 'displacement'],
  ['vehicleStatus', 'speed', 'accelerator'],
] as const;

type Costs = Record<string, readonly [pack: number, unpack: number]>;

/** Packing and unpacking of CAN payloads, protection included, beside C -O2 of the same messages (processor time). */
export const codec: Part = {
  name: 'codec',
  about: 'a CAN message packed and unpacked, with its protection, beside C -O2 of the header that wire writes',
  async run({ say, workshop }) {
    const bench = path.join(path.dirname(copyBench(workshop, 'harbour-truck')), 'bench-can.yaml');
    const { map, name } = readBench(bench, catalogue);
    fs.writeFileSync(workshop.file('messages.h'), cHeader(map, name));
    const refused = workshop.compile('codec.c', 'codec');
    const own = measured.map(([message, ...moving]) =>
      ownCodec(map.messages.find((one) => one.name === message)!, moving),
    );
    for (const one of own) one();
    const turns: { own: Costs; c: Costs | undefined }[] = [];
    for (let turn = 0; turn < TURNS; turn += 1) {
      say(`turn ${turn + 1} of ${TURNS}`);
      turns.push({
        own: Object.fromEntries(measured.map(([message], i) => [message, own[i]!()])),
        c:
          refused === ''
            ? (JSON.parse(await workshop.run(workshop.file('codec'), [String(ROUNDS)])) as Costs)
            : undefined,
      });
    }
    const of = (side: 'own' | 'c', message: string, which: 0 | 1): number =>
      median(turns.map((turn) => turn[side]?.[message]?.[which] ?? Number.NaN));
    const ns = (value: number): string => `${value.toFixed(0)} ns`;
    return {
      rows: measured.flatMap(([message]) => [
        {
          what: `${message}, pack and unpack: oilspring`,
          value: `${ns(of('own', message, 0))}, ${ns(of('own', message, 1))}`,
        },
        {
          what: `${message}, pack and unpack: C`,
          value: refused === '' ? `${ns(of('c', message, 0))}, ${ns(of('c', message, 1))}` : `not run: ${refused}`,
        },
      ]),
      numbers: turns,
    };
  },
};

/** Measures one message by our own codec: ns to quantise, write and protect; ns to check and read. */
function ownCodec(message: MessageSpec, moving: readonly string[]): () => [number, number] {
  const codec = new CanCodec(message);
  const protector = makeProtector(message)!;
  const length = message.bytes!;
  const payloads = Array.from({ length: 256 }, () => new Uint8Array(length));
  const values = new Float64Array(codec.count);
  const carried = new Float64Array(codec.count);
  const [first, second] = moving.map((signal) => message.signals.findIndex((one) => one.name === signal)) as [
    number,
    number,
  ];
  const clock = new Clock();
  const times = new Float64Array(3);
  return () => {
    clock.threadTime(times, 0);
    for (let i = 0; i < ROUNDS; i += 1) {
      values[first] = i & 127;
      values[second] = (i & 15) * 0.05;
      codec.quantise(values, 0, carried, 0);
      codec.write(payloads[i & 255]!);
      protector.protect(payloads[i & 255]!, length, i % protector.modulo);
    }
    clock.threadTime(times, 1);
    for (let i = 0; i < ROUNDS; i += 1)
      if (protector.check(payloads[i & 255]!, length) >= 0) codec.read(payloads[i & 255]!, values, 0);
    clock.threadTime(times, 2);
    return [(times[1]! - times[0]!) / ROUNDS, (times[2]! - times[1]!) / ROUNDS];
  };
}
