import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { z } from 'zod';

const quantiles = z.object({ count: z.number(), p50: z.number(), p99: z.number(), p999: z.number(), max: z.number() });

/** What `oilspring readiness` found last on this computer; plain JSON, lateness in µs, the rest SI. */
export const answerSchema = z.object({
  measured: z.string(),
  computer: z.string(),
  seconds: z.number(),
  policy: z.string(),
  core: z.number().nullable(),
  load: z.number(),
  /** Processor time of the waiting thread as a share of one processor. */
  share: z.number(),
  lateness: quantiles,
  cyclictest: quantiles.nullable(),
  steps: z.array(
    z.object({ step: z.number(), allowed: z.number(), later: z.number(), of: z.number(), atMost: z.number() }),
  ),
  disk: z.object({ rate: z.number(), longest: z.number(), free: z.number() }).nullable(),
  findings: z.array(
    z.object({
      name: z.string(),
      found: z.string(),
      verdict: z.enum(['good', 'could be better', 'bad', 'unknown']),
      meaning: z.string(),
      remedy: z.array(z.string()),
    }),
  ),
});
export type ReadinessAnswer = z.infer<typeof answerSchema>;

/** Kernel and processors: an answer counts for this computer as it is now. */
export function thisComputer(): string {
  return `${os.type()} ${os.release()}, ${os.cpus().length} x ${os.cpus()[0]?.model.trim() ?? 'unknown'}`;
}

export function answerFile(): string {
  const state = process.env['XDG_STATE_HOME'] || path.join(os.homedir(), '.local', 'state');
  return path.join(state, 'oilspring', 'readiness.json');
}

/** Keeps the answer for the records of later runs; false where that is not possible. */
export function keepAnswer(answer: ReadinessAnswer, file = answerFile()): boolean {
  try {
    fs.mkdirSync(path.dirname(file), { recursive: true });
    fs.writeFileSync(file, `${JSON.stringify(answer, undefined, 2)}\n`);
    return true;
  } catch {
    return false;
  }
}

/** The kept answer, when there is one and it is about this computer with this kernel. */
export function keptAnswer(file = answerFile()): ReadinessAnswer | undefined {
  try {
    const answer = answerSchema.parse(JSON.parse(fs.readFileSync(file, 'utf8')));
    return answer.computer === thisComputer() ? answer : undefined;
  } catch {
    return undefined;
  }
}

/** One line for a run's record. */
export function answerText(answer: ReadinessAnswer | undefined): string {
  if (answer === undefined) return 'not measured on this computer: run `oilspring readiness`';
  const { lateness, cyclictest } = answer;
  const held = answer.steps.find((step) => step.step === 0.001);
  return [
    `${answer.measured}: ${answer.policy}, lateness of ${lateness.count} wake-ups p50 ${us(lateness.p50)}, p99 ${us(lateness.p99)}, p99.9 ${us(lateness.p999)}, max ${us(lateness.max)}`,
    ...(cyclictest ? [`cyclictest p99 ${us(cyclictest.p99)}, max ${us(cyclictest.max)}`] : []),
    ...(held ? [`1 ms step: ${held.later} of ${held.of} wake-ups later than ${held.allowed * 1e6} µs`] : []),
  ].join('; ');
}

function us(value: number): string {
  return `${value < 10 ? value.toFixed(1) : value.toFixed(0)} µs`;
}
