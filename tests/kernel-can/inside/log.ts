// Logs both ways: ours played by canplayer, candump's read by us; `listen` beside candump; `replay` heard by candump.
// Words: a folder to write in.
import { spawn } from 'node:child_process';
import { openSync, readFileSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { makeFrame } from '../../../bridge/can-frame.js';
import { CanSocket } from '../../../bridge/can-socket.js';
import { candumpLine, parseCandump } from '../../../bridge/candump.js';
import { capture, drain, hex, report, sh, sleep } from './tools.js';

const folder = process.argv[2]!;
const frames = Array.from({ length: 200 }, (_, i) => {
  const payload = Array.from({ length: i % 9 }, (_unused, k) => (i * 31 + k * 7) & 255);
  if (i % 10 === 9) return makeFrame(i * 3, [], { remote: true });
  if (i % 7 === 3)
    return makeFrame(i, [...payload, ...payload].slice(0, 8), { flexible: true, bitRateSwitch: i % 2 === 0 });
  return makeFrame(i % 2 === 0 ? i : 0x18ff0000 + i, payload, { extended: i % 2 === 1 });
});
const log = path.join(folder, 'ours.log');
writeFileSync(
  log,
  frames.map((frame, i) => `${candumpLine(frame, frame.length, 'vcan0', 1_700_000_000, i * 1_000_000)}\n`).join(''),
);

const socket = new CanSocket({ interface: 'vcan0', flexibleDataRate: true });
const theirs = path.join(folder, 'theirs.log');
const listening = path.join(folder, 'listen.log');
const bench = 'configs/harbour-truck/bench-can.yaml';
const witness = spawn('candump', ['-L', 'vcan0'], { stdio: ['ignore', openSync(theirs, 'w'), 'inherit'] });
const spy = spawn(process.execPath, ['dist/tools/oilspring.js', 'listen', bench, '--candump'], {
  stdio: ['ignore', 'pipe', 'inherit'],
});
let heard = '';
spy.stdout.setEncoding('utf8').on('data', (chunk: string) => (heard += chunk));
for (let i = 0; i < 300 && !heard.includes('7FE#'); i += 1) {
  if (spy.exitCode !== null) throw new Error(`listen ended with ${spy.exitCode}`);
  sh('cansend vcan0 7FE#');
  await sleep(50);
}
if (!heard.includes('7FE#')) throw new Error('listen does not hear');
sh(`canplayer -I ${log} -t vcan0=vcan0`);
const played = (await drain(socket)).filter((frame) => !frame.startsWith('fe07'));
await sleep(300);
const closed = new Promise((done) => spy.once('close', done));
spy.kill('SIGINT');
await closed;
const witnessed = new Promise((done) => witness.once('close', done));
witness.kill('SIGTERM');
await witnessed;
writeFileSync(listening, heard);
const bare = (file: string): string[] =>
  parseCandump(readFileSync(file, 'utf8'))
    .frames.map((one) => hex(one.frame))
    .filter((frame) => !frame.startsWith('fe07'));

const again = await capture();
const words = sh(`node dist/tools/oilspring.js replay ${log} ${bench} 2>&1`);
const replayed = await again.stop();
const single = spawn(process.execPath, ['dist/tools/oilspring.js', 'listen', bench, '--count', '1'], {
  stdio: ['ignore', 'pipe', 'inherit'],
});
let decoded = '';
single.stdout.setEncoding('utf8').on('data', (chunk: string) => (decoded += chunk));
for (let i = 0; i < 600 && single.exitCode === null; i += 1) {
  sh('cansend vcan0 002#1A30FEFF00100000');
  await sleep(50);
}
if (single.exitCode !== 0) throw new Error(`listen --count 1 ended with ${single.exitCode}`);
report({
  sent: frames.map(hex),
  played,
  candump: bare(theirs),
  listened: bare(listening),
  replayed: replayed.length,
  words,
  decoded,
});
