#!/usr/bin/env node
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import { parseQuantity } from '../../configs/quantity.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { machineFacts } from '../../runtime/realtime/machine-facts.js';
import { allowedCores } from '../../runtime/realtime/scheduling.js';
import { inlineMore } from '../loop/engine-flags.js';
import { softwareVersion } from '../run/host-run.js';
import type { Part, PartResult } from './part.js';
import { codec } from './parts/codec.js';
import { fast } from './parts/fast.js';
import { judge } from './parts/judge.js';
import { lateness } from './parts/lateness.js';
import { page } from './parts/page.js';
import { recording } from './parts/recording.js';
import { replies } from './parts/replies.js';
import { soak } from './parts/soak.js';
import { stages } from './parts/stages.js';
import { step } from './parts/step.js';
import { twin } from './parts/twin.js';
import { Workshop } from './workshop.js';

/**
 * `npm run measure`: what the loop costs and how punctual it is, beside the floors of this very computer. Results go to a
 * JSON file and to standard output as a Markdown table. Read ratios of one run; tails of a shared computer mean little.
 */
// as in the loop thread
inlineMore();
const parts: readonly Part[] = [lateness, step, twin, stages, judge, replies, fast, recording, page, codec];

const program = new Command('measure')
  .description('measures the loop beside cyclictest and a twin in C')
  .option('--part <a,b>', `some of ${parts.map((part) => part.name).join(', ')}; default: all`, chosen)
  .option('--seconds <30s>', 'length of each row', seconds, 30)
  .option('--soak <10min>', 'one long live run instead', seconds)
  .option('--to <FILE.json>', 'results; default: a new file under recordings/')
  .parse();
const options = program.opts<{ part?: readonly Part[]; seconds: number; soak?: number; to?: string }>();

const why = whyNotLive();
if (why !== '') {
  process.stdout.write(`not run: ${why}\n`);
  process.exit(0);
}
const workshop = new Workshop();
for (const signal of ['SIGINT', 'SIGTERM'] as const)
  process.on(signal, () => {
    workshop.close();
    process.exit(5);
  });
try {
  await main();
} finally {
  workshop.close();
}

async function main(): Promise<void> {
  const cores = allowedCores().slice(-2);
  const wanted = options.soak === undefined ? (options.part ?? parts) : [soak];
  const results: PartResult[] = [];
  const facts = {
    ...machineFacts(),
    node: process.version,
    oilspring: softwareVersion(),
    date: new Date().toISOString(),
  };
  const to =
    options.to ?? path.join('recordings', `measure-${facts.date.replace(/[-:]|\..*/g, '').replace('T', '-')}.json`);
  for (const part of wanted) {
    const length = options.soak ?? options.seconds;
    process.stderr.write(`${part.name}: ${part.about}\n`);
    const load = os.loadavg()[0]!;
    const found = await part
      .run({ seconds: length, cores, workshop, say: (text) => process.stderr.write(`  ${text}\n`) })
      .catch((error: Error) => ({
        rows: [{ what: part.name, value: `not run: ${error.message}` }],
        numbers: `not run: ${error.message}`,
      }));
    const command =
      options.soak === undefined
        ? `npm run measure -- --part ${part.name} --seconds ${length}s`
        : `npm run measure -- --soak ${length}s`;
    results.push({
      part: part.name,
      about: part.about,
      command,
      rows: [
        ...found.rows,
        { what: 'load of the computer before and after', value: `${load.toFixed(1)}, ${os.loadavg()[0]!.toFixed(1)}` },
      ],
      numbers: found.numbers,
    });
    fs.mkdirSync(path.dirname(path.resolve(to)), { recursive: true });
    fs.writeFileSync(to, `${JSON.stringify({ machine: facts, results }, undefined, 1)}\n`);
  }
  process.stdout.write(`${markdown(results, facts)}\nresults: ${to}\n`);
}

/** The table for people. */
function markdown(results: readonly PartResult[], facts: Record<string, unknown>): string {
  const lines = [
    `Measured ${String(facts['date']).slice(0, 10)}, Node ${String(facts['node'])}, ${String(facts['processors'])} processors, ${String(facts['system'])}.`,
  ];
  for (const result of results) {
    lines.push('', `${result.about} (\`${result.command}\`)`, '', '| what | found | goal |', '|---|---|---|');
    for (const row of result.rows) lines.push(`| ${row.what} | ${row.value} | ${row.goal ?? ''} |`);
  }
  return `${lines.join('\n')}\n`;
}

function chosen(text: string): readonly Part[] {
  return text.split(',').map((name) => {
    const part = parts.find((one) => one.name === name.trim());
    if (!part) throw new InvalidArgumentError(`${name}: there are ${parts.map((one) => one.name).join(', ')}`);
    return part;
  });
}

function seconds(text: string): number {
  try {
    const { value } = parseQuantity(text.trim().replace(/^([\d.]+)\s*([a-z]+)$/i, '$1 $2'), { unit: 's' });
    if (value >= 1 && value <= 86_400) return value;
  } catch {
    // said below
  }
  throw new InvalidArgumentError('a time from 1s to 24h, such as 30s or 10 min');
}
