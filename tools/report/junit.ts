import type { RunReportData } from './data.js';
import { escaped, marginText, time } from './text.js';

/**
 * JUnit XML of one or several runs: a test suite for each run, a test case for each requirement and one for the validity of the run. Not
 * exercised and undecided are `skipped`; in a run that is not valid the requirements are skipped and its validity is an error.
 */
export function junitXml(runs: readonly RunReportData[]): string {
  const suites = runs.map(suite);
  return `<?xml version="1.0" encoding="UTF-8"?>\n<testsuites name="oilspring">\n${suites.join('')}</testsuites>\n`;
}

function suite(data: RunReportData): string {
  const name = data.scenario?.name ?? data.bench.name;
  const seconds = (data.ticks * data.step).toFixed(3);
  const { judgement } = data;
  let failures = 0;
  let skipped = 0;
  const cases = data.requirements.map((one) => {
    const said = `${one.verdict}: margin ${marginText(one.margin, one.unit)}${one.tick >= 0 ? ` at ${time(one.tick, data.step)}` : ''}`;
    let inside = `<system-out>${escaped(said)}</system-out>`;
    if (!judgement.valid) {
      skipped += 1;
      inside = `<skipped message="${escaped(`the run does not count; ${said}`)}"/>`;
    } else if (one.verdict === 'fail' && one.severity !== 'observation') {
      failures += 1;
      inside = `<failure type="${escaped(one.severity)}" message="${escaped(said)}">${escaped(`${one.text}\n${one.formula}`)}</failure>`;
    } else if (one.verdict !== 'pass') {
      skipped += 1;
      inside = `<skipped message="${escaped(said)}"/>`;
    }
    return `    <testcase classname="${escaped(name)}" name="${escaped(`${one.id} ${one.text}`)}" time="${seconds}">${inside}</testcase>\n`;
  });
  const reasons = judgement.reasons.map((one) => `${one.reason}: ${one.what}`).join('\n');
  const validity = judgement.valid
    ? ''
    : `<error type="not valid" message="${escaped(judgement.summary)}">${escaped(reasons)}</error>`;
  cases.push(
    `    <testcase classname="${escaped(name)}" name="the run is valid" time="${seconds}">${validity}</testcase>\n`,
  );
  const counts = `tests="${cases.length}" failures="${failures}" errors="${judgement.valid ? 0 : 1}" skipped="${skipped}"`;
  const properties = [
    ['run', data.run],
    ['bench', data.bench.name],
    ['seed', String(data.seed)],
    ['verdict', judgement.verdict],
    ['recording', data.derive.recording],
    ['stateHash', data.derive.stateHash],
  ].map(([key, value]) => `<property name="${key}" value="${escaped(value!)}"/>`);
  return `  <testsuite name="${escaped(name)}" ${counts} time="${seconds}" timestamp="${escaped(data.created)}">\n    <properties>${properties.join('')}</properties>\n${cases.join('')}  </testsuite>\n`;
}
