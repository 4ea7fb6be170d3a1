import { GCProfiler } from 'node:v8';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { WatchedSignal } from '../../configs/bench-spec.js';
import { BlockLayout, hashBlock } from '../../runtime/block.js';
import { EventCatalogue, type Journal, noJournal } from '../../runtime/journal.js';
import { SignalTable } from '../../runtime/signals.js';
import { notApproaching, Watch } from '../../runtime/watch.js';
import type { WatchInput } from '../../runtime/watch-ladders.js';
import { watchLevelNames, watchLevelNumber, watchLevels } from '../../runtime/watch-levels.js';

const atmosphere = 101325;
const bar = (gauge: number) => atmosphere + gauge * 1e5;
const step = 1e-3;

/** A high line: relief 330, PS 350, near relief from 5 % below; as configs makes it. */
const highLine: WatchedSignal = {
  path: 'highLine.pressure',
  unit: 'Pa',
  relief: { valve: 'mainRelief', setting: bar(330) },
  vicinity: 0.05,
  lookAhead: 0.2,
  limits: [
    {
      level: 'above maximum',
      side: 'above',
      setting: bar(350),
      meaning: 'overloaded',
      from: 'highLine.maximumAllowable',
    },
    {
      level: 'above 1.1 maximum',
      side: 'above',
      setting: bar(385),
      meaning: 'may burst',
      from: 'highLine.maximumAllowable',
    },
    { level: 'below precharge', side: 'below', setting: bar(150), meaning: 'empty', from: 'highAccumulator.precharge' },
  ],
};
const plain = (path: string, unit: string, limits: WatchInput['limits']): WatchInput => ({
  path,
  unit,
  limits,
  vicinity: 0.05,
  lookAhead: 0.2,
});

interface Told {
  readonly tick: number;
  readonly kind: string;
  readonly subject: string;
  readonly a: number;
  readonly b: number;
  readonly c: number;
}

class Rig {
  readonly layout = new BlockLayout();
  readonly table = new SignalTable();
  readonly events = new EventCatalogue();
  readonly told: Told[] = [];
  readonly watch: Watch;
  readonly block: Float64Array;
  readonly signals: Float64Array;
  tick = 0;

  constructor(
    watched: readonly WatchInput[],
    readonly start: readonly number[] = watched.map(() => bar(200)),
  ) {
    for (const { path, unit } of watched) this.table.add({ path, unit, about: '', group: 'reading' });
    this.watch = new Watch({
      watched,
      step,
      ambientPressure: atmosphere,
      layout: this.layout,
      signals: this.table,
      events: this.events,
    });
    this.block = this.layout.create();
    this.signals = new Float64Array(this.table.length);
    this.signals.set(start);
    const journal: Journal = {
      ...noJournal,
      event: (tick, code, subject, a, b, c) => {
        this.told.push({ tick, kind: this.events.kinds[code].name, subject: this.events.subjects[subject], a, b, c });
      },
    };
    this.watch.journal = journal;
    this.watch.begin(this.block, this.signals);
  }

  /** Runs one tick for each value of the first signal. */
  run(values: Iterable<number>): void {
    for (const value of values) {
      this.signals[0] = value;
      this.watch.run(this.block, this.signals, this.tick);
      this.tick += 1;
    }
  }
  stay(value: number, ticks: number): void {
    this.run(new Array<number>(ticks).fill(value));
  }
  get(path: string): number {
    const index = this.table.find(path);
    if (index < 0) throw new Error(`no signal ${path}`);
    return this.signals[index];
  }
  get level(): string {
    return watchLevelNames[this.get('watch.highLine.pressure.level')];
  }
  get warnings() {
    return this.watch.warnings(this.block);
  }
}

