import { describe, expect, it } from 'vitest';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { readScenario } from '../../configs/scenario.js';
import { type Journal, noJournal } from '../../runtime/journal.js';
import { loadController, moduleBarrier } from '../../tools/loop/controller-module.js';

const folder = new URL('../../configs/harbour-truck/', import.meta.url).pathname;

function build(file: string) {
  const spec = readBench(`${folder}${file}`, catalogue);
  const { script } = readScenario(`${folder}${spec.duty}`, spec);
  return { spec, assembly: assemble(spec, { seed: 1, script }) };
}

async function drive(file: string, ticks: number) {
  const { spec, assembly } = build(file);
  const factory = await loadController(folder, 'controller.js');
  const { barrier, transports } = moduleBarrier(
    spec.map,
    assembly.exchange.checksum,
    factory,
    spec.step,
    spec.controller!.period,
  );
  for (const { link, transport } of transports) assembly.exchange.attach(link, transport);
  const inputs: { tick: number; bytes: Uint8Array }[] = [];
  const journal: Journal = {
    ...noJournal,
    input: (tick, _link, bytes, length) => inputs.push({ tick, bytes: bytes.slice(0, length) }),
  };
  assembly.exchange.setJournal(journal);
  for (let tick = assembly.firstTick; tick < ticks; tick += 1) {
    assembly.tick.run(tick);
    barrier.end(tick);
  }
  const value = (path: string): number => assembly.signals[assembly.table.find(path)]!;
  return { assembly, value, inputs, hash: [...assembly.tick.hash] };
}

describe('the harbour truck on CAN, its controller in memory', () => {
  it('drives as over UDP, every frame used, and is derived again from its frames', async () => {
    const ticks = 6000;
    const can = await drive('bench-can.yaml', ticks);
    const udp = await drive('bench.yaml', ticks);
    // Answers of the controller in every fifth tick; its first falls due in tick -999 or after.
    for (const message of ['hydraulicRequest', 'drivelineRequest']) {
      expect(can.value(`${message}.received`)).toBeGreaterThan((ticks / 5) * 0.99);
      for (const count of ['lost', 'late', 'duplicate', 'wrongChecksum', 'wrongLength', 'outOfRange'])
        expect([message, count, can.value(`${message}.${count}`)]).toEqual([message, count, 0]);
    }
    expect(can.value('body.velocity')).toBeGreaterThan(1);
    // The same plant and controller; what differs is the resolution of the fields.
    expect(Math.abs(can.value('body.velocity') - udp.value('body.velocity'))).toBeLessThan(0.2);

    const { assembly } = build('bench-can.yaml');
    let next = 0;
    let tick = assembly.firstTick;
    assembly.exchange.attach('powertrain', {
      poll: (into) => {
        const input = can.inputs[next];
        if (!input || input.tick !== tick) return -1;
        next += 1;
        into.set(input.bytes);
        return input.bytes.length;
      },
      send: (_bytes, length) => length,
    });
    for (; tick < ticks; tick += 1) assembly.tick.run(tick);
    expect([...assembly.tick.hash]).toEqual(can.hash);
  });
});
