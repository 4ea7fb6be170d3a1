import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { ReportedPlot } from '../../../tools/report/data.js';
import { decimate, drawnSamples } from '../../../tools/report/decimate.js';
import { energySides } from '../../../tools/report/energy.js';
import { reportHtml } from '../../../tools/report/html.js';
import { reportJson } from '../../../tools/report/json.js';
import { junitXml } from '../../../tools/report/junit.js';
import { plotSvg } from '../../../tools/report/plot.js';
import { escaped, marginText, safeLink, ticksOf } from '../../../tools/report/text.js';
import { invented } from './sample-run.js';

const plain = invented();
const hostile = invented({ hostile: true, facts: { hands: ['brake pedal <set> by "hand" & eye'] } });

describe('decimation', () => {
  it('keeps a spike of a single sample, wherever it stands', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 5000 }),
        fc.nat(),
        fc.boolean(),
        fc.integer({ min: 1, max: 600 }),
        (length, place, up, columns) => {
          const values = new Float64Array(length).fill(1);
          const at = place % length;
          values[at] = up ? 2 : 0;
          expect(drawnSamples(values, columns)).toContain(at);
          expect(decimate(values, columns).length).toBeLessThanOrEqual(columns);
        },
      ),
      { numRuns: 500 },
    );
  });

  it('keeps least and greatest of random curves, in order, and passes over what is no number', () => {
    fc.assert(
      fc.property(
        fc.array(fc.oneof(fc.double(), fc.constant(Number.NaN)), { minLength: 1, maxLength: 400 }),
        fc.integer({ min: 1, max: 50 }),
        (values, columns) => {
          const drawn = drawnSamples(values, columns);
          const finite = values.filter(Number.isFinite);
          expect(drawn.every((index, i) => i === 0 || index > drawn[i - 1]!)).toBe(true);
          expect(drawn.every((index) => Number.isFinite(values[index]))).toBe(true);
          if (finite.length === 0) return;
          const kept = drawn.map((index) => values[index]!);
          expect(Math.max(...kept)).toBe(Math.max(...finite));
          expect(Math.min(...kept)).toBe(Math.min(...finite));
        },
      ),
      { numRuns: 500 },
    );
  });
});

describe('plots', () => {
  const plot: ReportedPlot = {
    title: 'spike',
    subject: 'a.pressure',
    unit: 'Pa',
    difference: false,
    firstTick: 1000,
    traces: [
      { path: 'a.pressure', values: Float64Array.from({ length: 60_000 }, (_, i) => (i === 31_234 ? 300e5 : 200e5)) },
    ],
    settings: [
      { label: 'near', value: 310e5 },
      { label: 'far away', value: 3000e5 },
    ],
    marks: [{ label: 'here', tick: 32_234 }],
  };

  it('draw a spike of one sample in 60 000 at its height and time', () => {
    const { svg, samples } = plotSvg(plot, 0.001, 0);
    const path = /class="trace t0"[^>]* d="([^"]+)"/.exec(svg)![1]!;
    const points = [...path.matchAll(/[ML]([\d.]+) ([\d.]+)/g)].map((match) => [Number(match[1]), Number(match[2])]);
    const heights = points.map(([, y]) => y!);
    const top = Math.min(...heights);
    expect(heights.filter((y) => y === top)).toHaveLength(1);
    expect(Math.max(...heights) - top).toBeGreaterThan(80);
    const mark = Number(/class="mark" d="M([\d.]+)/.exec(svg)![1]);
    expect(Math.abs(points[heights.indexOf(top)]![0]! - mark)).toBeLessThan(0.2);
    expect(samples.traces[0]!.y).toContain(300);
  });

  it('draw settings that are near and name those that are far', () => {
    const { svg } = plotSvg(plot, 0.001, 0);
    expect(svg.match(/class="setting"/g)).toHaveLength(1);
    expect(svg).toContain('↑ far away');
  });

  it('stand a curve without numbers, an empty one, a constant one', () => {
    for (const values of [[], [Number.NaN, Number.NaN], [5], [0, 0, 0], [Infinity, 1]]) {
      const { svg } = plotSvg({ ...plot, settings: [], traces: [{ path: 'a', values }] }, 0.001, 0);
      expect(svg).not.toMatch(/NaN|Infinity|undefined/);
    }
  });

  it('surround each least margin with the signals and numbers of the requirement', () => {
    const of = (id: string) => plain.data.plots.filter((one) => one.subject === id);
    expect(of('HP-1').map((one) => one.traces[0]!.path)).toEqual(['highLine.pressure']);
    expect(of('HP-1')[0]!.settings.map((one) => one.label)).toEqual(['< 330 bar(g)', 'PS 350 bar(g)']);
    expect(of('HP-2')[0]!.traces[0]!.path).toBe('abs(highPressureSensor.value - highLine.pressure)');
    const worst = plain.data.requirements.find((one) => one.id === 'HP-2')!;
    const curve = of('HP-2')[0]!;
    expect(Math.max(...Array.from(curve.traces[0]!.values))).toBeCloseTo(4e5 - worst.margin, 3);
    expect(curve.marks[0]!.tick).toBe(worst.tick);
    expect(
      of('BR-1')
        .map((one) => one.unit)
        .sort(),
    ).toEqual(['1', 'm/s']);
    expect(of('OS-1')).toEqual([]);
    expect(of('highLine.pressure')).toHaveLength(1);
  });
});