describe('levels', () => {
  it.each([
    [200, 'nothing to say'],
    [313.4, 'nothing to say'],
    [313.6, 'near relief'],
    [329.9, 'near relief'],
    [330.1, 'relief passing'],
    [349.9, 'relief passing'],
    [350.1, 'above maximum'],
    [384.9, 'above maximum'],
    [385.1, 'above 1.1 maximum'],
    [150.1, 'nothing to say'],
    [149.9, 'below precharge'],
  ])('%f bar(g) says: %s', (value, level) => {
    const rig = new Rig([highLine], [bar(value)]);
    rig.stay(bar(value), 1);
    expect(rig.level).toBe(level);
    expect(rig.get('watch.worst')).toBe(watchLevelNames.indexOf(level));
    expect(rig.get('watch.count')).toBe(level === 'nothing to say' ? 0 : 1);
  });

  it('have numbers by urgency, every level of the contract once', () => {
    expect(new Set(watchLevels).size).toBe(13);
    expect(watchLevelNumber('near relief')).toBe(1);
    expect(watchLevelNumber('above 1.1 maximum')).toBe(13);
    expect(watchLevelNames[watchLevelNumber('relief passing')]).toBe('relief passing');
  });

  it.each([
    ['over speed', 'rad/s', 'above', 300, 301, 299],
    ['over temperature', 'K', 'above', 358, 358.1, 357.9],
    ['end of travel', '1', 'above', 0.98, 0.981, 0.979],
    ['level low', '1', 'below', 0.2, 0.199, 0.201],
    ['case pressure', 'Pa', 'above', bar(3), bar(3.01), bar(2.99)],
    ['below least inlet', 'Pa', 'below', bar(1), bar(0.99), bar(1.01)],
    ['not following', 'm', 'above', 1e-3, 1.1e-3, 0.9e-3],
    ['locked', '1', 'above', 0.5, 1, 0],
  ] as const)('%s compares a value in %s', (level, unit, side, setting, beyond, within) => {
    const rig = new Rig([plain('a.b', unit, [{ level, side, setting, meaning: 'm', from: 'f' }])], [within]);
    rig.stay(within, 3);
    expect(rig.get('watch.a.b.level')).toBe(0);
    rig.stay(beyond, 1);
    expect(rig.get('watch.a.b.level')).toBe(watchLevelNumber(level));
    expect(rig.warnings).toMatchObject([
      { path: 'a.b', unit, side, level, setting, peak: beyond, since: 0.003, until: null, meaning: 'm', from: 'f' },
    ]);
  });

  it('takes the more cautious of two settings for one level, and the relief setting as that of near relief', () => {
    const rig = new Rig([
      {
        ...highLine,
        limits: [
          ...highLine.limits,
          { level: 'near relief', side: 'above', setting: bar(300), meaning: 'soon full', from: 'watch' },
          { level: 'relief passing', side: 'above', setting: bar(340), meaning: 'late', from: 'watch' },
        ],
      },
    ]);
    const above = rig.watch.ladders.find((ladder) => ladder.side === 'above');
    expect(above?.rungs.map((rung) => [rung.level, rung.begins, rung.setting, rung.from])).toEqual([
      ['near relief', bar(300), bar(330), 'watch'],
      ['relief passing', bar(330), bar(330), 'mainRelief.cracking'],
      ['above maximum', bar(350), bar(350), 'highLine.maximumAllowable'],
      ['above 1.1 maximum', bar(385), bar(385), 'highLine.maximumAllowable'],
    ]);
  });

  it('tells the worst of many signals, and the extreme of each', () => {
    const rig = new Rig(
      [
        highLine,
        plain('shaft.speed', 'rad/s', [{ level: 'over speed', side: 'above', setting: 300, meaning: '', from: '' }]),
        plain('tank.level', '1', [{ level: 'level low', side: 'below', setting: 0.2, meaning: '', from: '' }]),
      ],
      [bar(200), 100, 0.5],
    );
    rig.run([bar(200), bar(331)]);
    rig.signals[1] = 310;
    rig.signals[2] = 0.1;
    rig.stay(bar(320), 1);
    rig.signals[1] = 100;
    rig.signals[2] = 0.4;
    rig.stay(bar(200), 1);
    expect(rig.get('watch.worst')).toBe(watchLevelNumber('over speed'));
    expect(rig.get('watch.count')).toBe(3);
    expect(rig.get('watch.highLine.pressure.peak')).toBe(bar(331));
    expect(rig.get('watch.shaft.speed.peak')).toBe(310);
    expect(rig.get('watch.tank.level.peak')).toBe(0.1);
  });

  it('refuses a path that is no signal and suggests one', () => {
    const table = new SignalTable();
    table.add({ path: 'highLine.pressure', unit: 'Pa', about: '', group: 'reading' });
    const make = () =>
      new Watch({
        watched: [{ ...highLine, path: 'highLine.presure' }],
        step,
        ambientPressure: atmosphere,
        layout: new BlockLayout(),
        signals: table,
        events: new EventCatalogue(),
      });
    expect(make).toThrow(/highLine\.presure.*did you mean highLine\.pressure/s);
  });
});

