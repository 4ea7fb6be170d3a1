import { renderStart } from '../../../tools/terminal/start-up.js';
import { styleOf } from '../../../tools/terminal/style.js';
import { renderSummary } from '../../../tools/terminal/summary.js';
import { TerminalView } from '../../../tools/terminal/view.js';
import { bar, fakeFrame, fakeNotes, fakeSummary } from './fake-run.js';

// To look at: node --import ./tests/support/typescript-hooks.mjs tests/tools/terminal/show-fake-run.ts [from s] [to s] [speed]
const [from = -1, to = 62, speed = 1] = process.argv.slice(2).map(Number);
const style = styleOf(process.stdout);
process.stdout.write(
  renderStart(
    {
      version: '0.1.0',
      bench: 'harbour truck',
      about: '7.5 t parcel truck, parallel hydraulic hybrid, invented',
      benchFile: 'configs/harbour-truck/bench.yaml',
      scenario: 'delivery round',
      length: 62,
      pace: 'live',
      controller: 'demo controller, a process of its own over UDP, 127.0.0.1:47111',
      recording: 'recordings/harbour-truck-1.osr',
      page: 'http://127.0.0.1:8080/',
      seed: 1,
      remarks: ['SCHED_FIFO refused (EPERM): the loop runs as an ordinary thread and may be late'],
      relief: { 'highLine.pressure': bar(330), 'lowLine.pressure': bar(20) },
    },
    process.stdout.columns ?? 80,
    style,
  ),
);
const view = new TerminalView({ stream: process.stdout });
let t = from;
let told = 0;
const timer = setInterval(() => {
  for (; told < fakeNotes.length && fakeNotes[told].time <= t; told += 1)
    if (fakeNotes[told].time >= from) view.note(fakeNotes[told]);
  view.update(fakeFrame(t));
  t += 0.2 * speed;
  if (t <= to) return;
  clearInterval(timer);
  view.close();
  process.stdout.write(renderSummary(fakeSummary, process.stdout.columns ?? 80, style));
}, 200);
