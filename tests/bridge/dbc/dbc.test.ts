import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { databaseOf } from '../../../bridge/dbc/from-map.js';
import { readDatabase } from '../../../bridge/dbc/read.js';
import { messagesOf } from '../../../bridge/dbc/to-map.js';
import { writeDatabase } from '../../../bridge/dbc/write.js';
import { sampleCanMap } from '../can-rig.js';
import { anyDatabase } from './random-database.js';

const sample = `VERSION "1.2"

NS_ :
\tCM_
\tBA_

BS_:

BU_: Bench Controller
VAL_TABLE_ Gears 0 "neutral" 1 "first" ;

BO_ 256 Pressures: 8 Bench
 SG_ High_Pressure : 0|16@1+ (0.01,0) [0|450] "bar" Controller
 SG_ Low : 23|12@0- (0.5,-40) [0|0] "bar"  Controller,Bench

BO_ 2566848513 Tuning: 8 Controller
 SG_ Page M : 0|8@1+ (1,0) [0|255] "" Bench
 SG_ Gain m1 : 8|32@1- (1,0) [0|0] "" Bench
 SG_ Sub m2M : 8|4@1+ (1,0) [0|15] "" Bench
 SG_ Deep m0 : 16|8@1+ (1,0) [0|255] "" Bench

BO_TX_BU_ 256 : Bench,Controller;
CM_ "whole";
CM_ BU_ Bench "stands in";
CM_ BO_ 256 "two
lines";
CM_ SG_ 256 Low "said \\"low\\"";
BA_DEF_ BO_ "GenMsgCycleTime" INT 0 65535;
BA_DEF_ BO_ "GenMsgSendType" ENUM "Cyclic","OnChange";
BA_DEF_DEF_ "GenMsgCycleTime" 0;
BA_ "GenMsgCycleTime" BO_ 256 20;
VAL_ 256 High_Pressure 0 "none" 65535 "broken" ;
SIG_VALTYPE_ 2566848513 Gain : 1;
SG_MUL_VAL_ 2566848513 Gain Page 1-1, 5-7;
SG_MUL_VAL_ 2566848513 Sub Page 2-2;
SG_MUL_VAL_ 2566848513 Deep Sub 0-3;
SIG_GROUP_ 256 Both 1 : High_Pressure Low;
`;

describe('reading a database', () => {
  it('takes every construct', () => {
    const { database, problems, remarks } = readDatabase(sample);
    expect(problems).toEqual([]);
    expect(remarks).toEqual([{ line: 37, column: 1, what: 'a signal group is read over (SIG_GROUP_)' }]);
    expect(database.nodes.map((node) => [node.name, node.comment])).toEqual([
      ['Bench', 'stands in'],
      ['Controller', ''],
    ]);
    const [pressures, tuning] = database.messages;
    expect(pressures).toMatchObject({
      name: 'Pressures',
      identifier: 256,
      extended: false,
      bytes: 8,
      senders: ['Bench', 'Controller'],
      comment: 'two\nlines',
      attributes: { GenMsgCycleTime: 20 },
    });
    expect(pressures!.signals[0]).toMatchObject({
      name: 'High_Pressure',
      least: 0,
      most: 450,
      unit: 'bar',
      values: [
        [0, 'none'],
        [65535, 'broken'],
      ],
    });
    expect(pressures!.signals[1]).toMatchObject({
      layout: { startBit: 23, length: 12, byteOrder: 'big', signed: true, float: false, scale: 0.5, offset: -40 },
      comment: 'said "low"',
      receivers: ['Controller', 'Bench'],
    });
    expect(tuning).toMatchObject({ identifier: 0x18ff0001, extended: true });
    expect(
      tuning!.signals.map((signal) => [
        signal.name,
        signal.layout.selector,
        signal.layout.selectedBy,
        signal.layout.float,
      ]),
    ).toEqual([
      ['Page', true, undefined, false],
      [
        'Gain',
        undefined,
        {
          signal: 'Page',
          values: [
            [1, 1],
            [5, 7],
          ],
        },
        true,
      ],
      ['Sub', true, { signal: 'Page', values: [[2, 2]] }, false],
      ['Deep', undefined, { signal: 'Sub', values: [[0, 3]] }, false],
    ]);
  });

  it.each([
    [
      'BO_ 256 Pressures: 8',
      'BO_ 2048 Pressures: 8',
      '12:5 number 2048 fits neither 11 bits nor, with bit 31 set, 29 bits',
    ],
    ['0|16@1+', '0|16@2+', '13:27 byte order 2, 0 (big endian) or 1 (little endian)'],
    ['0|16@1+', '0|65@1+', '13:6 High_Pressure: 65 bits, 1 to 64'],
    ['(0.01,0)', '(0,0)', '13:6 High_Pressure: its factor is 0'],
    ['(0.01,0)', '(0.01;0)', '13:35 ; where , belongs'],
    ['SG_ Low', 'SG_ High_Pressure', '14:6 Pressures has a signal High_Pressure already'],
    ['m1 :', 'mx :', '18:11 mx where M, m0, m1 or m0M belongs'],
    ['CM_ BU_ Bench', 'CM_ BU_ Nobody', '24:9 no node Nobody'],
    ['CM_ BO_ 256', 'CM_ BO_ 257', '25:9 no message has the number 257'],
    ['CM_ SG_ 256 Low', 'CM_ SG_ 256 Lower', '27:13 message Pressures has no signal Lower'],
    [
      'SIG_VALTYPE_ 2566848513 Gain : 1',
      'SIG_VALTYPE_ 2566848513 Gain : 2',
      '33:32 Gain is a float of 32 bits, 64 bits',
    ],
    ['Page 1-1', 'Pages 1-1', '18:6 Gain is selected by Pages, which is no selector (M) of message Tuning'],
    ['SIG_GROUP_', 'SIG_CROWD_', '37:1 unknown statement SIG_CROWD_'],
    ['VERSION "1.2"', 'VERSION 1.2', '1:9 1.2 where a text in quotes belongs'],
  ])('says where %s is written %s', (from, to, expected) => {
    expect(sample).toContain(from);
    const { problems } = readDatabase(sample.replace(from, to));
    expect(problems.map(({ line, column, what }) => `${line}:${column} ${what}`)).toContain(expected);
  });

  it('goes on after a statement that it does not understand', () => {
    const { database, problems } = readDatabase(
      sample.replace('SG_ Low', 'SG_ 5Low').replace('BA_DEF_DEF_', 'BA_DEF_DFE_'),
    );
    expect(problems.map((one) => one.line)).toEqual([14, 27, 30]);
    expect(database.messages.map((message) => message.signals.length)).toEqual([1, 4]);
    expect(database.messages[0]!.attributes).toEqual({ GenMsgCycleTime: 20 });
  });

  it('never throws, whatever stands in the file', () => {
    fc.assert(
      fc.property(fc.nat(), fc.nat(), fc.string({ maxLength: 6 }), (a, b, noise) => {
        const from = a % sample.length;
        const to = Math.min(sample.length, from + (b % 40));
        for (const text of [sample.slice(0, from), sample.slice(0, from) + noise + sample.slice(to), noise])
          for (const { line, column } of readDatabase(text).problems) expect(line > 0 && column > 0).toBe(true);
      }),
      { numRuns: 1500 },
    );
  });
});

