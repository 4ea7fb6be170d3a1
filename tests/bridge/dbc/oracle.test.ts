import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CanCodec } from '../../../bridge/can-codec.js';
import type { Database, DatabaseMessage } from '../../../bridge/dbc/database.js';
import { decodeDatabase, encodeDatabase } from '../../../bridge/dbc/encoding.js';
import { readDatabase } from '../../../bridge/dbc/read.js';
import { messagesOf } from '../../../bridge/dbc/to-map.js';
import { writeDatabase } from '../../../bridge/dbc/write.js';
import type { MapSignal, MessageSpec } from '../../../bridge/message-map.js';
import { anyDatabase } from './random-database.js';

/** Debian's python3-canmatrix: in CI it must be there (`apt-get install python3-canmatrix`). */
const python = '/usr/bin/python3';
const installed = spawnSync(python, ['-c', 'import canmatrix']).status === 0;

interface OracleFrame {
  readonly name: string;
  readonly bytes: number;
  readonly flexible: boolean;
  readonly signals: Readonly<
    Record<
      string,
      {
        scale: number;
        offset: number;
        least: number;
        unit: string;
        values: [number, string][];
        float: boolean;
        signed: boolean;
      }
    >
  >;
  readonly raw: Readonly<Record<string, number>>;
}

function ask(tasks: readonly object[]): OracleFrame[][] {
  const script = fileURLToPath(new URL('./oracle.py', import.meta.url));
  const { status, stdout, stderr } = spawnSync(python, [script], {
    input: JSON.stringify(tasks),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  if (status !== 0) throw new Error(stderr.slice(-2000));
  return JSON.parse(stdout) as OracleFrame[][];
}

/** The raw numbers of a payload by our own codec; signals that the selectors leave out are absent. */
function rawNumbers(message: MessageSpec, payload: Uint8Array): Record<string, number> {
  const bare = (signal: MapSignal): MapSignal => ({
    ...signal,
    least: -Number.MAX_VALUE,
    most: Number.MAX_VALUE,
    can: { ...signal.can!, scale: 1, offset: 0 },
  });
  const codec = new CanCodec({ ...message, outOfRange: 'saturate', signals: message.signals.map(bare) });
  const values = new Float64Array(codec.count).fill(Number.NaN);
  codec.read(payload, values, 0);
  return Object.fromEntries(
    message.signals.flatMap((signal, i) => (codec.carries(i) ? [[signal.name, values[i]]] : [])),
  );
}

/** Neither infinite nor not a number: such a payload is refused, and the oracle has no word for it. */
const finite = (message: DatabaseMessage, raw: Record<string, number>): boolean =>
  message.signals.every(({ name, layout }) => !layout.float || raw[name] === undefined || Number.isFinite(raw[name]));

describe.runIf(installed || process.env['CI'] === 'true')('canmatrix as the oracle', () => {
  it('reads what is written, and takes the same numbers out of every payload', () => {
    const folder = mkdtempSync(path.join(tmpdir(), 'dbc-'));
    try {
      // Quotes inside texts are left out: canmatrix leaves the backslash before them standing.
      const databases = fc
        .sample(anyDatabase, { numRuns: 60, seed: 20_261 })
        .map(
          (database) => JSON.parse(JSON.stringify(database).replaceAll('\\\\"', '').replaceAll('\\"', '')) as Database,
        );
      const noise = fc.sample(fc.uint8Array({ minLength: 64, maxLength: 64 }), { numRuns: 700, seed: 5 });
      let used = 0;
      const tasks = databases.map((database, i) => {
        const file = path.join(folder, `${i}.dbc`);
        writeFileSync(file, encodeDatabase(writeDatabase(database)));
        const cases = database.messages.flatMap((message) =>
          [0, 1, 2].map(() => {
            const payload = noise[used++ % noise.length].slice(0, message.bytes);
            // Selectors take a small number most of the time, so that something is selected.
            if (message.signals[0]?.layout.selector) payload[0] = used % 9;
            return {
              identifier: message.identifier,
              extended: message.extended,
              payload: Buffer.from(payload).toString('hex'),
            };
          }),
        );
        return { file, again: path.join(folder, `${i}.again.dbc`), cases };
      });
      const answers = ask(tasks);
      let signals = 0;
      let multiplexed = 0;
      for (const [i, database] of databases.entries()) {
        const { messages } = messagesOf(database, { link: 'bus', controller: 'Controller', step: 1e-3 });
        // What canmatrix writes of it is read here without a problem, with every layout the same.
        const again = readDatabase(decodeDatabase(readFileSync(tasks[i].again)));
        expect(again.problems).toEqual([]);
        for (const message of database.messages) {
          const twin = again.database.messages.find(
            (one) => one.identifier === message.identifier && one.extended === message.extended,
          )!;
          expect(twin.bytes).toBe(message.bytes);
          const layouts = (one: DatabaseMessage) =>
            Object.fromEntries(
              one.signals.map((signal) => [
                signal.name,
                { ...signal.layout, selector: signal.layout.selector ?? false },
              ]),
            );
          expect(layouts(twin)).toEqual(layouts(message));
        }
        tasks[i].cases.forEach((one, k) => {
          const index = Math.floor(k / 3);
          const message = database.messages[index];
          const answer = answers[i][k];
          expect([answer.name, answer.bytes, answer.flexible]).toEqual([
            message.name,
            message.bytes,
            message.flexibleDataRate,
          ]);
          for (const signal of message.signals) {
            const seen = answer.signals[signal.name];
            expect([signal.name, seen.scale, seen.offset, seen.least, seen.unit, seen.float]).toEqual([
              signal.name,
              signal.layout.scale,
              signal.layout.offset,
              signal.least,
              signal.unit,
              signal.layout.float,
            ]);
            expect(seen.values).toEqual([...signal.values].map(([raw, name]) => [raw, name]));
          }
          const payload = new Uint8Array(64);
          payload.set(Buffer.from(one.payload, 'hex'));
          const own = rawNumbers(messages[index], payload);
          if (!finite(message, own)) return;
          for (const [name, raw] of Object.entries(own)) {
            expect([name, raw]).toEqual([name, answer.raw[name]]);
            signals += 1;
            if (message.signals.find((signal) => signal.name === name)?.layout.selectedBy) multiplexed += 1;
          }
        });
      }
      expect(signals).toBeGreaterThan(1000);
      expect(multiplexed).toBeGreaterThan(50);
    } finally {
      rmSync(folder, { recursive: true });
    }
  });
});