describe('prediction', () => {
  const rate = 300; // bar/s
  const ramp = function* (from: number, to: number, perSecond = rate) {
    for (let p = from; p <= to; p += perSecond * step) yield bar(p);
  };

  it('tells the time to relief at the present rate', () => {
    const rig = new Rig([highLine]);
    rig.stay(bar(200), 10);
    expect(rig.get('watch.highLine.pressure.timeToRelief')).toBe(notApproaching);
    rig.run(ramp(200, 290));
    const left = (330 - (rig.signals[0] - atmosphere) / 1e5) / rate;
    expect(rig.get('watch.highLine.pressure.timeToRelief')).toBeGreaterThan(0.98 * left);
    expect(rig.get('watch.highLine.pressure.timeToRelief')).toBeLessThan(1.02 * left);
  });

  it('warns before the pressure is near, and says that it is predicted', () => {
    const rig = new Rig([highLine]);
    rig.stay(bar(200), 10);
    rig.run(ramp(200, 312));
    expect(rig.level).toBe('near relief');
    expect(rig.told).toHaveLength(1);
    const [first] = rig.told;
    expect(first.kind).toBe('near relief: highLine.pressure, predicted');
    expect(first.b).toBe(bar(330));
    // Within 0.2 s from 270 bar on; confirmed 50 ms or 15 bar later.
    expect((first.a - atmosphere) / 1e5).toBeGreaterThan(284);
    expect((first.a - atmosphere) / 1e5).toBeLessThan(287);
    expect(first.c).toBeCloseTo((330 - (first.a - atmosphere) / 1e5) / rate, 2);
  });

  it('is quiet on a fast jump that stops short, on ripple, and while a line fills', () => {
    const rig = new Rig([highLine], [bar(1)]);
    rig.stay(bar(1), 300);
    rig.told.length = 0;
    rig.stay(bar(235), 500);
    rig.stay(bar(265), 500);
    for (let i = 0; i < 2000; i += 1) rig.stay(bar(265 + 3 * Math.sin(i * step * 2 * Math.PI * 50)), 1);
    expect(rig.told.filter((one) => one.kind.startsWith('near relief'))).toEqual([]);
  });

  it('is over when the pressure turns', () => {
    const rig = new Rig([highLine]);
    rig.run(ramp(200, 300));
    expect(rig.level).toBe('near relief');
    rig.stay(bar(300), 1000);
    expect(rig.level).toBe('nothing to say');
    expect(rig.told.at(-1)?.kind).toBe('warning over, Pa');
  });

  it('can be switched off', () => {
    const rig = new Rig([{ ...highLine, lookAhead: 0 }]);
    rig.run(ramp(200, 312));
    expect(rig.told).toEqual([]);
  });
});

