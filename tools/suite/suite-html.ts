import { caution } from '../report/data.js';
import { style } from '../report/style.js';
import { escaped, marginText } from '../report/text.js';
import type { SuiteJudgement, SuiteResult } from './result.js';

const signs: Record<SuiteResult['verdict'], readonly [string, string]> = {
  pass: ['✓', 'pass'],
  fail: ['✗', 'fail'],
  'not exercised': ['○', 'none'],
  'not valid': ['⊘', 'open'],
  broken: ['⊘', 'open'],
};

export interface SuitePage {
  readonly title: string;
  readonly bench: string;
  readonly created: string;
  /** Wall time of the suite, s, and how it ran: `2 at a time`. */
  readonly took: number;
  readonly how: string;
  readonly judgement: SuiteJudgement;
  readonly results: readonly SuiteResult[];
  /** Pages of single runs beside this one, by name. */
  readonly pages: ReadonlyMap<string, string>;
}

/** One page for all runs of a suite; needs nothing else, prints on A4. */
export function suiteHtml(page: SuitePage): string {
  const { judgement, results } = page;
  const [, kind] = signs[judgement.verdict];
  const word = (verdict: SuiteResult['verdict']) =>
    `<span class="word ${signs[verdict][1]}">${signs[verdict][0]} ${verdict}</span>`;
  const runs = results.map((one) => {
    const link = page.pages.get(one.name);
    const title =
      link === undefined ? escaped(one.name) : `<a href="${escaped(encodeURI(link))}">${escaped(one.name)}</a>`;
    const failed = (one.summary?.requirements ?? [])
      .filter((r) => r.verdict === 'fail')
      .map((r) => `${r.id} ${marginText(r.margin ?? Number.NEGATIVE_INFINITY, r.unit)}`);
    const faults = (one.summary?.faults ?? []).map((fault) => fault.path);
    const notes = [...failed, ...one.why, ...(faults.length > 0 ? [`faults: ${[...new Set(faults)].join(', ')}`] : [])];
    return `<tr><td class="w">${word(one.verdict)}</td><td class="wrap name"><strong>${title}</strong> ${escaped(one.title)}<br><span class="quiet">${notes.map(escaped).join(' · ')}</span></td><td class="n">${one.summary ? `${one.summary.simulated.toFixed(0)} s` : '–'}</td><td class="n">${one.took.toFixed(1)} s</td></tr>`;
  });
  const requirements = judgement.requirements.map((one) => {
    const verdict = one.failed.length > 0 ? 'fail' : one.passed > 0 ? 'pass' : 'not exercised';
    const least = one.least === null ? '–' : escaped(marginText(one.least.margin, one.unit));
    const where =
      one.least === null
        ? ''
        : `<br><span class="quiet">least in ${escaped(one.least.run)}${one.failed.length > 0 ? `; failed in ${one.failed.map(escaped).join(', ')}` : ''}</span>`;
    return `<tr><td class="w">${word(verdict)}</td><td class="wrap name"><strong>${escaped(one.id)}</strong> ${escaped(one.text)}${where}</td><td class="n">${least}</td><td class="n">${one.passed}</td><td class="n">${one.failed.length}</td><td class="n">${one.notExercised + one.undecided}</td></tr>`;
  });
  const table = (heads: readonly string[], rows: readonly string[]) =>
    `<div class="scroll"><table><thead><tr>${heads.map((one) => (one.startsWith('>') ? `<th scope="col" class="n">${one.slice(1)}</th>` : `<th scope="col">${one}</th>`)).join('')}</tr></thead><tbody>${rows.join('\n')}</tbody></table></div>`;
  return `<!doctype html>
<html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width,initial-scale=1">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'">
<title>${escaped(`${judgement.verdict}: ${page.title}`)}</title><style>${style}</style></head><body><main>
<header><h1>${escaped(page.title)}</h1><p class="meta">${escaped(page.bench)}, ${escaped(page.created)}</p>
<div class="verdict ${kind}" role="status">${word(judgement.verdict)}<div><p>${escaped(judgement.summary)}</p></div></div>
<p class="quiet">${results.length} runs in ${page.took.toFixed(0)} s, ${escaped(page.how)}. Recordings of runs that did not pass are kept whole; of the runs that passed, those with the least margin of a requirement.</p></header>
<section><h2 id="runs">Runs</h2>${table(['Verdict', 'Run', '>Simulated', '>Took'], runs)}</section>
<section><h2 id="requirements">Requirements over all runs</h2>${table(['Verdict', 'Requirement', '>Least margin', '>Pass', '>Fail', '>Not exercised'], requirements)}</section>
<p class="caution"><strong>Caution.</strong> ${escaped(caution)}</p>
</main></body></html>
`;
}
