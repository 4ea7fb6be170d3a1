import { z } from 'zod';

/**
 * What a report takes from the summary in a recording's end (runtime/run-summary.ts). The file may be the work of a
 * stranger: what does not fit is not believed.
 */
const number = z.number();
const requirement = z.object({
  id: z.string(),
  verdict: z.enum(['undecided', 'pass', 'fail', 'not exercised']),
  margin: number.nullable(),
  unit: z.string(),
  at: number.nullable(),
  triggers: number.nullable(),
  open: z.boolean(),
});
const duration = z.object({ p50: number, p99: number, p999: number, max: number });

export const recordedSummary = z.object({
  /** Counted time, s: what is recorded behind it is after-run. */
  simulated: number.optional(),
  verdict: z.enum(['pass', 'fail', 'not exercised', 'not valid']),
  valid: z.boolean(),
  exitCode: number,
  verdictText: z.string(),
  reasons: z.array(
    z.object({
      reason: z.enum([
        'timing budget',
        'lost frames',
        'ledger residual',
        'ring overflow',
        'hand in the run',
        'ended early',
        'evidence',
      ]),
      what: z.string(),
      value: number.optional(),
      bound: number.optional(),
      unit: z.string().optional(),
    }),
  ),
  requirements: z.array(requirement),
  timing: z.object({
    measured: z.boolean(),
    period: duration,
    lateness: duration,
    step: duration,
    overruns: number,
    drift: number,
    collections: number,
  }),
  warnings: z.array(
    z.object({
      path: z.string(),
      unit: z.string(),
      level: z.string(),
      since: number,
      until: number.nullable(),
      peak: number,
      setting: number,
      times: number,
      acknowledged: z.boolean(),
      meaning: z.string(),
    }),
  ),
  ledger: z.object({ energyResidual: number, oilResidual: number, energyBound: number, oilBound: number }),
  energyParts: z.array(z.object({ element: z.string(), supplied: number, stored: number, lost: number })).default([]),
  messages: z
    .array(
      z.object({
        link: z.string(),
        message: z.string(),
        direction: z.enum(['sent', 'received']),
        count: number,
        due: number.nullable(),
        lost: number,
        late: number,
        malformed: number,
        timeOuts: number,
      }),
    )
    .default([]),
  stateHash: z.string(),
});
export type RecordedSummary = z.infer<typeof recordedSummary>;