describe('a warning', () => {
  it('begins, rises, falls and ends to the tick, and keeps its peak', () => {
    const rig = new Rig([highLine], [bar(300)]);
    rig.stay(bar(300), 100);
    rig.stay(bar(320), 100); // near relief from tick 100 on
    rig.stay(bar(335), 50); // relief passing from 200
    rig.stay(bar(360), 5); // above PS from 250
    rig.stay(bar(355), 45);
    rig.stay(bar(320), 300); // falls to near relief
    expect(rig.level).toBe('near relief');
    rig.stay(bar(300), 1000); // last near at tick 599
    expect(rig.level).toBe('nothing to say');
    expect(rig.warnings).toEqual([
      {
        path: 'highLine.pressure',
        unit: 'Pa',
        side: 'above',
        level: 'above maximum',
        since: 0.1,
        until: 0.599,
        peak: bar(360),
        setting: bar(350),
        times: 1,
        acknowledged: false,
        meaning: 'overloaded',
        from: 'highLine.maximumAllowable',
        index: 0,
      },
    ]);
    expect(rig.told.map(({ tick, kind, a, b }) => [tick, kind, a, b])).toEqual([
      [100, 'near relief: highLine.pressure', bar(320), bar(330)],
      [200, 'relief passing: highLine.pressure, risen', bar(335), bar(330)],
      [250, 'above maximum: highLine.pressure, risen', bar(360), bar(350)],
      [799, 'warning over, Pa', bar(360), bar(350)],
    ]);
    expect(rig.told[3].c).toBeCloseTo(0.499, 12);
    expect(rig.told[2].c).toBe(watchLevelNumber('above maximum'));
    expect(rig.told.every((one) => one.subject === 'highLine.pressure')).toBe(true);
  });

  it('catches a single tick', () => {
    const rig = new Rig([highLine], [bar(300)]);
    rig.run([bar(300), bar(390), bar(300)]);
    expect(rig.warnings[0]).toMatchObject({ level: 'above 1.1 maximum', since: 0.001, until: null, peak: bar(390) });
    rig.stay(bar(300), 500);
    expect(rig.warnings[0].level).toBe('above 1.1 maximum');
    expect(rig.get('watch.count')).toBe(1);
  });

  it('does not ring at a setting: hysteresis of 1 % and a hold of 0.2 s', () => {
    const rig = new Rig([highLine], [bar(328)]);
    for (let i = 0; i < 2000; i += 1) rig.stay(bar(i % 2 === 0 ? 330.5 : 327), 1); // within the hysteresis of 3.3 bar
    expect(rig.told.map((one) => one.kind)).toEqual(['relief passing: highLine.pressure']);
    for (let i = 0; i < 2000; i += 1) rig.stay(bar(i % 150 === 0 ? 330.5 : 310), 1); // beyond it for less than the hold
    expect(rig.told).toHaveLength(1);
    expect(rig.level).toBe('relief passing');
    rig.stay(bar(310), 150 + 200);
    expect(rig.level).toBe('nothing to say');
  });

  it('lasts within the hysteresis however long, and ends beyond it', () => {
    const rig = new Rig([{ ...highLine, lookAhead: 0 }], [bar(300)]);
    rig.stay(bar(330), 1);
    expect(rig.level).toBe('near relief'); // at the setting is not beyond it
    rig.stay(bar(330.1), 1);
    rig.stay(bar(326.8), 5000);
    expect(rig.level).toBe('relief passing');
    rig.stay(bar(326.6), 200);
    expect(rig.level).toBe('near relief');
  });

  it('stays open until acknowledged, and counts how often it came', () => {
    const rig = new Rig([highLine], [bar(300)]);
    for (let i = 0; i < 3; i += 1) {
      rig.stay(bar(320), 100);
      rig.stay(bar(300), 400);
    }
    expect(rig.warnings).toMatchObject([{ since: 0, until: 1.099, times: 3, acknowledged: false, index: 0 }]);
    expect(rig.told.filter((one) => one.kind === 'warning over, Pa').map((one) => one.c)).toEqual([
      0.099, 0.099, 0.099,
    ]);
    expect(rig.get('watch.worst')).toBe(0);
    expect(rig.get('watch.count')).toBe(1);
    rig.watch.acknowledge(rig.block, 0, rig.tick);
    rig.stay(bar(300), 1);
    expect(rig.get('watch.count')).toBe(0);
    expect(rig.warnings).toMatchObject([{ since: 0, until: 1.099, times: 3, acknowledged: true, index: -1 }]);
    expect(rig.told.at(-1)).toMatchObject({
      tick: 1500,
      kind: 'warning acknowledged, Pa',
      a: bar(320),
      b: bar(330),
      c: 1.5,
    });
    rig.stay(bar(320), 1);
    expect(rig.warnings).toMatchObject([{ since: 0 }, { since: 1.501, until: null, times: 1, acknowledged: false }]);
  });

  it('that lasts is closed at its end when acknowledged, and calls again when it climbs', () => {
    const rig = new Rig([highLine], [bar(300)]);
    rig.stay(bar(335), 10);
    rig.watch.acknowledge(rig.block, -1, rig.tick);
    rig.stay(bar(335), 10);
    expect(rig.get('watch.unacknowledged')).toBe(0);
    expect(rig.get('watch.count')).toBe(1);
    rig.stay(bar(352), 10);
    expect(rig.get('watch.unacknowledged')).toBe(1);
    expect(rig.told.at(-1)?.kind).toBe('above maximum: highLine.pressure, risen');
    rig.watch.acknowledge(rig.block, -1, rig.tick);
    rig.stay(bar(300), 1000);
    expect(rig.get('watch.count')).toBe(0);
    expect(rig.warnings).toMatchObject([
      { level: 'above maximum', since: 0, until: 0.029, acknowledged: true, index: -1 },
    ]);
  });

  it('calls again for a level that was seen, left and came back while it lasts', () => {
    const rig = new Rig([highLine], [bar(300)]);
    rig.stay(bar(335), 10);
    rig.watch.acknowledge(rig.block, -1, rig.tick);
    rig.stay(bar(320), 400);
    rig.stay(bar(335), 1);
    expect(rig.told.at(-1)?.kind).toBe('relief passing: highLine.pressure, risen');
    expect(rig.get('watch.unacknowledged')).toBe(1);
  });

  it('is acknowledged through its command slot, once per change', () => {
    const rig = new Rig([highLine], [bar(300)]);
    rig.stay(bar(140), 300);
    rig.stay(bar(320), 300);
    expect(rig.get('watch.unacknowledged')).toBe(2);
    const below = rig.watch.ladders.findIndex((ladder) => ladder.side === 'below');
    rig.block[rig.watch.acknowledgeSlot] = below + 1;
    rig.stay(bar(320), 2);
    expect(rig.get('watch.unacknowledged')).toBe(1);
    rig.block[rig.watch.acknowledgeSlot] = -1;
    rig.stay(bar(320), 2);
    expect(rig.get('watch.unacknowledged')).toBe(0);
    rig.stay(bar(352), 2);
    expect(rig.get('watch.unacknowledged')).toBe(1);
  });

  it('does nothing for numbers that are not open', () => {
    const rig = new Rig([highLine]);
    rig.watch.acknowledge(rig.block, 0, 0);
    rig.watch.acknowledge(rig.block, 99, 0);
    expect(rig.told).toEqual([]);
  });

  it('keeps 256 closed ones and counts the rest', () => {
    const rig = new Rig([highLine], [bar(300)]);
    for (let i = 0; i < 260; i += 1) {
      rig.stay(bar(320), 1);
      rig.watch.acknowledge(rig.block, -1, rig.tick);
      rig.stay(bar(300), 250);
    }
    expect(rig.warnings).toHaveLength(256);
    expect(rig.watch.forgotten).toBe(4);
  });
});

