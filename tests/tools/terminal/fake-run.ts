import type { RunSummary } from '../../../runtime/run-summary.js';
import { watchLevelNumber } from '../../../runtime/watch-levels.js';
import type { TerminalFrame, TerminalNote } from '../../../tools/terminal/frame.js';

/** A run made of formulas, to look at the terminal without a bench. All numbers are invented. */

export const bar = (gauge: number) => 101325 + gauge * 1e5;
const length = 62;
const steps: readonly (readonly [number, string])[] = [
  [3, 'leave the depot'],
  [16, 'brake for the first delivery'],
  [23, 'first delivery unloaded'],
  [38, 'down the ramp'],
  [50, 'brake for the ferry'],
];

/** The run at time t, s. */
export function fakeFrame(t: number, pace: 'live' | 'fast' = 'live'): TerminalFrame {
  const speed = Math.max(0, 11 * Math.sin((Math.PI * (t - 3)) / 20));
  const high = 235 + 98 * Math.exp(-(((t - 21) / 3) ** 2)) - 30 * Math.exp(-(((t - 8) / 3) ** 2));
  const peak = t < 21 ? Math.max(235, high) : 333;
  const level = high > 330 ? 'relief passing' : high > 313.5 ? 'near relief' : undefined;
  const done = steps.filter(([at]) => at <= t).length;
  const silent = t > 44 && t < 45;
  return {
    bench: 'harbour truck',
    scenario: 'delivery round',
    pace,
    phase: t < 0 ? 'pre-roll' : 'running',
    elapsed: Math.max(0, t),
    total: length,
    ...(pace === 'fast' ? { realTimeFactor: 57.3 } : {}),
    step: {
      done,
      of: steps.length,
      ...(done > 0 ? { name: steps[done - 1][1] } : {}),
      ...(done < steps.length ? { next: { name: steps[done][1], in: steps[done][0] - Math.max(0, t) } } : {}),
    },
    headlines: [
      { label: 'speed', value: speed, unit: 'km/h' },
      { label: 'wanted speed', value: speed + 0.1, unit: 'km/h' },
      { label: 'grade', value: t > 38 && t < 50 ? -0.06 : 0, unit: '%' },
      { label: 'gear', value: speed < 0.1 ? 0 : Math.min(6, 1 + Math.floor(speed / 2)), unit: '1' },
      { label: 'accelerator', value: speed > 0 && t < 14 ? 0.42 : 0, unit: '%' },
      { label: 'brake pedal', value: t > 16 && t < 23 ? 0.31 : 0, unit: '%' },
      { label: 'pump-motor', value: t > 16 && t < 23 ? -312 : 120, unit: 'N m' },
      { label: 'displacement', value: t > 16 && t < 23 ? -0.72 : 0.35, unit: '%' },
      { label: 'engine', value: 0, unit: 'N m' },
    ],
    pressures: [
      {
        label: 'high accumulator',
        value: bar(high - 2),
        peak: bar(peak - 2),
        level: 0,
        settings: { precharge: bar(150), relief: bar(330), maximumAllowable: bar(350) },
      },
      {
        label: 'low reservoir',
        value: bar(9.5 - (high - 235) / 60),
        peak: bar(10.2),
        level: 0,
        settings: { precharge: bar(5), relief: bar(20), maximumAllowable: bar(25) },
      },
      {
        label: 'high line',
        value: bar(high),
        peak: bar(peak),
        level: level === undefined ? 0 : watchLevelNumber(level),
        timeToRelief: high > 330 ? 0 : 0.34,
        settings: { relief: bar(330), maximumAllowable: bar(350) },
      },
      {
        label: 'low line',
        value: bar(9.2),
        peak: bar(10.4),
        level: 0,
        settings: { leastInlet: 2e5, relief: bar(20), maximumAllowable: bar(25) },
      },
      { label: 'pump case', value: bar(0.21), peak: bar(0.4), level: 0, settings: { casePressure: bar(3) } },
    ],
    charges: [
      { label: 'high accumulator', charge: (high - 150) / 250, gasTemperature: 318 },
      { label: 'low reservoir', charge: 0.47, gasTemperature: 295 },
    ],
    links: [
      {
        name: 'powertrain',
        state: t < -0.5 ? 'not heard yet' : silent ? 'silent' : 'alive',
        age: silent ? t - 44 : 0.004,
        rate: silent ? 0 : 400,
        missed: t > 45 ? 2 : 0,
      },
    ],
    ...(pace === 'live'
      ? {
          timing: {
            lateness: { p50: 8.2, p99: 61, max: 1840 },
            step: { p50: 64, p99: 121, max: 402 },
            overruns: t > 30 ? 1 : 0,
            drift: 0.0012,
          },
        }
      : {}),
    warnings: { open: t > 19 ? 1 : 0, present: level === undefined ? [] : [`high line ${level}`] },
  };
}

