import { formatNumber } from '../../configs/units.js';
import type { RequirementVerdict } from '../../runtime/judge/result.js';
import type { RunVerdict } from '../../runtime/verdict.js';
import { caution, type ReportedPlot, type RunReportData } from './data.js';
import { energySvg } from './energy.js';
import { durationText, histogramSvg } from './histogram.js';
import { frame, type PlotSamples, plotSvg } from './plot.js';
import { script } from './script.js';
import { style } from './style.js';
import { energyText, escaped, marginText, quantity, safeLink, time } from './text.js';

/** A sign before the word: the report must read the same in grey. */
const signs: Record<RequirementVerdict | RunVerdict, readonly [string, string]> = {
  pass: ['✓', 'pass'],
  fail: ['✗', 'fail'],
  'not exercised': ['○', 'none'],
  undecided: ['◐', 'open'],
  'not valid': ['⊘', 'open'],
};

/** One self-contained HTML page: nothing is loaded, every text is escaped, readable without script, printable on A4. */
export function reportHtml(data: RunReportData): string {
  const samples: PlotSamples[] = [];
  const sections: [id: string, title: string, content: string][] = [
    ['requirements', 'Requirements', requirements(data)],
    ['warnings', 'Warnings', warnings(data)],
    ['plots', 'Around each least margin and each warning', plots(data, samples)],
    ['events', 'Events', events(data)],
    ...((data.drive ?? []).length === 0 ? [] : ([['drive', 'Drive trace', drive(data)]] as [string, string, string][])),
    ['timing', 'Timing', timing(data)],
    ['bus', 'Bus', bus(data)],
    ['energy', 'Energy', energy(data)],
    ['derive', 'How to derive it again', derive(data)],
  ];
  const nav = sections.map(([id, title]) => `<a href="#${id}">${title}</a>`).join('');
  const title = `${data.judgement.verdict}: ${data.scenario?.name ?? data.bench.name} (${data.run})`;
  // '<' as an escape, so that no text in it can end the script element.
  const json = JSON.stringify({ frame, plots: samples })
    .replace(/</g, '\\u003c')
    .replace(/[\u2028\u2029]/g, ' ');
  return `<!doctype html>
<html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width,initial-scale=1">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; script-src 'unsafe-inline'; base-uri 'none'; form-action 'none'">
<title>${escaped(title)}</title><style>${style}</style></head><body><main>
${head(data)}<nav aria-label="Parts of this report">${nav}</nav>
${sections.map(([id, name, content]) => `<section aria-labelledby="${id}"><h2 id="${id}">${name}</h2>\n${content}</section>`).join('\n')}
<p class="caution"><strong>Caution.</strong> ${escaped(caution)}</p>
</main><script type="application/json" id="samples">${json}</script><script>${script}</script></body></html>
`;
}

function word(verdict: RequirementVerdict | RunVerdict): string {
  const [sign, kind] = signs[verdict];
  return `<span class="word ${kind}">${sign} ${verdict}</span>`;
}

function head(data: RunReportData): string {
  const { judgement } = data;
  const [, kind] = signs[judgement.verdict];
  const reasons = judgement.reasons.map((one) => {
    const size =
      one.value === undefined
        ? ''
        : `: ${measured(one.value, one.unit)}${one.bound === undefined ? '' : `, bound ${measured(one.bound, one.unit)}`}`;
    return `<li>${escaped(one.reason)}: ${escaped(one.what)}${escaped(size)}</li>`;
  });
  const facts: [string, string][] = [
    ['Bench', data.bench.name],
    ['Scenario', data.scenario?.name ?? 'none'],
    ['Started', data.created.replace(/^(\d{4}-\d\d-\d\d)T(\d\d:\d\d:\d\d)\S*Z$/, '$1 $2 UTC')],
    ['Length', `${time(data.ticks, data.step)} in ${data.ticks} ticks of ${formatNumber(data.step * 1e3)} ms`],
    ['Pace', data.pace === 'live' ? 'live, in real time' : 'fast, controller in lockstep'],
    ['Seed', String(data.seed)],
    ...data.software.map((fact): [string, string] => [fact.name, fact.value]),
    ['State hash', data.derive.stateHash],
  ];
  return `<header><h1>${escaped(data.scenario?.name ?? data.bench.name)}</h1><p class="meta">Run ${escaped(data.run)}</p>
<div class="verdict ${kind}" role="status">${word(judgement.verdict)}<div><p>${escaped(judgement.summary)}</p>${reasons.length > 0 ? `<ul>${reasons.join('')}</ul>` : ''}</div></div>
<dl class="facts">${facts.map(([name, value]) => `<div><dt>${escaped(name)}</dt><dd>${escaped(value)}</dd></div>`).join('')}</dl></header>`;
}

