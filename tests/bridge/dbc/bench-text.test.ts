import { describe, expect, it } from 'vitest';
import { benchText } from '../../../bridge/dbc/bench-text.js';
import { databaseOf } from '../../../bridge/dbc/from-map.js';
import { readDatabase } from '../../../bridge/dbc/read.js';
import { messagesOf } from '../../../bridge/dbc/to-map.js';
import { writeDatabase } from '../../../bridge/dbc/write.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { diskFiles } from '../../../configs/files.js';

const folder = new URL('../../../configs/harbour-truck/', import.meta.url).pathname;

describe('a bench file out of a database', () => {
  it('reads as the bench that the database came from, once the paths are filled in', () => {
    const original = readBench(`${folder}bench-can.yaml`, catalogue);
    const { database, problems } = readDatabase(writeDatabase(databaseOf(original.map, 'powertrain', { step: 1e-3 })));
    expect(problems).toEqual([]);
    const { messages } = messagesOf(database, { link: 'powertrain', controller: 'Controller', step: 1e-3 });
    const signals = original.map.messages.flatMap((message) =>
      message.signals.map((signal) => ({ ...signal, message: message.name })),
    );
    let text = benchText(
      messages.map((message) => ({
        ...message,
        signals: message.signals.filter((signal) =>
          signals.some((one) => one.name === signal.name && one.message === message.name),
        ),
      })),
      1e-3,
    );
    for (const message of original.map.messages)
      for (const signal of message.signals) {
        const own = text.indexOf(`  ${message.name}:\n`);
        const at = text.indexOf(`      ${signal.name}: {`, own);
        const path = message.direction === 'sent' ? `from: ${signal.path}` : `to: ${signal.path}, unit`;
        text =
          text.slice(0, at) + text.slice(at).replace(message.direction === 'sent' ? 'from: fill.in' : 'unit', path);
      }
    const files = {
      ...diskFiles,
      read: (name: string) => (name.endsWith('messages.yaml') ? text : diskFiles.read(name)),
    };
    const again = readBench(`${folder}bench-can.yaml`, catalogue, files);
    for (const [i, message] of original.map.messages.entries()) {
      const twin = again.map.messages[i]!;
      expect(twin).toMatchObject({
        name: message.name,
        identifier: message.identifier,
        direction: message.direction,
        every: message.every,
        bytes: message.bytes,
      });
      expect(
        twin.signals.map(({ name, path, unit, unitScale, unitOffset, least, most, can }) => ({
          name,
          path,
          unit,
          unitScale,
          unitOffset,
          least,
          most,
          can,
        })),
      ).toEqual(
        message.signals.map(({ name, path, unit, unitScale, unitOffset, least, most, can }) => ({
          name,
          path,
          unit,
          unitScale,
          unitOffset,
          least,
          most,
          can,
        })),
      );
    }
  });
});
