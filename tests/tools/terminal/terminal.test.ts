import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { eventText } from '../../../tools/terminal/event-text.js';
import type { TerminalFrame } from '../../../tools/terminal/frame.js';
import { renderPanel, renderPlain } from '../../../tools/terminal/panel.js';
import { show, showClock, showEnergy, showIn, showMicroseconds, showTime } from '../../../tools/terminal/show.js';
import { renderStart } from '../../../tools/terminal/start-up.js';
import { draw, redraws, span, styleOf } from '../../../tools/terminal/style.js';
import { renderSummary } from '../../../tools/terminal/summary.js';
import { clean, cut, left, width, wrap } from '../../../tools/terminal/text.js';
import { renderNote, TerminalView } from '../../../tools/terminal/view.js';
import { bar, fakeFrame, fakeNotes, fakeSummary } from './fake-run.js';
import { Screen } from './screen.js';

const plain = { color: false, unicode: true };
const ascii = { color: false, unicode: false };
// biome-ignore lint/suspicious/noControlCharactersInRegex: the sequences that set colours
const bare = (line: string) => line.replace(/\x1b\[\d+m/g, '');
const full = (columns: number, rows = 60) => ({ columns, rows });

describe('the panel', () => {
  it('at 80 columns', () => {
    expect(renderPanel(fakeFrame(20.6), { columns: 80, rows: 19 }, plain)).toEqual([
      'harbour truck · delivery round                                    live · running',
      '00:20 ━━━━━━━━━━━━━━━━━━━━╸──────────────────────────────────────── 01:02   33 %',
      'step 2 of 5  brake for the first delive…  next in 2.4 s: first delivery unloaded',
      '',
      'speed          14.6 km/h   wanted speed   14.9 km/h   grade                0 %',
      'gear                   3   accelerator          0 %   brake pedal         31 %',
      'pump-motor      -312 N m   displacement       -72 %   engine             0 N m',
      '',
      'high accumulator   329.3 bar(g)  ━━━━━━━━p━━━━━━━━━RM──   in range',
      'low reservoir       7.90 bar(g)  ━━━p━━─────────R───M──   in range',
      'high line          331.3 bar(g)  ━━━━━━━━━━━━━━━━━━RM── ! relief passing',
      'low line            9.20 bar(g)  i━━━━━━────────R───M──   in range',
      'pump case           0.21 bar(g)  ━╸─────────────────c──   in range',
      'charge             high accumulator 73 % full, gas 45 °C   low reservoir 47 % f…',
      'p precharge   i least inlet   c case limit   R relief   M maximum (PS)',
      '',
      'controller   alive      last message  4.0 ms ago   missed 0    400 a second',
      'timing       99 % late by   61 µs at most   overruns 0   worst 1.84 ms',
      'warnings     high line relief passing',
    ]);
  });

  it('shows charges as bars and numbers behind the marks where there is room', () => {
    const lines = renderPanel(fakeFrame(20.6), full(120), plain);
    expect(lines).toContain(
      'high line          331.3 bar(g)  ━━━━━━━━━━━━━━━━━━━━RM── ! relief passing         peak  331.3  relief  330.0  PS  350.0',
    );
    expect(lines).toContain('high accumulator      73 % full  ━━━━━━━━━━━━━━━━━╸──────   gas 45 °C');
  });

  it.each([
    ['near relief', 19.8, '! near relief, in 0.34 s'],
    ['relief passing', 21, '! relief passing'],
  ])('says %s in words beside the bar', (_, t, words) => {
    expect(renderPanel(fakeFrame(t), full(80), plain).find((line) => line.startsWith('high line'))).toContain(words);
  });

  it('marks an alarm with more than a colour', () => {
    const frame = fakeFrame(5);
    const pressures = frame.pressures.map((one) => ({ ...one, level: 12 }));
    expect(renderPanel({ ...frame, pressures }, full(80), plain)[10]).toMatch(/!!above PS$/);
  });

  it('keeps the most urgent pressure, title, timing and warnings when little room is left', () => {
    for (let rows = 1; rows <= 24; rows += 1) {
      const lines = renderPanel(fakeFrame(21), { columns: 80, rows }, plain);
      expect(lines.length).toBeLessThanOrEqual(rows);
      if (rows >= 9) {
        expect(lines.some((line) => line.startsWith('high line') && line.includes('relief passing'))).toBe(true);
        expect(lines.at(-1)).toMatch(/^warnings/);
      }
    }
  });

  it('says what a controller that is silent or was never heard does', () => {
    const line = (t: number) => renderPanel(fakeFrame(t), full(80), plain).find((one) => one.startsWith('controller'));
    expect(line(-1)).toBe('controller   not heard yet');
    expect(line(44.5)).toBe('controller   ! silent   last message  0.50 s ago   missed 0      0 a second');
  });

  it('tells how fast a fast run is, and nothing of lateness', () => {
    const lines = renderPanel(fakeFrame(10, 'fast'), full(80), plain);
    expect(lines).toContain('pace         57 times real time');
    expect(lines.some((line) => line.startsWith('timing'))).toBe(false);
  });

  it('is drawn before there is anything to show', () => {
    const empty: TerminalFrame = {
      ...fakeFrame(0),
      phase: 'building',
      total: 0,
      headlines: [],
      pressures: [],
      charges: [],
      links: [],
    };
    expect(renderPanel(empty, full(80), plain)).toHaveLength(5 + 1);
  });

  it('takes nothing but ASCII where nothing else is known', () => {
    const lines = renderPanel(fakeFrame(20.6), full(100), ascii);
    for (const line of lines) expect(line).toMatch(/^[\x20-\x7e]*$/);
    expect(lines.find((line) => line.startsWith('high line'))).toMatch(/=+R-?M-+ ! relief passing/);
  });
});

describe('whatever a bench is called and however wide the terminal', () => {
  const text = fc.string({ unit: 'binary', maxLength: 40 });
  const number = fc.oneof(fc.double(), fc.constantFrom(0, -1, 1e9, 101325, 3.4e7));
  const settings = fc.record(
    { precharge: number, leastInlet: number, relief: number, maximumAllowable: number, casePressure: number },
    { requiredKeys: [] },
  );
  const frame: fc.Arbitrary<TerminalFrame> = fc.record({
    bench: text,
    scenario: text,
    pace: fc.constantFrom('live' as const, 'fast' as const),
    phase: text,
    elapsed: number,
    total: number,
    realTimeFactor: fc.double({ min: 0, max: 1000, noNaN: true }),
    step: fc.record({ done: fc.nat(99), of: fc.nat(99), name: text, next: fc.record({ name: text, in: number }) }),
    headlines: fc.array(
      fc.record({ label: text, value: number, unit: fc.constantFrom('km/h', '%', '1', 'N m', 'bar(g)') }),
      {
        maxLength: 12,
      },
    ),
    pressures: fc.array(
      fc.record({ label: text, value: number, peak: number, level: fc.nat(13), timeToRelief: number, settings }),
      { maxLength: 12 },
    ),
    charges: fc.array(fc.record({ label: text, charge: number, gasTemperature: number }), { maxLength: 3 }),
    links: fc.array(
      fc.record({
        name: text,
        state: fc.constantFrom('not heard yet' as const, 'alive' as const, 'silent' as const),
        age: number,
        rate: fc.double({ min: 0, max: 1e6, noNaN: true }),
        missed: fc.nat(),
      }),
      { maxLength: 3 },
    ),
    warnings: fc.record({ open: fc.nat(9), present: fc.array(text, { maxLength: 3 }) }),
  });

  it('no line is wider, none holds a control character', () => {
    fc.assert(
      fc.property(
        frame,
        fc.integer({ min: 1, max: 200 }),
        fc.integer({ min: 1, max: 60 }),
        fc.boolean(),
        (one, columns, rows, color) => {
          const lines = renderPanel(one, { columns, rows }, { color, unicode: true });
          expect(lines.length).toBeLessThanOrEqual(rows);
          for (const line of lines) {
            expect(width(bare(line))).toBeLessThanOrEqual(columns);
            expect(bare(line)).not.toMatch(/\p{C}/u);
            if (!color) expect(line).not.toContain('\x1b');
          }
          expect(clean(renderPlain(one))).not.toMatch(/\p{C}/u);
        },
      ),
      { numRuns: 300 },
    );
  });

  it('notes too', () => {
    fc.assert(
      fc.property(text, fc.integer({ min: 30, max: 200 }), (said, columns) => {
        for (const line of renderNote({ time: 12.3456, severity: 'alarm', text: said }, columns, {
          color: true,
          unicode: true,
        })) {
          expect(width(bare(line))).toBeLessThanOrEqual(columns);
          expect(bare(line)).not.toMatch(/\p{C}/u);
        }
      }),
    );
  });

  it('summary and start-up text too, but for what is there to be copied', () => {
    for (const columns of [40, 60, 80, 120]) {
      const start = renderStart(
        {
          version: '0.1.0',
          bench: 'b\x1b[2Jench',
          about: 'a'.repeat(200),
          benchFile: 'bench.yaml',
          scenario: 's',
          length: 62,
          pace: 'live',
          controller: 'a process of its own',
          recording: 'recordings/a.osr',
          seed: 1,
          remarks: ['watch\u202e'],
          relief: { 'highLine.pressure': bar(330) },
        },
        columns,
        plain,
      );
      const end = renderSummary({ ...fakeSummary, bench: 'b\x07' }, columns, plain);
      for (const line of [...start.split('\n'), ...end.split('\n')]) {
        if (/^(recording|again with|state)/.test(line)) continue;
        expect(width(line)).toBeLessThanOrEqual(columns);
      }
      expect(start).toContain('b\\x1b[2Jench');
      expect(start).toContain('watch\\u202e');
      expect(end).toContain('b\\x07');
    }
  });
});

describe('the view on a terminal', () => {
  const environment = { TERM: 'xterm', LANG: 'en_GB.UTF-8' };

  it('draws in place below the notes that have gone by', () => {
    const screen = new Screen(80, 24);
    const view = new TerminalView({ stream: screen, environment });
    let told = 0;
    for (let t = 0; t < 55; t += 0.7) {
      for (; told < fakeNotes.length && fakeNotes[told].time <= t; told += 1) view.note(fakeNotes[told]);
      view.update(fakeFrame(t));
      expect(screen.cursorShown).toBe(false);
    }
    const notes = fakeNotes.flatMap((note) => renderNote(note, 80, plain));
    const panel = renderPanel(fakeFrame(54.6), { columns: 80, rows: 19 }, plain);
    expect(screen.lines).toEqual([...notes, ...panel, '']);
    view.close();
    expect(screen.lines).toEqual([...notes, '']);
    expect(screen.cursorShown).toBe(true);
  });

  it('leaves nothing behind when the panel shrinks', () => {
    const screen = new Screen(80, 40);
    const view = new TerminalView({ stream: screen, environment });
    view.update(fakeFrame(10));
    const small = { ...fakeFrame(10), pressures: [], charges: [] };
    view.update(small);
    expect(screen.lines).toEqual([...renderPanel(small, { columns: 80, rows: 35 }, plain), '']);
  });

  it('starts anew after a change of size, and fits', () => {
    const screen = new Screen(100, 30);
    const view = new TerminalView({ stream: screen, environment });
    view.update(fakeFrame(10));
    screen.resize(50, 12);
    view.update(fakeFrame(10.2));
    view.update(fakeFrame(10.4));
    const panel = renderPanel(fakeFrame(10.4), { columns: 50, rows: 9 }, plain);
    expect(screen.lines.slice(screen.top).filter((line) => line !== '')).toEqual(panel.filter((line) => line !== ''));
  });

  it('lets no burst of events sweep the panel away', () => {
    const screen = new Screen(80, 24);
    const view = new TerminalView({ stream: screen, environment });
    for (let i = 0; i < 100; i += 1) view.note({ time: i / 1000, severity: 'note', text: `event ${i}` });
    view.update(fakeFrame(1));
    expect(screen.lines.slice(0, 9).map((line) => line.trim())).toEqual([
      ...Array.from({ length: 8 }, (_, i) => `${(i / 1000).toFixed(3)} s  event ${i}`),
      '92 more in the recording',
    ]);
    expect(screen.lines[9]).toMatch(/^harbour truck/);
  });

  it('colours only where colours are wanted', () => {
    const drawn = (more: NodeJS.ProcessEnv) => {
      const screen = new Screen(80, 24);
      new TerminalView({ stream: screen, environment: { ...environment, ...more } }).update(fakeFrame(21));
      return screen.written;
    };
    expect(drawn({})).toContain('\x1b[33m');
    expect(bare(drawn({ NO_COLOR: '1' }))).toBe(drawn({ NO_COLOR: '1' }));
    expect(drawn({ NO_COLOR: '' })).toContain('\x1b[33m');
  });
});

describe('the view elsewhere', () => {
  const pipe = () => {
    const out = { text: '', write: (text: string) => (out.text += text) };
    return out;
  };

  it('prints a line every few seconds, and notes at once', () => {
    const stream = pipe();
    let now = 0;
    const view = new TerminalView({ stream, environment: { LANG: 'C.UTF-8' }, now: () => now });
    for (let t = 0; t <= 22; t += 0.2) {
      now = t * 1000;
      if (Math.abs(t - 16) < 0.01) view.note(fakeNotes[2]);
      view.update(fakeFrame(t));
    }
    view.close();
    expect(stream.text.split('\n').slice(0, 3)).toEqual([
      '00:00 of 01:02 | speed 0.0 km/h | high accumulator 233.0 bar(g) | low reservoir 9.50 bar(g) | controller alive | late by 61 µs at 99 % | overruns 0',
      expect.stringMatching(/^00:05 of 01:02/),
      expect.stringMatching(/^00:10 of 01:02/),
    ]);
    expect(stream.text).toContain('  16.000 s  scenario: brake for the first delivery\n');
    expect(stream.text).not.toContain('\x1b');
    expect(stream.text.split('\n').filter((line) => line.includes(' of 01:02'))).toHaveLength(5);
    expect(stream.text).toMatch(/high line 331\.\d bar\(g\) \(relief passing\).*warnings 1/);
  });

  it('takes a dumb terminal for no terminal', () => {
    expect(redraws({ isTTY: true, write() {} }, { TERM: 'dumb' })).toBe(false);
    expect(styleOf({ isTTY: true, write() {} }, { TERM: 'dumb' })).toEqual({ color: false, unicode: false });
  });
});

describe('the summary', () => {
  const text = (changes: Partial<typeof fakeSummary> = {}, columns = 80) =>
    renderSummary({ ...fakeSummary, ...changes }, columns, plain);

  it('tells verdict, timing, peaks, warnings, energy, balance, recording and cautions', () => {
    const lines = text().split('\n');
    expect(lines).toContain('verdict     PASS  harbour truck, delivery round');
    expect(lines).toContain('            lateness       8.2 µs      61 µs     204 µs    1.84 ms');
    expect(lines).toContain('            highLine.pressure                333.0     330.0     350.0     101 %');
    expect(lines).toContain('again with  oilspring rederive recordings/harbour-truck-1.osr');
    const all = text({}, 1000);
    expect(all).toContain(
      'warnings    highLine.pressure relief valve passing, 19.432 s to 23.001 s: peak 333.0 bar(g), setting 330.0 bar(g)',
    );
    expect(all).toContain(
      'recovered into the accumulator 412 kJ, given back to the wheels 318 kJ, fuel 31 g (1.33 MJ)',
    );
    expect(all).toContain(
      'energy closes to 3.1e-7 of the 1.46 MJ turned over (bound 1.0e-3), oil to 2.0e-15 of the oil',
    );
    expect(all).toContain('99.87 % of the replies used in the next step');
    expect(all).toContain('oilspring is not a safety device.');
  });

  it('says why a run does not count, with value and bound', () => {
    const all = text(
      {
        verdict: 'not valid',
        valid: false,
        exitCode: 3,
        verdictText: 'This run does not count: 99th percentile of lateness is past its bound.',
        reasons: [
          {
            reason: 'timing budget',
            what: '99th percentile of lateness is past its bound',
            value: 4.12e-4,
            bound: 2.5e-4,
            unit: 's',
          },
        ],
      },
      1000,
    );
    expect(all).toContain('verdict     NOT VALID');
    expect(all).toContain('- 99th percentile of lateness is past its bound: 412 µs, bound 250 µs');
  });

  it('cries when the balance does not close', () => {
    const ledger = { ...fakeSummary.ledger, energyResidual: 0.02 };
    expect(text({ ledger }, 1000)).toContain('PAST ITS BOUND: energy closes to 2.0e-2');
  });

  it('tells a run without clock, recording, warnings and engine', () => {
    const all = text({
      pace: 'fast',
      realTimeFactor: 57.34,
      timing: { ...fakeSummary.timing, measured: false },
      recording: null,
      warnings: [],
      fuel: null,
      simulated: 12,
    });
    expect(all).toContain('00:12 of 01:02 at 57 times real time');
    expect(all).toContain('timing      fast pace');
    expect(all).toContain('recording   none');
    expect(all).not.toContain('again with');
    expect(all).toContain('warnings    none');
  });

  it('is plain JSON', () => {
    expect(JSON.parse(JSON.stringify(fakeSummary))).toEqual(fakeSummary);
  });
});

describe('words and numbers', () => {
  it.each([
    [bar(251.34), 'Pa', '251.3 bar(g)'],
    [bar(9.204), 'Pa', '9.20 bar(g)'],
    [bar(-0.003), 'Pa', '0.00 bar(g)'],
    [9.5, 'm/s', '34.2 km/h'],
    [353.15, 'K', '80 °C'],
    [1e-3, 'm3/s', '60.0 L/min'],
    [3, '1', '3'],
    [0.12345, '1', '0.1235'],
    [Number.NaN, 'Pa', 'no number'],
    [Number.POSITIVE_INFINITY, 's', 'endless'],
  ])('%f %s is read as %s', (value, unit, text) => {
    expect(show(value, unit)).toBe(text);
  });

  it('shows shares, times, energies', () => {
    expect(showIn(-0.0001, '%')).toBe('0 %');
    expect([0.004, 0.0123, 0.25, 12.34].map(showTime)).toEqual(['4.0 ms', '12 ms', '0.25 s', '12.3 s']);
    expect([8.24, 61.2, 1840, 2.5e6].map(showMicroseconds)).toEqual(['8.2 µs', '61 µs', '1.84 ms', '2.50 s']);
    expect([12, 4120, 412e3, 1.456e6].map(showEnergy)).toEqual(['12.0 J', '4.1 kJ', '412 kJ', '1.46 MJ']);
    expect([0, 62, 3725].map(showClock)).toEqual(['00:00', '01:02', '1:02:05']);
  });

  it('fills the places of events', () => {
    const kind = {
      name: 'n',
      severity: 'warning' as const,
      text: '{subject} passing: {a:Pa}, setting {b:Pa}, {c:s} ({d})',
    };
    expect(eventText(kind, 'highLine.pressure', bar(331), bar(330), 0.2)).toBe(
      'highLine.pressure passing: 331.0 bar(g), setting 330.0 bar(g), 0.20 s ({d})',
    );
    expect(eventText({ ...kind, text: '{a} lost, {b} so far' }, '', 2, 7, 0)).toBe('2 lost, 7 so far');
  });

  it('shows control characters instead of obeying them', () => {
    expect(clean('a\x1b[31mb\x9bc\u202ed\u{e0001}\ud800')).toBe('a\\x1b[31mb\\x9bc\\u202ed\\u{e0001}\\ud800');
    expect(clean('Öl · 油 λ')).toBe('Öl · 油 λ');
  });

  it('measures, cuts and wraps by columns', () => {
    expect(width('油圧 a\u0301')).toBe(6);
    expect(cut('油圧ライン', 5)).toBe('油圧…');
    expect(left('油', 4)).toBe('油  ');
    expect(wrap('peak 333.0 bar(g), setting 330.0 bar(g)', 14)).toEqual([
      'peak',
      '333.0 bar(g),',
      'setting',
      '330.0 bar(g)',
    ]);
    expect(wrap('takes 12 s now', 9)).toEqual(['takes', '12 s now']);
    expect(wrap('aaaaaaaaaa', 4)).toEqual(['aaaa', 'aaaa', 'aa']);
    expect(draw([span('ab', 'strong'), span('   ')], 80, plain)).toBe('ab');
  });
});