it('keeps braces of a meaning out of the places of an event text', () => {
  const rig = new Rig([
    plain('a.b', 'Pa', [
      { level: 'case pressure', side: 'above', setting: bar(3), meaning: 'seal {c:s} out', from: 'f' },
    ]),
  ]);
  const kind = rig.events.kinds.find((one) => one.name === 'case pressure: a.b');
  expect(kind).toEqual({
    name: 'case pressure: a.b',
    severity: 'alarm',
    text: '{subject} case pressure too high: {a:Pa}, setting {b:Pa}; seal c:s out',
  });
});

describe('for every course of a pressure', () => {
  const course = fc.array(fc.tuple(fc.double({ min: 0, max: 420, noNaN: true }), fc.integer({ min: 1, max: 400 })), {
    minLength: 1,
    maxLength: 12,
  });

  it('a level is there in the tick in which its setting is exceeded, and leaves after the hold', () => {
    fc.assert(
      fc.property(course, (stretches) => {
        const rig = new Rig([{ ...highLine, lookAhead: 0 }], [bar(stretches[0][0])]);
        const rungs = rig.watch.ladders.flatMap((ladder) =>
          ladder.rungs.map((rung) => ({ ...rung, side: ladder.side })),
        );
        const lastBeyond = new Map(rungs.map((rung) => [rung.level, Number.NEGATIVE_INFINITY]));
        for (const [value, ticks] of stretches) {
          for (let i = 0; i < ticks; i += 1) {
            rig.stay(bar(value), 1);
            const shown = rig.get('watch.highLine.pressure.level');
            let least = 0;
            let most = 0;
            for (const rung of rungs) {
              const sign = rung.side === 'above' ? 1 : -1;
              if (sign * bar(value) > sign * rung.begins) least = Math.max(least, rung.number);
              if (sign * bar(value) > sign * rung.ends) lastBeyond.set(rung.level, rig.tick - 1);
              // Two ladders may be on at once; a fall through several levels waits for each only once.
              if (rig.tick - 1 - (lastBeyond.get(rung.level) ?? 0) <= 200) most = Math.max(most, rung.number);
            }
            if (shown < least || shown > most) return false;
          }
        }
        return true;
      }),
      { numRuns: 60 },
    );
  });

  it('runs again from any tick, from the block alone, bit by bit', () => {
    fc.assert(
      fc.property(course, fc.nat(), (stretches, cut) => {
        const values = stretches.flatMap(([value, ticks]) => new Array<number>(ticks).fill(bar(value)));
        const at = cut % values.length;
        const whole = new Rig([highLine], [values[0]]);
        whole.run(values.slice(0, at));
        const again = new Rig([highLine], [values[0]]);
        again.block.set(whole.block);
        again.tick = whole.tick;
        const told = whole.told.length;
        whole.run(values.slice(at));
        again.run(values.slice(at));
        expect(hash(again.block)).toEqual(hash(whole.block));
        expect(again.signals).toEqual(whole.signals);
        if (at > 0) expect(again.told).toEqual(whole.told.slice(told));
      }),
      { numRuns: 40 },
    );
  });
});

