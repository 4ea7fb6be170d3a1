import { parseRequirements } from '../../../configs/requirements.js';
import type { SignalInfo } from '../../../runtime/contract.js';
import { judgeTrace } from '../../../runtime/judge/offline.js';
import type { RequirementResult } from '../../../runtime/judge/result.js';
import { judgeRun, type RunFacts } from '../../../runtime/verdict.js';
import type { ReportedWarning, RunReportData } from '../../../tools/report/data.js';
import { gatherPlots, type PlotSource, reportedRequirement } from '../../../tools/report/gather.js';

/** A run that never was: invented curves, judged for real. For looking at reports and testing them. */
export const step = 0.001;
const bar = 1e5;
const gauge = (value: number) => value * bar + 101325;

export const infos: SignalInfo[] = [
  { path: 'highLine.pressure', unit: 'Pa', about: '', group: 'reading' },
  { path: 'highPressureSensor.value', unit: 'Pa', about: '', group: 'instrument' },
  { path: 'lowLine.pressure', unit: 'Pa', about: '', group: 'reading' },
  { path: 'vehicle.speed', unit: 'm/s', about: '', group: 'state' },
  { path: 'driver.brakePedal', unit: '1', about: '', group: 'instrument' },
  { path: 'engine.speed', unit: 'rad/s', about: '', group: 'state' },
  { path: 'engine.fuelFlow', unit: 'kg/s', about: '', group: 'reading' },
];

const requirementsText = `requirements:
  HP-1:
    text: The high-pressure line stays below the setting of its relief valve.
    holds: always highLine.pressure < 330 bar(g)
    severity: critical
    source: hydraulic specification 4.2
    link: https://example.org/hydraulics#4.2
  HP-2:
    text: The sensed pressure follows the true one.
    holds: always abs(highPressureSensor.value - highLine.pressure) <= 4 bar
  BR-1:
    text: The truck stops when the brake is pressed, and stays.
    holds: whenever driver.brakePedal rises above 50 % then vehicle.speed falls below 1 km/h within 8 s and stays for 2 s
    severity: critical
    source: braking specification 3.1
  EN-1:
    text: The engine settles at its charging speed after a stop.
    holds: whenever driver.brakePedal > 50 % ends then engine.speed settles to 1200 rpm +- 20 rpm within 4 s and stays for 1 s
  LP-1:
    text: The pump does not cavitate.
    holds: never lowLine.pressure < 3 bar(g)
    severity: minor
  FU-1: at the end integral(engine.fuelFlow) < 60 g
  OS-1:
    text: Nothing moves at over-speed.
    holds: whenever vehicle.speed > 120 km/h then engine.speed < 600 rpm within 1 s
    severity: observation
`;

export interface Invented {
  readonly data: RunReportData;
  readonly results: readonly RequirementResult[];
}

