import { spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import fc from 'fast-check';
import { afterAll, describe, expect, it } from 'vitest';
import { cHeader } from '../../bridge/c-header.js';
import { CanCodec } from '../../bridge/can-codec.js';
import { messagesOf } from '../../bridge/dbc/to-map.js';
import { examineMap } from '../../bridge/examine-map.js';
import type { MessageSpec } from '../../bridge/message-map.js';
import { makeProtector } from '../../bridge/protection/make.js';
import { fieldVerdicts } from '../../bridge/udp-codec.js';
import { canMap, field, frameMessage, sampleCanMap } from './can-rig.js';
import { anyDatabase } from './dbc/random-database.js';

const mustRun = process.env.CI === 'true';
const here = ['cc', 'c++'].filter((name) => mustRun || spawnSync(name, ['--version']).status === 0);
if (here.length < 2) console.log('not run: CAN payloads through cc and c++: no such compiler on this machine');
const strict = ['-Wall', '-Wextra', '-Wpedantic', '-Wconversion', '-Wshadow', '-Werror', '-O1'];
const folder = mkdtempSync(join(tmpdir(), 'oilspring-can-header-'));
afterAll(() => rmSync(folder, { recursive: true }));

/** Messages of random databases, and one for each protection, with names and identifiers of their own. */
function messages(): MessageSpec[] {
  const random = fc
    .sample(anyDatabase, { numRuns: 8, seed: 77 })
    .flatMap((database) => messagesOf(database, { link: 'bus', controller: 'C', step: 1e-3 }).messages)
    .map(
      (message, i): MessageSpec => ({
        ...message,
        name: `random${i}`,
        identifier: 0x300 + i,
        extended: false,
        outOfRange: i % 2 === 0 ? 'refuse' : 'saturate',
      }),
    )
    .filter((message) => examineMap(canMap([message])).length === 0);
  const protections: [string, Record<string, number | string>][] = [
    ['e2e-1', { dataId: 0x1234, mode: 'both' }],
    ['e2e-1', { dataId: 0x1234, mode: 'alternating' }],
    ['e2e-1', { dataId: 0x1234, mode: 'low' }],
    ['e2e-1', { dataId: 0x234, mode: 'nibble', offset: 2 }],
    ['e2e-2', { dataIds: Array.from({ length: 16 }, (_, i) => 17 * i).join(' ') }],
    ['e2e-4', { dataId: 0x89abcdef, offset: 1 }],
    ['e2e-5', { dataId: 0x1234, offset: 3 }],
    ['e2e-11', { dataId: 0x234, mode: 'nibble' }],
    ['e2e-22', { dataIds: Array.from({ length: 16 }, (_, i) => 255 - i).join(' ') }],
    ['counter', { start: 6, length: 5, modulo: 30 }],
    ['crc', { crc: 'crc32', byte: 4, order: 'big', prefix: '1 2 3' }],
    ['counter-and-crc', { start: 0, length: 4, crc: 'crc8-j1850', byte: 7, suffix: '9' }],
    ['counter-and-crc', { start: 0, length: 4, crc: 'crc16-ccitt', byte: 6, from: 1, to: 5 }],
  ];
  const guarded = protections.map(([kind, settings], i) =>
    frameMessage(
      `guarded${i}`,
      0x10 + i,
      'sent',
      [field('v', 'x.v', { startBit: 160, length: 16, signed: true }, { least: -30000, most: 30000 })],
      { flexibleDataRate: true, bytes: 24, protection: { kind, settings } },
    ),
  );
  const wide = frameMessage(
    'wide',
    5,
    'received',
    [
      field('unsigned', 'x.u', { startBit: 0, length: 64 }, { least: 0, most: 1.8e19 }),
      field(
        'signed',
        'x.s',
        { startBit: 71, length: 64, byteOrder: 'big', signed: true },
        { least: -9e18, most: 9e18 },
      ),
      field('double', 'x.d', { startBit: 128, length: 64, float: true }, { least: -1e300, most: 1e300 }),
      field('float', 'x.f', { startBit: 199, length: 32, byteOrder: 'big', float: true }, { least: -1e30, most: 1e30 }),
    ].map((signal) => ({ ...signal, type: 'f64' as const })),
    { flexibleDataRate: true, bytes: 32 },
  );
  return [...sampleCanMap().messages, wide, ...guarded, ...random];
}

/** Words of C get an underscore behind them. */
const inC = (name: string): string => (['unsigned', 'signed', 'double', 'float'].includes(name) ? `${name}_` : name);

/** `p`: values in, verdict and payload out; `u`: payload and old values in, verdict and values out; `g`: payload and counter. */
function program(all: readonly MessageSpec[]): string {
  const cases = all.map((message, i) => {
    const { name, signals } = message;
    const guarded = message.protection !== undefined;
    return `    case ${i}: {
        struct oilspring_${name} message;
        static uint8_t payload[OILSPRING_${name}_LENGTH + 1u];
        double values[${Math.max(1, signals.length)}];
        int verdict;
        memset(&message, 0, sizeof message);
        if (what == 'g') {
            if (fread(payload, 1u, OILSPRING_${name}_LENGTH, stdin) != OILSPRING_${name}_LENGTH)
                return 1;
            ${guarded ? `oilspring_protect_${name}(payload, number);\n            verdict = oilspring_verify_${name}(payload);` : 'verdict = 0;'}
            put(&verdict, sizeof verdict);
            put(payload, OILSPRING_${name}_LENGTH);
            payload[OILSPRING_${name}_LENGTH - 1u] ^= 0x10u;
            ${guarded ? `verdict = oilspring_verify_${name}(payload);` : ''}
            put(&verdict, sizeof verdict);
            break;
        }
        if (what == 'u' && fread(payload, 1u, OILSPRING_${name}_LENGTH, stdin) != OILSPRING_${name}_LENGTH)
            return 1;
        if (fread(values, sizeof(double), ${signals.length}u, stdin) != ${signals.length}u)
            return 1;
${signals.map(({ name: one }, k) => `        message.${inC(one)} = values[${k}];`).join('\n')}
        verdict = what == 'p' ? oilspring_pack_${name}(payload, &message) : oilspring_unpack_${name}(&message, payload);
        put(&verdict, sizeof verdict);
        put(payload, OILSPRING_${name}_LENGTH);
${signals.map(({ name: one }, k) => `        values[${k}] = message.${inC(one)};`).join('\n')}
        put(values, ${signals.length}u * sizeof(double));
        break;
    }`;
  });
  return `#include "messages.h"
#include <stdio.h>

static void put(const void *bytes, size_t length)
{
    fwrite(bytes, 1u, length, stdout);
}

int main(void)
{
    int what;
    while ((what = fgetc(stdin)) != EOF) {
        unsigned index = (unsigned)fgetc(stdin);
        unsigned number = (unsigned)fgetc(stdin);
        index |= (unsigned)fgetc(stdin) << 8;
        switch (index) {
${cases.join('\n')}
        default:
            return 1;
        }
    }
    return 0;
}
`;
}

/** Sameness of plain data; only a difference is worth the long way. */
function same(found: unknown, wanted: unknown): void {
  if (JSON.stringify(found) !== JSON.stringify(wanted)) expect(found).toEqual(wanted);
}

const all = messages();
const bytesOf = (message: MessageSpec): number => message.bytes ?? 8;
const doubles = (values: readonly number[]): Buffer => Buffer.from(Float64Array.from(values).buffer);

describe.runIf(here.length === 2).each([
  ['cc', ['-std=c11']],
  ['c++', ['-std=c++11', '-x', 'c++']],
] as const)('CAN payloads through %s', (compiler, flags) => {
  it('are packed, unpacked, protected and refused as by the bench, bit for bit', () => {
    writeFileSync(join(folder, 'messages.h'), cHeader(canMap(all), 'frames of the tests'));
    writeFileSync(join(folder, 'main.c'), program(all));
    const binary = join(folder, `main-${compiler.length}`);
    const built = spawnSync(compiler, [...flags, ...strict, '-o', binary, 'main.c'], { cwd: folder, encoding: 'utf8' });
    expect(built.stderr.slice(0, 2000)).toBe('');
    const tasks: Buffer[] = [];
    const expected: ((out: Buffer, at: number) => number)[] = [];
    const rounds = 20;
    all.forEach((message, index) => {
      const codec = new CanCodec(message);
      const length = bytesOf(message);
      const head = (what: string, number = 0): Buffer =>
        Buffer.from([what.charCodeAt(0), index & 255, number, index >> 8]);
      const anyValue = message.signals.map(({ least, most }) =>
        fc.oneof(
          fc.double({ min: least - 10, max: most + 10, noNaN: true }),
          fc.integer({ min: -20, max: 300 }),
          fc.constant(Number.NaN),
        ),
      );
      for (const values of fc.sample(fc.tuple(...anyValue), { numRuns: rounds, seed: 3 + index })) {
        tasks.push(head('p'), doubles(values));
        const payload = new Uint8Array(length);
        const verdict = codec.quantise(Float64Array.from(values), 0, new Float64Array(codec.count), 0);
        if (verdict >= 0) codec.write(payload);
        expected.push((out, at) => {
          const found = [out.readInt32LE(at), ...(verdict < 0 ? [] : out.subarray(at + 4, at + 4 + length))];
          same([message.name, values, found], [message.name, values, [verdict, ...(verdict < 0 ? [] : payload)]]);
          return at + 4 + length + 8 * codec.count;
        });
      }
      const anyPayload = fc.uint8Array({ minLength: length, maxLength: length });
      for (const payload of fc.sample(anyPayload, { numRuns: rounds, seed: 5 + index })) {
        const before = message.signals.map((_, i) => i + 0.5);
        tasks.push(head('u'), Buffer.from(payload), doubles(before));
        const values = Float64Array.from(before);
        const read = codec.read(payload, values, 0);
        const verdict = read === fieldVerdicts.refused ? -1 : read === fieldVerdicts.saturated ? 1 : 0;
        expected.push((out, at) => {
          const from = at + 4 + length;
          const found = Array.from(values, (_, i) => out.readDoubleLE(from + 8 * i));
          same([message.name, out.readInt32LE(at)], [message.name, verdict]);
          if (verdict >= 0) same([message.name, [...payload], found], [message.name, [...payload], [...values]]);
          return from + 8 * codec.count;
        });
      }
      const protector = makeProtector(message);
      if (protector === undefined) return;
      for (const [i, payload] of fc.sample(anyPayload, { numRuns: rounds, seed: 7 }).entries()) {
        const counter = protector.modulo === 0 ? 0 : i % Math.min(200, protector.modulo);
        tasks.push(head('g', counter), Buffer.from(payload));
        const own = Uint8Array.from(payload);
        protector.protect(own, length, counter);
        const broken = Uint8Array.from(own);
        broken[length - 1]! ^= 0x10;
        const after = protector.check(broken, length);
        expected.push((out, at) => {
          expect([message.protection, out.readInt32LE(at), [...out.subarray(at + 4, at + 4 + length)]]).toEqual([
            message.protection,
            counter,
            [...own],
          ]);
          expect([message.protection, out.readInt32LE(at + 4 + length)]).toEqual([message.protection, after]);
          return at + 8 + length;
        });
      }
    });
    const done = spawnSync(binary, { input: Buffer.concat(tasks), maxBuffer: 1 << 28 });
    expect(done.status).toBe(0);
    let at = 0;
    for (const compare of expected) at = compare(done.stdout, at);
    expect(at).toBe(done.stdout.length);
    expect(expected.length).toBeGreaterThan(700);
  });
});