function hash(block: Float64Array): Int32Array {
  const out = new Int32Array(2);
  hashBlock(new Int32Array(block.buffer), out);
  return out;
}

it('allocates nothing in ticks in which nothing is told', () => {
  const rig = new Rig(Array.from({ length: 10 }, (_, i) => ({ ...highLine, path: `line${i}.pressure` })));
  rig.watch.journal = noJournal;
  const { watch, block, signals } = rig;
  let tick = 0;
  const run = (ticks: number) => {
    for (const end = tick + ticks; tick < end; tick += 1) {
      // Trembles about the setting of near relief, so that warnings are on all the time.
      for (let i = 0; i < 10; i += 1) signals[i] = bar(310 + ((tick * 7 + i) & 7) + 0.123);
      watch.run(block, signals, tick);
    }
  };
  run(50_000);
  const measured = [0, 1, 2].map(() => {
    const profiler = new GCProfiler();
    profiler.start();
    const before = process.memoryUsage().heapUsed;
    run(100_000);
    const growth = process.memoryUsage().heapUsed - before;
    return { collections: profiler.stop().statistics.length, growth: growth / 100_000 };
  });
  // Less than one boxed number (16 bytes) in ten ticks.
  expect(measured).toContainEqual({ collections: 0, growth: expect.toSatisfy((growth: number) => growth < 1.6) });
  expect(rig.get('watch.count')).toBe(10);
});
