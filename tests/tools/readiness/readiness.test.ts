import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { describe, expect, it } from 'vitest';
import type { SchedulingRights } from '../../../runtime/realtime/scheduling.js';
import {
  answerText,
  keepAnswer,
  keptAnswer,
  type ReadinessAnswer,
  thisComputer,
} from '../../../tools/readiness/answer.js';
import { countsOf } from '../../../tools/readiness/cyclictest.js';
import { measureDisk } from '../../../tools/readiness/disk.js';
import { findings, type Machine, thisMachine } from '../../../tools/readiness/findings.js';
import { poissonBound, pool, quantiles, stepsHeld } from '../../../tools/readiness/tail.js';
import { systemdUnit } from '../../../tools/readiness/unit.js';

const rights: SchedulingRights = {
  niceCapability: false,
  priorityLimit: 0,
  lockCapability: false,
  lockLimit: 8 << 20,
  words: '',
};

function machine(files: Record<string, string>, more: Partial<Machine> = {}): Machine {
  return {
    read: (file) => files[file] ?? '',
    list: (folder) => [
      ...new Set(
        Object.keys(files)
          .filter((file) => file.startsWith(`${folder}/`))
          .map((file) => file.slice(folder.length + 1).split('/')[0]!),
      ),
    ],
    rights,
    processors: 4,
    notLive: '',
    ...more,
  };
}

const of = (found: ReturnType<typeof findings>, name: string) => found.find((one) => one.name === name)!;

describe('what readiness finds', () => {
  it('on a computer that was set up for it: nothing to change', () => {
    const found = findings(
      machine(
        {
          '/proc/version': 'Linux version 6.12 #1 SMP PREEMPT_RT',
          '/sys/kernel/realtime': '1',
          '/sys/devices/system/cpu/isolated': '3',
          '/sys/devices/system/cpu/cpu0/cpufreq/scaling_governor': 'performance',
          '/sys/devices/system/cpu/cpu0/cpuidle/state0/name': 'POLL',
          '/sys/devices/system/cpu/cpu0/cpuidle/state0/latency': '0',
          '/sys/devices/system/cpu/cpu0/cpuidle/state1/name': 'C6',
          '/sys/devices/system/cpu/cpu0/cpuidle/state1/latency': '133',
          '/sys/devices/system/cpu/cpu0/cpuidle/state1/disable': '1',
          '/sys/devices/system/cpu/cpu0/topology/thread_siblings_list': '0',
          '/proc/self/timerslack_ns': '50000',
          '/proc/sys/kernel/sched_rt_runtime_us': '950000',
          '/sys/devices/system/clocksource/clocksource0/current_clocksource': 'tsc',
          '/proc/cpuinfo': 'flags\t\t: fpu vme',
          '/proc/swaps': 'Filename Type Size',
          '/sys/class/net/can0/type': '280',
          '/sys/class/net/can0/operstate': 'up',
          '/sys/class/net/lo/type': '772',
        },
        { rights: { ...rights, niceCapability: true, lockLimit: 256 << 20 } },
      ),
    );
    for (const one of found) expect(one.verdict, `${one.name}: ${one.found}`).toBe('good');
    expect(of(found, 'isolated processors').meaning).toContain('--core 3');
    expect(of(found, 'CAN interfaces').found).toBe('can0 (up)');
  });

  it('on a desk computer: says what is wrong, why, and the command for it', () => {
    const found = findings(
      machine({
        '/proc/version': 'Linux version 6.1.0 #1 SMP PREEMPT_DYNAMIC Debian',
        '/proc/cmdline': 'quiet preempt=voluntary',
        '/sys/devices/system/cpu/cpu0/cpufreq/scaling_governor': 'powersave',
        '/sys/devices/system/cpu/cpu1/cpufreq/scaling_governor': 'performance',
        '/sys/devices/system/cpu/cpu0/cpuidle/state0/name': 'C8',
        '/sys/devices/system/cpu/cpu0/cpuidle/state0/latency': '200',
        '/sys/devices/system/cpu/cpu0/topology/thread_siblings_list': '0,4',
        '/sys/devices/system/clocksource/clocksource0/current_clocksource': 'hpet',
        '/proc/cpuinfo': 'flags\t\t: fpu hypervisor',
        '/proc/swaps': 'Filename Type Size\n/dev/sda2 partition 1',
      }),
    );
    expect(of(found, 'kernel preemption')).toMatchObject({
      found: 'PREEMPT_DYNAMIC (preempt=voluntary)',
      verdict: 'could be better',
    });
    expect(of(found, 'right to real-time scheduling').verdict).toBe('bad');
    expect(of(found, 'frequency governor').found).toBe('powersave, performance');
    expect(of(found, 'idle states').meaning).toContain('200 µs');
    for (const name of [
      'kernel preemption',
      'right to real-time scheduling',
      'memory-lock limit',
      'isolated processors',
      'frequency governor',
      'idle states',
      'sibling threads',
      'clock source',
      'hardware',
      'swap',
    ]) {
      expect(of(found, name).verdict, name).toMatch(/could be better|bad/);
      expect(of(found, name).remedy.length, name).toBeGreaterThan(0);
    }
  });

  it('where nothing can be read: unknown, never good', () => {
    const found = findings(machine({}, { notLive: 'live runs need Linux (this is darwin); use --pace fast here' }));
    expect(of(found, 'live runs').verdict).toBe('bad');
    for (const name of [
      'kernel preemption',
      'frequency governor',
      'idle states',
      'sibling threads',
      'clock source',
      'timer slack',
    ])
      expect(of(found, name).verdict, name).toBe('unknown');
  });

  it('reads this computer without an error', () => {
    const found = findings(thisMachine());
    expect(found.length).toBeGreaterThanOrEqual(14);
    for (const one of found) expect(one.found).not.toBe('');
  });
});