export function invented(change: { facts?: Partial<RunFacts>; hostile?: boolean } = {}): Invented {
  const ticks = 42_000;
  const signals: Record<string, Float64Array> = {};
  const make = (path: string, value: (t: number, tick: number) => number) => {
    signals[path] = Float64Array.from({ length: ticks }, (_, tick) => value(tick * step, tick));
  };
  const brake = (t: number) => (t > 20 && t < 28.5 ? 0.62 : 0);
  const speed = (t: number) =>
    t < 8 ? 1.9 * t : t < 20 ? 15.2 + 0.6 * Math.sin(t) : Math.max(0, 15.4 * (1 - (t - 20) / 6.4));
  const pressure = (t: number, tick: number) => {
    const base = t < 20 ? 210 - 3 * t + 6 * Math.sin(t * 1.3) : t < 26 ? 150 + 29.2 * (t - 20) : 325 - 4 * (t - 26);
    return gauge(base + 1.4 * Math.sin(t * 70) * Math.exp(-((t - 25.5) ** 2)) + (tick === 25_731 ? 3.1 : 0));
  };
  make('highLine.pressure', pressure);
  make(
    'highPressureSensor.value',
    (t, tick) =>
      pressure(Math.max(0, t - 0.004), Math.max(0, tick - 4)) +
      0.35 * bar * Math.sin(tick * 12.9898) +
      (tick === 25_735 ? 1.2 * bar : 0),
  );
  make('lowLine.pressure', (t) => gauge(12 - 5 * Math.exp(-((t - 24) ** 2) / 3) + 0.2 * Math.sin(9 * t)));
  make('vehicle.speed', (t) => speed(t));
  make('driver.brakePedal', (t) => brake(t));
  make('engine.speed', (t) =>
    t < 28.5 ? 86 + 40 * (speed(t) / 16) : 125.7 + 24 * Math.exp(-(t - 28.5) / 0.9) * Math.cos(3.2 * (t - 28.5)),
  );
  make('engine.fuelFlow', (t) => (t > 20 && t < 30 ? 0 : 1.9e-3));

  const text = change.hostile
    ? requirementsText.replace('The pump does not cavitate.', '\'<script>alert(1)</script> & "quoted" ]]>\'')
    : requirementsText;
  const requirements = parseRequirements(text, 'scenario.yaml', infos, step);
  const trace = { ticks, step, values: (path: string) => signals[path]! };
  const results = requirements.map((one) => judgeTrace(one, trace));
  const facts: RunFacts = {
    ticks,
    step,
    ending: 'complete',
    timing: [{ name: '99th percentile of lateness', value: 38e-6, bound: 200e-6, unit: 's' }],
    frames: [{ name: 'share of lost frames', value: 0, bound: 1e-3, unit: '1' }],
    ledger: [{ name: 'relative energy residual', value: 3.1e-5, bound: 1e-3, unit: '1' }],
    rowsLost: 0,
    hands: [],
    ...change.facts,
  };
  const warnings: ReportedWarning[] = [
    {
      path: 'highLine.pressure',
      level: 'near relief',
      since: 25_210,
      until: 26_950,
      peak: signals['highLine.pressure']!.reduce((a, b) => Math.max(a, b), 0),
      setting: gauge(330),
      unit: 'Pa',
      times: 1,
      acknowledged: false,
      meaning: 'The relief valve is about to open; braking energy would turn into heat.',
    },
  ];
  const source: PlotSource = {
    ticks,
    step,
    find: (path) => infos.find((info) => info.path === path),
    values: (path, first, last) => signals[path]?.subarray(first, last + 1),
  };
  const hostile = change.hostile ? `<img src=x onerror=alert(1)>"'&` : '';
  const data: RunReportData = {
    run: `2024-05-06T07-08-09-0001${hostile}`,
    created: '2024-05-06T07:08:09.000Z',
    bench: {
      name: `harbour parcel truck${hostile}`,
      files: [{ path: `bench.yaml${hostile}`, digest: '9f2c'.repeat(16) }],
    },
    scenario: {
      name: `Delivery round with a hard stop${hostile}`,
      file: { path: 'scenarios/round.yaml', digest: '07ab'.repeat(16) },
    },
    software: [
      { name: 'Software', value: 'oilspring 0.1.0, Node 20.20.0' },
      { name: 'Controller', value: `demo controller, separate process${hostile}` },
    ],
    machine: [
      { name: 'processor', value: 'invented, 2 cores' },
      { name: 'scheduling', value: 'SCHED_FIFO 60' },
    ],
    seed: 17,
    step,
    ticks,
    pace: 'live',
    judgement: judgeRun(facts, results),
    requirements: results.map((one) => reportedRequirement(one, step)),
    warnings,
    plots: gatherPlots(source, results, warnings, {
      settings: {
        'highLine.pressure': [
          { label: 'PS 350 bar(g)', value: gauge(350) },
          { label: 'relief 330 bar(g)', value: gauge(330) },
        ],
      },
    }),
    events: [
      { tick: 0, severity: 'note', text: 'controller awake' },
      { tick: 20_001, severity: 'note', text: `script: brake to 62 %${hostile}` },
      {
        tick: 25_210,
        severity: 'warning',
        text: 'highLine.pressure close to the relief setting: 313 bar(g), setting 330 bar(g)',
      },
      { tick: 26_950, severity: 'note', text: 'highLine.pressure back behind its settings after 1.74 s' },
    ],
    eventsLeftOut: 0,
    timing: {
      measures: [
        durations('Lateness', 9, 0.35, 212, 200),
        durations('Step time', 34, 0.18, 161, 1000),
        durations('Period', 1000, 0.004, 1190),
      ],
      overruns: 0,
      drift: 0,
      collections: 0,
    },
    bus: [
      {
        link: 'powertrain',
        message: 'sensorMessage1',
        direction: 'to the controller',
        count: 8400,
        due: 8400,
        lost: 0,
        late: 0,
        malformed: 0,
        timeOuts: 0,
      },
      {
        link: 'powertrain',
        message: `torqueRequest${hostile}`,
        direction: 'from the controller',
        count: 8398,
        due: 8400,
        lost: 1,
        late: 1,
        malformed: 0,
        timeOuts: 0,
      },
    ],
    energy: {
      residual: 3.1e-5,
      bound: 1e-3,
      oilResidual: 4e-15,
      oilBound: 1e-12,
      parts: [
        { element: 'engine', supplied: 1.31e6, stored: 3.1e3, lost: 1.6e5 },
        { element: 'highAccumulator', supplied: 0, stored: -2.12e5, lost: 3.4e4 },
        { element: `vehicle${hostile}`, supplied: 0, stored: 0, lost: 3.9e5 },
        { element: 'pumpMotor', supplied: 0, stored: 0, lost: 1.2e5 },
        { element: 'serviceBrakes', supplied: 0, stored: 0, lost: 5.8e5 },
        { element: 'tyres', supplied: 0, stored: 0, lost: 1.7e5 },
        { element: 'mainRelief', supplied: 0, stored: 0, lost: 900 },
        { element: 'grade', supplied: 1.2e5, stored: 0, lost: 0 },
        { element: 'oil', supplied: 0, stored: 1.819e5, lost: 0 },
      ],
    },
    derive: {
      command: 'oilspring rederive recordings/2024-05-06T07-08-09-0001.osr',
      recording: `recordings/2024-05-06T07-08-09-0001.osr${hostile}`,
      stateHash: '5b1f00c2d3a49e77',
    },
  };
  return { data, results };
}

function durations(name: string, middle: number, spread: number, most: number, budget?: number) {
  const buckets = [];
  for (let from = middle / 6; from < middle * 6; from *= 1.05) {
    const count = Math.round(42_000 * 0.05 * Math.exp(-((Math.log(from / middle) / spread) ** 2)));
    buckets.push({ from, to: from * 1.05, count });
  }
  buckets.push({ from: most * 0.98, to: most, count: 1 });
  return {
    name,
    p50: middle,
    p99: middle * (1 + 2 * spread),
    p999: middle * (1 + 3 * spread),
    max: most,
    ...(budget === undefined ? {} : { budget }),
    buckets,
  };
}