describe('text', () => {
  it('escapes markup, quotes and what XML forbids', () => {
    expect(escaped(`<a href="x">'&\u0000\ud800`)).toBe('&lt;a href=&quot;x&quot;&gt;&#39;&amp;\ufffd\ufffd');
    expect(escaped('tab\tline\nµ 🛢')).toBe('tab\tline\nµ 🛢');
  });
  it('follows only links that lead to a page', () => {
    expect(safeLink('https://example.org/a?b#c')).toBe('https://example.org/a?b#c');
    for (const bad of ['javascript:alert(1)', 'data:text/html,x', 'file:///etc', 'no link', ' JAVASCRIPT:x'])
      expect(safeLink(bad)).toBeUndefined();
  });
  it('shows margins as differences in units that people read', () => {
    expect(marginText(4.2e5, 'Pa')).toBe('+4.2 bar');
    expect(marginText(-0.5, 'm/s')).toBe('−1.8 km/h');
    expect(marginText(2, 'K')).toBe('+2 K');
    expect(marginText(Infinity, 'Pa')).toBe('–');
    expect(marginText(0, '1')).toBe('+0');
    expect(marginText(-0, '1')).toBe('−0');
  });
  it('finds round numbers for an axis', () => {
    expect(ticksOf(0, 10, 5)).toEqual([0, 2, 4, 6, 8, 10]);
    expect(ticksOf(-0.31, 0.32, 5)).toEqual([-0.2, 0, 0.2]);
    expect(ticksOf(5, 5, 5)).toEqual([5]);
  });
});

describe('energy picture', () => {
  it('shows all that came and went', () => {
    const { left, right } = energySides(plain.data.energy!);
    const sum = (side: readonly { energy: number }[]) => side.reduce((total, share) => total + share.energy, 0);
    const parts = plain.data.energy!.parts;
    expect(sum(left)).toBeCloseTo(
      parts.reduce((total, part) => total + Math.max(0, part.supplied) + Math.max(0, -part.stored), 0),
      3,
    );
    expect(sum(right)).toBeCloseTo(
      parts.reduce((total, part) => total + Math.max(0, -part.supplied) + Math.max(0, part.stored) + part.lost, 0),
      3,
    );
    expect(left[0]).toMatchObject({ name: 'engine', kind: 'supplied' });
  });
});