describe('the tail of the wake-ups', () => {
  it('bounds a count as tables of the Poisson distribution do', () => {
    // Garwood 1936, Biometrika 28, 437, table of 95 % one-sided upper limits
    expect(poissonBound(0, 0.95)).toBeCloseTo(2.9957, 4);
    expect(poissonBound(1, 0.95)).toBeCloseTo(4.7439, 4);
    expect(poissonBound(10, 0.95)).toBeCloseTo(16.9622, 4);
    expect(poissonBound(2000, 0.95)).toBeGreaterThan(2070);
    expect(poissonBound(2000, 0.95)).toBeLessThan(2080);
  });

  it('says which steps are held, and no more than was measured', () => {
    const counts = new Map([
      [1, 9_990],
      [300, 9],
      [1200, 1],
    ]);
    const [half, whole, two, ten] = stepsHeld(counts, [0.0005, 0.001, 0.002, 0.01]);
    expect(half).toMatchObject({ later: 10, of: 10_000, allowed: 0.00025 });
    expect(half!.atMost).toBeCloseTo(16.9622e-4, 7);
    expect(whole).toMatchObject({ later: 1 });
    expect(two).toMatchObject({ later: 1 });
    expect(ten!.later).toBe(0);
    expect(ten!.atMost).toBeCloseTo(2.9957e-4, 7);
    expect(stepsHeld(new Map(), [0.001])[0]!.atMost).toBe(1);
  });

  it('quantiles and pooling', () => {
    const counts = new Map([
      [3, 1],
      [1, 98],
    ]);
    pool(counts, new Map([[3, 1]]));
    expect(quantiles(counts)).toEqual({ count: 100, p50: 1, p99: 3, p999: 3, max: 3 });
    expect(quantiles(new Map())).toEqual({ count: 0, p50: 0, p99: 0, p999: 0, max: 0 });
  });

  it('reads what cyclictest prints', () => {
    const text =
      '# /dev/cpu_dma_latency set to 0us\n# Histogram\n000000 000000\n000003 000120\n000017 000002\n# Total: 000000122\n# Histogram Overflows: 00001\n';
    expect([...countsOf(text)]).toEqual([
      [3, 120],
      [17, 2],
      [50_000, 1],
    ]);
  });
});

describe('the answer and the unit', () => {
  const answer: ReadinessAnswer = {
    measured: '2026-01-01T00:00:00.000Z',
    computer: thisComputer(),
    seconds: 10,
    policy: 'SCHED_FIFO',
    core: null,
    load: 0.5,
    share: 0.08,
    lateness: { count: 10_000, p50: 0.1, p99: 3, p999: 20, max: 90 },
    cyclictest: { count: 10_000, p50: 5, p99: 9, p999: 30, max: 80 },
    steps: stepsHeld(new Map([[1, 10_000]]), [0.001]),
    disk: null,
    findings: [],
  };

  it('is kept for the records of later runs, and only for this computer', () => {
    const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'readiness-'));
    const file = path.join(folder, 'a', 'readiness.json');
    expect(keptAnswer(file)).toBeUndefined();
    expect(keepAnswer(answer, file)).toBe(true);
    expect(keptAnswer(file)).toEqual(answer);
    expect(answerText(keptAnswer(file))).toMatch(
      /SCHED_FIFO.*p99 3.0 µs.*cyclictest p99 9.0 µs.*1 ms step: 0 of 10000/,
    );
    keepAnswer({ ...answer, computer: 'another one' }, file);
    expect(keptAnswer(file)).toBeUndefined();
    fs.writeFileSync(file, '{');
    expect(keptAnswer(file)).toBeUndefined();
    expect(answerText(undefined)).toContain('oilspring readiness');
    expect(keepAnswer(answer, path.join(file, 'readiness.json'))).toBe(false);
    fs.rmSync(folder, { recursive: true });
  });

  it('measures a disk and leaves nothing behind', () => {
    const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'disk-'));
    const speed = measureDisk(folder);
    expect(speed.rate).toBeGreaterThan(0);
    expect(speed.free).toBeGreaterThan(0);
    expect(fs.readdirSync(folder)).toEqual([]);
    fs.rmSync(folder, { recursive: true });
  });

  it('prints a unit with CAP_SYS_NICE and no other capability', () => {
    const unit = systemdUnit({ folder: '/opt/oilspring', node: '/usr/bin/node', user: 'bench' });
    const caps = unit.match(/CAP_[A-Z_]+/g)!;
    expect(new Set(caps)).toEqual(new Set(['CAP_SYS_NICE']));
    for (const kept of [
      'ProtectSystem=strict',
      'ProtectHome=read-only',
      'NoNewPrivileges=yes',
      'RestrictNamespaces=yes',
    ])
      expect(unit).toContain(`\n${kept}\n`);
    expect(unit).toContain('User=bench');
    expect(unit).not.toMatch(/User=root/);
    expect(unit).toContain('ExecStart=/usr/bin/node dist/tools/oilspring.js run');
  });
});
