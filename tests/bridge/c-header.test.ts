import { spawn, spawnSync } from 'node:child_process';
import { copyFileSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import fc from 'fast-check';
import { afterAll, describe, expect, it } from 'vitest';
import { cHeader } from '../../bridge/c-header.js';
import { crc32 } from '../../bridge/checksums.js';
import { LockstepTransport } from '../../bridge/lockstep.js';
import { mapTable } from '../../bridge/map-table.js';
import { Datagram, fieldVerdicts, UdpCodec, UdpInbox, verdicts } from '../../bridge/udp-codec.js';
import { kinds, mapChecksum } from '../../bridge/udp-layout.js';
import { UdpSocket } from '../../bridge/udp-socket.js';
import { Rig } from './rig.js';
import { mapOf, message, sampleMap, signal } from './sample-map.js';

const found = (name: string): boolean => spawnSync(name, ['--version']).status === 0;
const compilers = { cc: found('cc'), 'c++': found('c++') };
const mustRun = process.env.CI === 'true';
const missing = Object.entries(compilers)
  .filter(([, here]) => !here)
  .map(([name]) => name);
if (missing.length > 0 && !mustRun)
  console.log(`not run: the C header through ${missing.join(' and ')}: no such compiler on this machine`);

const strict = ['-Wall', '-Wextra', '-Wpedantic', '-Wconversion', '-Wshadow', '-Werror', '-O1'];
const folder = mkdtempSync(join(tmpdir(), 'oilspring-header-'));
afterAll(() => rmSync(folder, { recursive: true }));

function compile(compiler: string, flags: readonly string[], source: string, output: string): void {
  const done = spawnSync(compiler, [...flags, ...strict, '-o', output, source], { cwd: folder, encoding: 'utf8' });
  expect(done.stderr).toBe('');
  expect(done.status).toBe(0);
}

const map = sampleMap();
writeFileSync(join(folder, 'messages.h'), cHeader(map, 'bench of the tests */ /* with \\'));
copyFileSync(new URL('c/controller.c', import.meta.url), join(folder, 'controller.c'));

const frame = (bytes: Uint8Array): Buffer =>
  Buffer.concat([Buffer.from([bytes.length & 255, bytes.length >> 8]), bytes]);

function exchangeWith(program: string, datagrams: readonly Uint8Array[]): Uint8Array[] {
  const done = spawnSync(program, ['pipe'], { input: Buffer.concat(datagrams.map(frame)), maxBuffer: 1 << 26 });
  expect(done.status).toBe(0);
  const answers: Uint8Array[] = [];
  for (let at = 0; at < done.stdout.length; ) {
    const length = done.stdout.readUInt16LE(at);
    answers.push(Uint8Array.from(done.stdout.subarray(at + 2, at + 2 + length)));
    at += 2 + length;
  }
  return answers;
}

describe.each([
  ['cc', ['-std=c11']],
  ['c++', ['-std=c++11', '-x', 'c++']],
] as const)('header through %s', (compiler, flags) => {
  const here = compilers[compiler] || mustRun;
  const program = join(folder, `controller-${compiler}`);

  it.runIf(here)('compiles without a warning and understands every datagram, and is understood', () => {
    compile(compiler, flags, 'controller.c', program);
    const checksum = mapChecksum(map);
    const codec = (name: string): UdpCodec => new UdpCodec(map.messages.find((one) => one.name === name)!, checksum);
    const pressures = codec('pressures');
    const requests = codec('requests');
    const inbox = new UdpInbox([requests, codec('gear')], checksum);
    const sent: Uint8Array[] = [];
    const expected: [number, number][] = [];
    const carried = new Float64Array(4);
    for (const values of fc.sample(
      fc.tuple(
        fc.double({ min: -50, max: 500, noNaN: true }),
        fc.double({ min: 0, max: 50, noNaN: true }),
        fc.double({ min: -40, max: 150, noNaN: true }),
        fc.double({ min: -1e12, max: 1e12, noNaN: true }),
      ),
      { numRuns: 500, seed: 7 },
    )) {
      const datagram = new Datagram(pressures.length);
      pressures.quantise(Float64Array.from(values), 0, carried, 0);
      pressures.write(datagram, sent.length, 1000 + sent.length);
      sent.push(datagram.bytes);
      expected.push([carried[0] - carried[2], carried[3] > 0 ? 1 : 0]);
    }
    const answers = exchangeWith(program, sent);
    expect(answers).toHaveLength(sent.length);
    const datagram = new Datagram(inbox.capacity);
    const values = new Float64Array(2);
    answers.forEach((answer, i) => {
      datagram.bytes.set(answer);
      expect(inbox.inspect(datagram, answer.length)).toBe(verdicts.sound);
      expect(requests.read(datagram, values, 0)).toBe(fieldVerdicts.fine);
      expect([datagram.view.getUint32(8, true), datagram.view.getUint32(12, true)]).toEqual([i, 1000 + i]);
      expect(Math.abs(values[0] - expected[i][0])).toBeLessThanOrEqual(0.0500001);
      expect(values[1]).toBe(expected[i][1]);
      // The same values through our encoder are the same bytes.
      const own = new Datagram(requests.length);
      requests.quantise(values, 0, new Float64Array(2), 0);
      requests.write(own, i, 1000 + i);
      expect(answer).toEqual(own.bytes);
    });
  });

  it.runIf(here)('judges bad datagrams as we do', () => {
    compile(compiler, flags, 'controller.c', program);
    const checksum = mapChecksum(map);
    const codecs = map.messages.map((one) => new UdpCodec(one, checksum));
    const inbox = new UdpInbox(codecs, checksum);
    const good = new Datagram(codecs[0].length);
    codecs[0].quantise(new Float64Array(4), 0, new Float64Array(4), 0);
    codecs[0].write(good, 0, 0);
    const bad = fc.sample(
      fc
        .record({
          at: fc.nat(good.capacity - 1),
          bit: fc.nat(7),
          cut: fc.nat(60),
          signed: fc.boolean(),
          grow: fc.boolean(),
        })
        .map(({ at, bit, cut, signed, grow }) => {
          const bytes = new Uint8Array(
            grow ? good.capacity + cut : Math.max(0, good.capacity - (cut > 44 ? cut - 44 : 0)),
          );
          bytes.set(good.bytes.subarray(0, bytes.length));
          if (at < bytes.length) bytes[at] ^= 1 << bit;
          if (signed && bytes.length > 24)
            new DataView(bytes.buffer).setInt32(bytes.length - 4, crc32(bytes, 0, bytes.length - 4), true);
          return bytes;
        }),
      { numRuns: 3000, seed: 11 },
    );
    const ours = bad.map((bytes) => {
      const datagram = new Datagram(inbox.capacity);
      datagram.bytes.set(bytes.subarray(0, inbox.capacity));
      return inbox.inspect(datagram, Math.min(bytes.length, inbox.capacity));
    });
    expect(new Set(ours).size).toBe(5);
    const theirs = exchangeWith(program, bad).map((answer) => {
      const view = new DataView(answer.buffer);
      return view.getUint8(5) === kinds.message ? verdicts.sound : view.getUint32(12, true);
    });
    expect(theirs).toEqual(ours);
  });
});

describe('C controller over a UDP socket', () => {
  it.runIf(compilers.cc || mustRun)('closes the loop in lockstep', async () => {
    const program = join(folder, 'controller-udp');
    compile('cc', ['-std=gnu11', '-DOVER_UDP'], 'controller.c', program);
    const rig = new Rig(map);
    // The controller needs a port that is free: one that a socket of ours has just had.
    const probe = new UdpSocket({ local: { address: '127.0.0.1', port: 0 } });
    const port = probe.localPort;
    probe.close();
    const socket = new UdpSocket({ local: { address: '127.0.0.1', port: 0 }, peer: { address: '127.0.0.1', port } });
    const controller = spawn(program, ['udp', `${port}`, `${socket.localPort}`], { stdio: 'ignore' });
    const ended = new Promise<number | null>((resolve) => controller.on('exit', resolve));
    try {
      const barrier = new LockstepTransport(socket, {
        link: 'powertrain',
        mapChecksum: rig.exchange.checksum,
        limit: 20_000,
        now: () => performance.now(),
      });
      rig.exchange.attach('powertrain', barrier);
      barrier.awaitHello(20_000);
      for (let tick = 0; tick < 500; tick += 1) {
        rig.take(tick);
        if (tick > 0) {
          const speed = tick - 1 < 23 ? 0 : Math.floor((tick - 4) / 10) * 10 + 3;
          expect([tick, rig.command('pumpMotor.torqueRequest')]).toEqual([
            tick,
            expect.closeTo(((tick - 1) % 300) - 20 + speed / 100, 0),
          ]);
          expect(
            Math.abs(rig.command('pumpMotor.torqueRequest') - (((tick - 1) % 300) - 20 + speed / 100)),
          ).toBeLessThanOrEqual(0.0500001);
        }
        rig.set('highLine.pressure', (tick % 300) * 1e5);
        rig.set('tank.temperature', 273.15 + 20);
        rig.set('propShaft.speed', (tick * Math.PI) / 30);
        rig.publish(tick);
        barrier.end(tick);
      }
      expect(rig.value('powertrain.oneStepShare')).toBe(1);
      expect(rig.value('requests.received')).toBe(499);
      expect(
        ['malformed', 'wrongChecksum', 'wrongMap', 'wrongLength', 'floods'].map((count) =>
          rig.value(`powertrain.${count}`),
        ),
      ).toEqual([0, 0, 0, 0, 0]);
      rig.exchange.links[0].hello(500);
      expect(await ended).toBe(0);
    } finally {
      controller.kill('SIGKILL');
      socket.close();
    }
  });
});

describe('header text', () => {
  it('survives names and words that C keeps for itself', () => {
    const odd = mapOf(
      message('class', 1, 'sent', [
        signal('default', 'a.b', { about: 'ends the comment */ int x; /*' }),
        signal('checksum', 'a.b', { type: 'f64' }),
        signal('i', 'a.b', {
          type: 'u32',
          scale: 0.5,
          offset: -3,
          least: 0,
          most: 100,
          names: { 'very hot': 1, off: 0 },
        }),
      ]),
      message('empty', 2, 'received', []),
    );
    const text = cHeader(odd, 'odd');
    expect(text).toContain('float default_;');
    expect(text).toContain('double checksum_;');
    expect(text).toContain('OILSPRING_class_i_very_hot = 1');
    if (!compilers.cc) return;
    writeFileSync(join(folder, 'odd.h'), text);
    writeFileSync(join(folder, 'odd.c'), '#include "odd.h"\nint main(void) { return 0; }\n');
    compile('cc', ['-std=c11'], 'odd.c', 'odd');
  });
});

describe('table of the map', () => {
  it('names every message and signal with its place, range, cycle and substitute', () => {
    const html = mapTable(map, 'bench <of> the tests', 1e-3);
    expect(html).toContain('<h1>Messages of bench &lt;of&gt; the tests</h1>');
    for (const one of map.messages) {
      expect(html).toContain(`<h3>${one.name}</h3>`);
      for (const field of one.signals) expect(html).toContain(`<th scope="row">${field.name}</th>`);
    }
    expect(html).toContain(
      '<caption>received; number 33; 32 bytes; every 10 ms; phase 2 ms; time-out 30 ms; out of range: brought into range; protected by sequence and CRC-32.</caption>',
    );
    expect(html).toContain(
      '<th scope="row">isolationValve</th><td>22</td><td>u8</td><td>1</td><td>0</td><td>1</td><td>0 .. 1</td><td>0</td><td>isolation.open</td><td>isolationValve of the tests (0 = shut, 1 = open)</td>',
    );
    expect(html).toContain(`<code>${(mapChecksum(map) >>> 0).toString(16).padStart(8, '0')}</code>`);
  });
});