export const fakeNotes: TerminalNote[] = [
  { time: 0.012, severity: 'note', text: 'the first message came on powertrain' },
  ...steps.map(([time, name]): TerminalNote => ({ time, severity: 'note', text: `scenario: ${name}` })),
  {
    time: 19.432,
    severity: 'warning',
    text: 'highLine.pressure will reach the relief setting in 0.20 s at the present rate: 309.2 bar(g), setting 330.0 bar(g); little is left until the relief valve opens and turns the work into heat',
  },
  {
    time: 20.581,
    severity: 'warning',
    text: 'highLine.pressure now relief valve passing: 330.1 bar(g), setting 330.0 bar(g); the relief valve passes oil: energy is lost and the oil heats up quickly',
  },
  {
    time: 23.2,
    severity: 'note',
    text: 'highLine.pressure back behind its settings after 3.57 s: peak 333.0 bar(g), setting 330.0 bar(g)',
  },
  {
    time: 44.05,
    severity: 'warning',
    text: 'hydraulicRequest has not come for 50 ms: its substitute values count',
  },
  {
    time: 50.2,
    severity: 'alarm',
    text: 'pumpShaft.speed over speed: 3612 rpm, setting 3600 rpm; pistons lift off or parts fly apart: the unit is to be disconnected before',
  },
];
fakeNotes.sort((a, b) => a.time - b.time);

export const fakeSummary: RunSummary = {
  bench: 'harbour truck',
  scenario: 'delivery round',
  pace: 'live',
  seed: 1,
  software: '0.1.0',
  verdict: 'pass',
  valid: true,
  exitCode: 0,
  verdictText: 'The run is valid; nothing was required of it.',
  reasons: [],
  ending: 'complete',
  requirements: [],
  simulated: 62,
  planned: 62,
  realTimeFactor: 1,
  timing: {
    measured: true,
    period: { p50: 1000, p99: 1060, p999: 1210, max: 2840 },
    lateness: { p50: 8.2, p99: 61, p999: 204, max: 1840 },
    step: { p50: 64, p99: 121, p999: 180, max: 402 },
    overruns: 1,
    drift: 0.0012,
    collections: 0,
    heapGrowth: 0,
  },
  startUp: { build: 0.9, warmUp: 2.1, total: 3.4 },
  scheduling: { policy: 'SCHED_FIFO', words: ['SCHED_FIFO at priority 80'] },
  processor: { loop: 5.12, all: 7.9 },
  stages: [],
  peaks: {
    'highLine.pressure': bar(333),
    'highAccumulator.pressure': bar(331),
    'lowLine.pressure': bar(10.4),
    'pumpCase.pressure': bar(0.4),
    'body.velocity': 13.3,
  },
  settings: {
    'highLine.pressure': { relief: bar(330), maximumAllowable: bar(350) },
    'highAccumulator.pressure': { precharge: bar(150), relief: bar(330), maximumAllowable: bar(350) },
    'lowLine.pressure': { leastInlet: 2e5, relief: bar(20), maximumAllowable: bar(25) },
    'pumpCase.pressure': { casePressure: bar(3) },
  },
  warnings: [
    {
      path: 'highLine.pressure',
      unit: 'Pa',
      side: 'above',
      level: 'relief passing',
      since: 19.432,
      until: 23.001,
      peak: bar(333),
      setting: bar(330),
      times: 1,
      acknowledged: false,
      meaning: 'the relief valve passes oil: energy is lost and the oil heats up quickly',
      from: 'mainRelief.cracking',
      index: 0,
    },
  ],
  ledger: { energyResidual: 3.1e-7, oilResidual: 2e-15, turnover: 1.46e6, energyBound: 1e-3, oilBound: 1e-11 },
  energies: [
    { key: 'recovered', about: 'recovered into the accumulator', value: 412e3 },
    { key: 'returned', about: 'given back to the wheels', value: 318e3 },
  ],
  fuel: { mass: 0.0312, energy: 1.335e6 },
  solver: { refined: 0, replaced: 0 },
  links: [
    {
      name: 'powertrain',
      received: 24800,
      sent: 31000,
      lost: 0,
      late: 0,
      malformed: 0,
      timeOuts: 0,
      oneStepShare: 0.9987,
    },
  ],
  stateHash: '5d1c0a9be2f47713',
  recording: 'recordings/harbour-truck-1.osr',
  waived: {},
  energyParts: [],
  messages: [],
  faults: [],
  rowsLost: 0,
};