describe('round trips', () => {
  it('a database through its text', () => {
    fc.assert(
      fc.property(anyDatabase, (database) => {
        const { database: again, problems, remarks } = readDatabase(writeDatabase(database));
        expect(problems).toEqual([]);
        expect(remarks).toEqual([]);
        expect(again).toEqual(database);
      }),
      { numRuns: 300 },
    );
  });

  it('a map through a database', () => {
    const map = sampleCanMap();
    const { database, problems } = readDatabase(writeDatabase(databaseOf(map, 'bus', { step: 1e-3 })));
    expect(problems).toEqual([]);
    const { messages, remarks } = messagesOf(database, { link: 'bus', controller: 'Controller', step: 1e-3 });
    expect(remarks).toEqual([]);
    for (const [i, original] of map.messages.entries()) {
      const read = messages[i]!;
      const { name, identifier, direction, every, bytes, about, extended, flexibleDataRate, bitRateSwitch } = original;
      expect(read).toMatchObject({
        name,
        identifier,
        direction,
        every,
        bytes,
        about,
        ...(extended ? { extended } : {}),
        ...(flexibleDataRate ? { flexibleDataRate, bitRateSwitch } : {}),
      });
      for (const [k, signal] of original.signals.entries())
        expect(read.signals[k]).toMatchObject({
          name: signal.name,
          unit: signal.unit,
          least: signal.least,
          most: signal.most,
          substitute: signal.substitute,
          can: signal.can,
        });
    }
    // The counters and checksums stand in the file for people and for other tools.
    expect(
      messages
        .find((one) => one.name === 'pressures')!
        .signals.slice(2)
        .map((signal) => [signal.name, signal.can!.startBit, signal.can!.length]),
    ).toEqual([
      ['pressuresChecksum', 0, 16],
      ['pressuresCounter', 16, 8],
    ]);
  });

  it('names that a map cannot have are changed and told', () => {
    const { database } = readDatabase(sample);
    const { messages, remarks } = messagesOf(database, { link: 'bus', controller: 'Controller', step: 1e-3 });
    expect(messages[0]!.signals[0]!.name).toBe('HighPressure');
    expect(messages[0]!.direction).toBe('received');
    expect(messages[0]!.signals[1]).toMatchObject({ least: -1064, most: 983.5 });
    expect(remarks).toEqual([
      'signal Pressures.High_Pressure is called HighPressure',
      'message Tuning says no cycle: 100 ms taken',
    ]);
  });
});