function measured(value: number, unit: string | undefined): string {
  if (unit === 's') return durationText(value * 1e6);
  return quantity(value, unit ?? '1', true, 3);
}

function requirements(data: RunReportData): string {
  if (data.requirements.length === 0) return '<p>Nothing was required of this run.</p>';
  const plotted = new Set(data.plots.map((plot) => plot.subject));
  const rows = data.requirements.map((one) => {
    const link = safeLink(one.link);
    const source = one.source ?? (link === undefined ? undefined : one.link);
    const origin =
      source === undefined
        ? ''
        : `<span class="quiet">${link === undefined ? escaped(source) : `<a href="${escaped(link)}" rel="noreferrer">${escaped(source)}</a>`}</span>`;
    const said = [
      one.triggers === undefined
        ? ''
        : `triggered ${one.triggers === 1 ? 'once' : one.triggers === 0 ? 'never' : `${one.triggers} times`}`,
      one.open ? 'open at the end of the run' : '',
      one.severity,
    ];
    const at = one.tick < 0 ? '–' : time(one.tick, data.step);
    const place = plotted.has(one.id) ? `<a href="#${anchor(one.id)}">${at}</a>` : at;
    return `<tr><td class="w">${word(one.verdict)}</td><td class="wrap name"><strong>${escaped(one.id)}</strong> ${escaped(one.text)}<code class="formula">${escaped(one.formula)}</code><span class="quiet">${escaped(said.filter(Boolean).join(' · '))}</span>${origin === '' ? '' : ` <span class="quiet">·</span> ${origin}`}</td><td class="n">${escaped(marginText(one.margin, one.unit))}</td><td class="n">${place}</td></tr>`;
  });
  return (
    table(['Verdict', 'Requirement', '>Margin', '>At'], rows) +
    '<p class="quiet">A margin says how far the run stayed from failing, in the unit of the signal; negative: by how much it failed.</p>'
  );
}

function warnings(data: RunReportData): string {
  if (data.warnings.length === 0) return '<p>The watch had nothing to say.</p>';
  const plotted = new Set(data.plots.map((plot) => plot.subject));
  const rows = data.warnings.map((one) => {
    const since = time(one.since, data.step);
    const place = plotted.has(one.path) ? `<a href="#${anchor(one.path)}">${since}</a>` : since;
    const until = one.until === null ? 'to the end' : `to ${time(one.until, data.step)}`;
    const often = one.times > 1 ? `, ${one.times} times` : '';
    return `<tr><td class="wrap name"><strong>${escaped(one.level)}</strong><br>${escaped(one.path)}</td><td class="w">${place}<br>${until}${often}</td><td class="n">${escaped(quantity(one.peak, one.unit))}</td><td class="n">${escaped(quantity(one.setting, one.unit))}</td><td class="wrap">${escaped(one.meaning)}${one.acknowledged ? '' : ' <span class="quiet">Not acknowledged.</span>'}</td></tr>`;
  });
  return table(['Warning', 'When', '>Peak', '>Setting', 'What it would mean'], rows);
}

function plots(data: RunReportData, samples: PlotSamples[]): string {
  if (data.plots.length === 0) return '<p>There is nothing to draw.</p>';
  const groups = new Map<string, ReportedPlot[]>();
  for (const plot of data.plots) groups.set(plot.title, [...(groups.get(plot.title) ?? []), plot]);
  const anchors = new Set<string>();
  const drawn = [...groups].map(([title, all]) => {
    const id = anchor(all[0]!.subject);
    const marked = anchors.has(id) ? '' : ` id="${id}"`;
    anchors.add(id);
    const figures = all.map((plot) => {
      const { svg, samples: kept } = plotSvg(plot, data.step, samples.length);
      samples.push(kept);
      return `<figure>${svg}<figcaption>${escaped(plot.traces.map((trace) => trace.path).join(', '))}</figcaption></figure>`;
    });
    return `<h3${marked}>${escaped(title)}</h3>${figures.join('')}`;
  });
  return `<p class="quiet script-only">Move over a plot to read values; drag to zoom, double click to go back.</p>${drawn.join('\n')}`;
}

function events(data: RunReportData): string {
  if (data.events.length === 0) return '<p>No events.</p>';
  const rows = data.events.map(
    (one) =>
      `<tr><td class="n">${time(one.tick, data.step)}</td><td class="w">${one.severity}</td><td class="wrap">${escaped(one.text)}</td></tr>`,
  );
  const left = data.eventsLeftOut > 0 ? `<p class="quiet">${data.eventsLeftOut} more stand in the recording.</p>` : '';
  return table(['>Time', 'Severity', 'Event'], rows) + left;
}