describe('HTML report', () => {
  const html = reportHtml(plain.data);
  it('holds verdict, margins, settings, files and cautions, and loads nothing', () => {
    for (const text of [
      '✗ fail',
      '+4.177 bar',
      'hydraulic specification 4.2',
      '9f2c9f2c',
      'oilspring rederive',
      'oilspring is not a safety device',
      'not exercised',
      'triggered never',
    ]) {
      expect(html).toContain(text);
    }
    expect(html).not.toMatch(/<(link|img|iframe|object|embed)|\ssrc=|url\((?!#)|@import/i);
    for (const id of ['requirements', 'warnings', 'plots', 'events', 'timing', 'bus', 'energy', 'derive'])
      expect(html).toContain(`<h2 id="${id}"`);
    expect(html.replace(/<script[\s\S]*$/, '')).not.toMatch(/NaN|undefined|\[object/);
  });
  it('leads from a requirement to its plot', () => {
    for (const [, target] of html.matchAll(/href="#([^"]+)"/g)) expect(html, target).toContain(`id="${target}"`);
  });
  it('lets no text become markup', () => {
    const page = reportHtml(hostile.data);
    expect(page).not.toContain('<img');
    expect(page.match(/<script/g)).toHaveLength(2);
    expect(page).toContain('&lt;script&gt;alert(1)&lt;/script&gt;');
    expect(page).toContain('⊘ not valid');
  });
  it('says why there is nothing where there is nothing', () => {
    const page = reportHtml({
      ...plain.data,
      pace: 'fast',
      scenario: null,
      requirements: [],
      warnings: [],
      plots: [],
      events: [],
      timing: null,
      bus: [],
      energy: null,
    });
    for (const text of [
      'Nothing was required',
      'had nothing to say',
      'nothing to draw',
      'No events',
      'At fast pace',
      'No messages',
      'No energy ledger',
    ])
      expect(page).toContain(text);
  });
});

describe('JUnit XML', () => {
  it('counts failures, skips what was not exercised, keeps observations out of failures', () => {
    const xml = junitXml([plain.data]);
    expect(xml).toContain('tests="8" failures="2" errors="0" skipped="1"');
    expect(xml.match(/<failure /g)).toHaveLength(2);
    expect(xml.match(/<testcase /g)).toHaveLength(8);
    expect(xml).toContain('message="fail: margin −0.6526 bar at 25.735 s"');
  });
  it('makes a run that is not valid an error and its requirements skipped', () => {
    const xml = junitXml([hostile.data, plain.data]);
    expect(xml).toContain('tests="8" failures="0" errors="1" skipped="7"');
    expect(xml).toContain('brake pedal &lt;set&gt; by &quot;hand&quot; &amp; eye');
    expect(wellFormed(xml)).toBe(true);
  });
});

describe('JSON report', () => {
  it('reads back, with infinite margins as text and without curves', () => {
    const back = JSON.parse(reportJson(plain.data));
    expect(back.requirements.find((one: { id: string }) => one.id === 'OS-1').margin).toBe('Infinity');
    expect(back.requirements[0].margin).toBeCloseTo(plain.data.requirements[0]!.margin, 6);
    expect(back.judgement).toMatchObject({
      verdict: 'fail',
      exitCode: 1,
      counts: { pass: 4, fail: 2, notExercised: 0, undecided: 0 },
    });
    expect(back.plots).toBeUndefined();
    expect(back.timing.measures[0].buckets).toBeUndefined();
  });
});

/** Tags that close in order and no stray markup: enough for XML that we wrote ourselves. */
function wellFormed(xml: string): boolean {
  const open: string[] = [];
  const rest = xml
    .replace(/^<\?xml[^?]*\?>/, '')
    .replace(/<(\/?)([A-Za-z-]+)((?:\s[A-Za-z]+="[^"<]*")*)\s*(\/?)>/g, (_all, closes, name, _attributes, alone) => {
      if (closes === '/') {
        if (open.pop() !== name) open.push('wrong');
      } else if (alone !== '/') open.push(name);
      return '';
    });
  return open.length === 0 && !/[<>]|&(?!(?:amp|lt|gt|quot|#39);)/.test(rest);
}
