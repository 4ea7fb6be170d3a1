import fs from 'node:fs';
import path from 'node:path';
import { identifierWord } from '../../../bridge/can-frame.js';
import { candumpLine, parseCandump } from '../../../bridge/candump.js';
import { readDatabase } from '../../../bridge/dbc/read.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { memoryFiles } from '../../../configs/files.js';
import { Problems } from '../../../configs/problems.js';
import { parseQuantity, QuantityError } from '../../../configs/quantity.js';
import { parseFormula } from '../../../configs/requirement-parser.js';
import { lookup } from '../../../configs/requirements.js';
import { readScenario } from '../../../configs/scenario.js';
import { BuildError } from '../../../runtime/contract.js';
import { packageRoot } from '../../loop/controller-module.js';
import type { Target } from '../fuzzer.js';

const stand = path.join(packageRoot(), 'configs', 'flywheel-stand');
const read = (name: string) => fs.readFileSync(path.join(stand, name), 'utf8');
const bytes = (text: string) => Uint8Array.from(Buffer.from(text, 'utf8'));
const text = (input: Uint8Array) => Buffer.from(input).toString('utf8');
const wordsOf = (...texts: string[]) => [...new Set(texts.join(' ').match(/[A-Za-z_][\w.]*|[{}[\]:,#|>&*!-]/g))];

/** What was read, or undefined when it was refused with places and remedies. */
function refusable<Read>(reading: () => Read): Read | undefined {
  try {
    return reading();
  } catch (error) {
    if (!(error instanceof BuildError)) throw error;
    if (error.problems.length === 0) throw new Error('refused without a problem');
    for (const { what, remedy, where } of error.problems)
      if (what === '' || remedy === '' || where === undefined)
        throw new Error(`a problem without place or remedy: ${what}`);
    return undefined;
  }
}

const bench = read('bench.yaml');
const spec = readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': bench }));
const relief = read('scenarios/relief.yaml');
const spin = read('scenarios/spin-up-and-recover.yaml');

export const benchFile: Target = {
  name: 'bench',
  about: 'a bench file',
  seeds: [bytes(bench)],
  words: [...wordsOf(bench), 'bar(g)', '*', 'constructor', '__proto__', '&a', '*a', '<<', '!!binary', '---'],
  longest: 40_000,
  decode: (input) => refusable(() => readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text(input) }))),
  planted: (found) => (found as typeof spec).name !== spec.name || (found as typeof spec).about !== spec.about,
};

const stepsOf = (source: string) => source.match(/^ +- \{ at/gm)!.length;

export const scenarioFile: Target = {
  name: 'scenario',
  about: 'a scenario file',
  seeds: [bytes(relief), bytes(spin)],
  words: [
    ...wordsOf(relief, spin),
    'repeat',
    'when',
    'wait',
    'within',
    'for',
    'fault',
    'clear',
    'hold',
    'parameters',
    'cases',
    'traces',
    'drive',
    'waive',
  ],
  longest: 20_000,
  decode: (input) => refusable(() => readScenario('s.yaml', spec, memoryFiles({ 's.yaml': text(input) }))),
  planted: (found) =>
    ![relief, spin].some((seed) => stepsOf(seed) === (found as ReturnType<typeof readScenario>).script.steps.length),
};

const requirements = [...[bench, relief, spin].join('\n').matchAll(/holds: (.*)/g)].map((match) => match[1]!);
export const requirementText: Target = {
  name: 'requirement',
  about: 'the text of a requirement',
  seeds: [
    ...requirements,
    'whenever flywheel.speed > 10 rpm then highLine.pressure < 300 bar(g) within 2 s',
    'unit.flow rises above 3 L/min',
  ].map(bytes),
  words: [
    ...wordsOf(...requirements),
    ...'always never eventually whenever then if until implies or and not from to within for at the start end is between on off rises above falls below settles +- happens begins ends rate change integral peak trough mean abs min max count duration ( ) < <= > >= + - * / per'.split(
      ' ',
    ),
    '200 bar(g)',
    '2 s',
    'flywheel.speed',
  ],
  longest: 2000,
  decode: (input) => {
    const problems = new Problems();
    const found = parseFormula(text(input), { signals: lookup(spec.signals), step: spec.step }, problems, 'holds');
    if (found === undefined && problems.count === 0) throw new Error('refused without a problem');
    return problems.count > 0 ? undefined : found;
  },
  planted: (found) => /"value":(?:0|1|-1|255|64|8)[,}]/.test(JSON.stringify(found)),
};

const csv = '# a drive\ntime [s],speed [km/h],grade [%]\n0,0,0\n1,3.5,1\n2.5,7,2\n';
const driven = 'scenario: driven\ndrive: { file: drive.csv, column: speed }\n';
export const csvTrace: Target = {
  name: 'csv',
  about: 'a trace in a CSV file',
  seeds: [bytes(csv), bytes(csv.replaceAll(',', ';'))],
  words: ['time', 'speed', '[s]', '[km/h]', '[m/s]', '[rpm]', ',', ';', '#', '\n', '\r\n', '"', '1e3'],
  longest: 4000,
  decode: (input) =>
    refusable(() => readScenario('s.yaml', spec, memoryFiles({ 's.yaml': driven, 'drive.csv': text(input) }))),
  planted: (found) => (found as ReturnType<typeof readScenario>).script.drive.length === 2,
};

export const quantityText: Target = {
  name: 'quantity',
  about: 'a number with its unit',
  seeds: ['345 bar(g)', '8 bar(a)', '-3.5e2 kPa(a) at 20 degC', '0.1 MPa(g)'].map(bytes),
  words: ['bar', '(g)', '(a)', 'kPa', 'psi', 'Pa', ' at ', 'degC', 'e', '+', '-', '.'],
  longest: 200,
  decode: (input) => {
    try {
      const { value } = parseQuantity(text(input), { unit: 'Pa' });
      if (!Number.isFinite(value)) throw new Error(`${value} is no number`);
      return value;
    } catch (error) {
      if (error instanceof QuantityError) return undefined;
      throw error;
    }
  },
  planted: (found) => (found as number) > 1e9,
};

const dbc = `VERSION "1"
NS_ :
BS_:
BU_: bench unit
BO_ 288 pressures: 8 bench
 SG_ high : 24|16@1+ (0.01,0) [0|450] "bar" unit
 SG_ low : 40|12@1- (0.02,-1) [0|50] "bar" Vector__XXX
BO_ 2566783234 speeds: 12 bench
 SG_ page M : 0|8@1+ (1,0) [0|255] "" unit
 SG_ shaft m1 : 15|16@0- (1,0) [-6000|6000] "rpm" unit
CM_ SG_ 288 high "pressure, high";
BA_DEF_ BO_ "GenMsgCycleTime" INT 0 65535;
BA_DEF_DEF_ "GenMsgCycleTime" 0;
BA_ "GenMsgCycleTime" BO_ 288 10;
VAL_ 288 low 0 "zero" 1 "one";
SIG_VALTYPE_ 288 high : 1;
SG_MUL_VAL_ 2566783234 shaft page 1-3, 5-5;
`;
export const databaseFile: Target = {
  name: 'dbc',
  about: 'a CAN database file',
  seeds: [bytes(dbc)],
  words: [
    ...wordsOf(dbc),
    '"',
    ';',
    '@0-',
    '|',
    '(',
    ')',
    'm12M',
    'ENUM',
    'HEX',
    'FLOAT',
    'STRING',
    'EV_',
    'SIG_GROUP_',
  ],
  longest: 8000,
  decode: (input) => readDatabase(text(input)).database,
  planted: (found) => {
    const { messages } = found as ReturnType<typeof readDatabase>['database'];
    return messages.length === 2 && messages.some((message) => message.signals.length === 3);
  },
};

const log = `(1436509052.249713) vcan0 044#2A366C2BBA
(1436509052.449847) vcan0 0F6#7ADFE07BD2
(0.000001) can1 18FF0102##1000102030405060708090A0B
(12.5) any 7FF#R4
(1.0) vcan0 20000080#0000000000000000 R
`;
export const candumpLog: Target = {
  name: 'candump',
  about: 'a log of can-utils',
  seeds: [bytes(log)],
  words: ['(', ')', '#', '##', '#R', 'vcan0', '\n', '0.1', 'FF', ' T'],
  longest: 2000,
  decode: (input) => {
    const { frames } = parseCandump(text(input));
    for (const { frame, interface: name } of frames) {
      const again = parseCandump(candumpLine(frame, frame.length, name, 1, 0)).frames[0];
      if (again === undefined || Buffer.compare(again.frame, frame) !== 0)
        throw new Error(`written and read again it is another frame: ${Buffer.from(frame).toString('hex')}`);
    }
    return frames.length === 0 ? undefined : frames;
  },
  planted: (found) =>
    (found as { frame: Uint8Array }[]).some(
      ({ frame }) => frame.length > 16 && identifierWord(frame) < 0 && frame[4]! < 4,
    ),
};