function timing(data: RunReportData): string {
  const { timing: record } = data;
  if (!record) return '<p>At fast pace the run has no timing of its own: the controller was held in lockstep.</p>';
  const rows = record.measures.map(
    (one) =>
      `<tr><td>${escaped(one.name)}</td>${[one.p50, one.p99, one.p999, one.max].map((value) => `<td class="n">${durationText(value)}</td>`).join('')}<td class="n">${one.budget === undefined ? '–' : durationText(one.budget)}</td></tr>`,
  );
  const counts = `<p>${record.overruns} overruns, ${record.collections} collections in the loop thread, drift against wall time ${durationText(record.drift * 1e6)}.</p>`;
  const drawn = record.measures
    .filter((one) => one.buckets.length > 0)
    .map(
      (one) => `<figure>${histogramSvg(one)}<figcaption>${escaped(one.name)}, ticks by duration</figcaption></figure>`,
    );
  return table(['Duration', '>Median', '>99 %', '>99.9 %', '>Largest', '>Budget'], rows) + counts + drawn.join('');
}

function drive(data: RunReportData): string {
  const rows = (data.drive ?? []).map(
    (fact) => `<tr><td>${escaped(fact.name)}</td><td class="wrap">${escaped(fact.value)}</td></tr>`,
  );
  return `<p class="quiet">How well the driver followed the drive, sampled at 10 Hz.</p>${table(['Measure', 'Value'], rows)}`;
}

function bus(data: RunReportData): string {
  if (data.bus.length === 0) return '<p>No messages went over a link.</p>';
  const rows = data.bus.map((one) => {
    const numbers = [one.count, one.due ?? Number.NaN, one.lost, one.late, one.malformed, one.timeOuts];
    return `<tr><td class="wrap">${escaped(one.message)}<br><span class="quiet">${escaped(one.link)}, ${one.direction}</span></td>${numbers.map((value) => `<td class="n">${Number.isNaN(value) ? '–' : value}</td>`).join('')}</tr>`;
  });
  return table(['Message', '>Count', '>Due', '>Lost', '>Late', '>Malformed', '>Time-outs'], rows);
}

function energy(data: RunReportData): string {
  if (!data.energy) return '<p>No energy ledger was kept.</p>';
  const { residual, bound, oilResidual, oilBound } = data.energy;
  const share = (value: number, limit: number | undefined) =>
    `${formatNumber(value, 3)}${limit === undefined ? '' : ` (bound ${formatNumber(limit, 3)})`}`;
  const oil = oilResidual === undefined ? '' : `; of the oil ${share(oilResidual, oilBound)} of its mass`;
  const rows = data.energy.parts.map(
    (part) =>
      `<tr><td class="wrap">${escaped(part.element)}</td>${[part.supplied, part.stored, part.lost].map((value) => `<td class="n">${energyText(value)}</td>`).join('')}</tr>`,
  );
  return `<figure>${energySvg(data.energy)}</figure><p>Residual: ${share(residual, bound)} of the energy turned over${oil}. Losses are declared by each element from its law, so the residual is a check of the computation.</p><details><summary>All elements</summary>${table(['Element', '>From outside', '>Stored at the end less at the start', '>Lost'], rows)}</details>`;
}

function derive(data: RunReportData): string {
  const files = [...data.bench.files, ...(data.scenario?.file ? [data.scenario.file] : [])];
  const rows = files.map(
    (file) => `<tr><td class="wrap">${escaped(file.path)}</td><td><code>${escaped(file.digest)}</code></td></tr>`,
  );
  const machine = data.machine.map(
    (fact) => `<tr><td>${escaped(fact.name)}</td><td class="wrap">${escaped(fact.value)}</td></tr>`,
  );
  return `<p>The recording holds the bench, the scenario and every input with its tick. This computes the run again in a fresh process and compares the state tick by tick:</p>
<pre class="code">${escaped(data.derive.command)}</pre><p>Recording <code>${escaped(data.derive.recording)}</code>; hash of the state at the end <code>${escaped(data.derive.stateHash)}</code>.</p>
${rows.length > 0 ? table(['File', 'SHA-256'], rows) : ''}${machine.length > 0 ? `<details><summary>The machine it ran on</summary>${table(['Fact', 'Value'], machine)}</details>` : ''}`;
}

/** A heading that begins with > stands over numbers. */
function table(headings: readonly string[], rows: readonly string[]): string {
  const cells = headings.map((one) =>
    one.startsWith('>')
      ? `<th scope="col" class="n">${escaped(one.slice(1))}</th>`
      : `<th scope="col">${escaped(one)}</th>`,
  );
  return `<div class="scroll"><table><thead><tr>${cells.join('')}</tr></thead><tbody>${rows.join('\n')}</tbody></table></div>`;
}

/** An anchor from any text. */
function anchor(subject: string): string {
  return `at-${Array.from(subject, (character) => (/[A-Za-z0-9-]/.test(character) ? character : `_${character.codePointAt(0)!.toString(16)}`)).join('')}`;
}
