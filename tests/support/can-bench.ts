import { DatagramQueue, MemoryTransport } from '../../bridge/memory-transport.js';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { emptyScript, type ScriptSpec } from '../../runtime/script.js';

const head = `bench: CAN bench of the tests
about: a line, an orifice, a tank; invented
step: 1 ms
fluids: { oil: { is: mineral-oil, grade: VG 46 } }
stores:
  highLine: { is: oil-volume, volume: 0.4 L, start: { pressure: 200 bar(g) } }
  tank: { is: tank, volume: 30 L }
branches:
  drain: { is: orifice, from: highLine, to: tank, area: 1 mm2 }
`;
const usualLinks = 'links: { bus: { is: can, interface: vcan0, bitRate: 250 kbit/s } }\n';

/** A small bench of the real catalogue with messages on a CAN link whose frames are in memory. */
export function canBench(text: string, changes: Partial<ScriptSpec> = {}, links = usualLinks) {
  const spec = readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': head + links + text }));
  const assembly = assemble(spec, { seed: 1, script: { ...emptyScript, ...changes } });
  const toBench = new DatagramQueue(4096, 72);
  const fromBench = new DatagramQueue(4096, 72);
  assembly.exchange.attach('bus', new MemoryTransport(toBench, fromBench));
  const heard = (): { identifier: number; data: string }[] => {
    const all: { identifier: number; data: string }[] = [];
    const into = new Uint8Array(72);
    for (let size = fromBench.shift(into); size >= 0; size = fromBench.shift(into))
      all.push({
        identifier: new DataView(into.buffer).getUint32(0, true) & 0x1fffffff,
        data: Buffer.from(into.subarray(8, 8 + into[4]!)).toString('hex'),
      });
    return all;
  };
  let tick = assembly.firstTick;
  const run = (ticks: number): void => {
    for (let i = 0; i < ticks; i += 1) assembly.tick.run(tick++);
  };
  return {
    spec,
    assembly,
    run,
    heard,
    put: (frame: Uint8Array) => toBench.push(frame, frame.length),
    value: (path: string): number => {
      const index = assembly.table.find(path);
      if (index < 0) throw new Error(`no signal ${path}`);
      return assembly.signals[index]!;
    },
    command: (path: string, value: number) => {
      const slot = assembly.target(path);
      if (slot < 0) throw new Error(`no command ${path}`);
      assembly.block[slot] = value;
    },
  };
}
