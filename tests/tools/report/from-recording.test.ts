import { readFileSync, truncateSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { reportOfRecording } from '../../../tools/report/from-recording.js';
import { reportHtml } from '../../../tools/report/html.js';
import { runCommand, scratch, truck } from '../../system/command.js';

const folder = scratch();
afterAll(() => folder.remove());

describe('the report of a recording', () => {
  const file = folder.file('run.osrec');
  beforeAll(async () => {
    const run = await runCommand('run', truck, '--pace', 'fast', '--for', '4s', '--json', '--record', file);
    expect(run.code).toBe(0);
  });

  it('says what the summary of the run says, with plots around each least margin', () => {
    const { data, remarks } = reportOfRecording(file);
    expect(remarks).toEqual([]);
    expect(data.judgement.verdict).toBe('pass');
    expect(data.ticks).toBe(4000);
    const pressure = data.requirements.find((one) => one.id === 'HP-2')!;
    expect(pressure.verdict).toBe('pass');
    expect(pressure.margin).toBeGreaterThan(5e6);
    expect(data.requirements.find((one) => one.id === 'KO-1')!.verdict).toBe('not exercised');
    const plot = data.plots.find((one) => one.subject === 'HP-2')!;
    const drawn = plot.traces.find((one) => one.path === 'highLine.pressure')!;
    // the least margin is where the plot says, to single precision
    const at = pressure.tick - plot.firstTick;
    expect(Math.max(...Array.from(drawn.values))).toBeCloseTo(drawn.values[at]!, -2);
    expect(plot.settings.map((one) => one.label)).toContain('PS');
    expect(data.bus.find((one) => one.message === 'hydraulicStatus')).toMatchObject({ count: 800, due: 800 });
    // what came in and was not lost is stored: within what integrating once a tick costs
    const parts = data.energy!.parts;
    const sum = (key: 'supplied' | 'stored' | 'lost') => parts.reduce((total, one) => total + one[key], 0);
    const lost = sum('lost');
    expect(lost).toBeGreaterThan(100);
    expect(Math.abs(sum('supplied') - sum('stored') - lost)).toBeLessThan(0.05 * lost);
    expect(reportHtml(data)).toContain('HP-2');
    expect(data.drive!.map((fact) => fact.name)).toContain('Speed regression (40 CFR 1037.555)');
  });

  it('without an end is not valid: ended early, judged by what is left', async () => {
    const cut = folder.file('cut.osrec');
    writeFileSync(cut, readFileSync(file));
    truncateSync(cut, Math.floor(readFileSync(file).length / 2));
    const { data, remarks } = reportOfRecording(cut);
    expect(data.judgement.verdict).toBe('not valid');
    expect(data.judgement.reasons[0]!.reason).toBe('ended early');
    expect(remarks[0]).toContain('ended early');
    expect(data.requirements.find((one) => one.id === 'HP-1')!.margin).toBeGreaterThan(5e6);
    const html = folder.file('cut.html');
    const run = await runCommand('report', cut, '--to', html, '--junit', folder.file('cut.xml'));
    expect(run.code).toBe(3);
    expect(readFileSync(html, 'utf8')).toContain('ended early');
    expect(readFileSync(folder.file('cut.xml'), 'utf8')).toContain('errors="1"');
  });
});
