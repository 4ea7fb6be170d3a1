import { escaped, marginText } from '../report/text.js';
import type { SuiteResult } from './result.js';

/** JUnit XML of a suite: a test suite for each run, as that of one run has it. */
export function suiteJunit(results: readonly SuiteResult[]): string {
  return `<?xml version="1.0" encoding="UTF-8"?>\n<testsuites name="oilspring">\n${results.map(suite).join('')}</testsuites>\n`;
}

function suite({ name, title, summary, verdict, why, took }: SuiteResult): string {
  const label = `classname="${escaped(name)}"`;
  let failures = 0;
  let skipped = 0;
  const sound = verdict !== 'broken' && verdict !== 'not valid';
  const cases = (summary?.requirements ?? []).map((one) => {
    const at = one.at === null ? '' : ` at ${one.at.toFixed(3)} s`;
    const said = `${one.verdict}: margin ${marginText(one.margin ?? Number.POSITIVE_INFINITY, one.unit)}${at}`;
    let inside = `<system-out>${escaped(said)}</system-out>`;
    if (sound && one.verdict === 'fail' && one.severity !== 'observation') {
      failures += 1;
      inside = `<failure type="${escaped(one.severity)}" message="${escaped(said)}">${escaped(one.text)}</failure>`;
    } else if (!sound || one.verdict !== 'pass') {
      skipped += 1;
      inside = `<skipped message="${escaped(sound ? said : `the run does not count; ${said}`)}"/>`;
    }
    return `    <testcase ${label} name="${escaped(`${one.id} ${one.text}`)}">${inside}</testcase>\n`;
  });
  const error = sound
    ? ''
    : `<error type="${verdict}" message="${escaped(why[0] ?? verdict)}">${escaped(why.join('\n'))}</error>`;
  cases.push(`    <testcase ${label} name="the run is valid">${error}</testcase>\n`);
  return `  <testsuite name="${escaped(`${name}: ${title}`)}" tests="${cases.length}" failures="${failures}" errors="${sound ? 0 : 1}" skipped="${skipped}" time="${took.toFixed(3)}">\n${cases.join('')}  </testsuite>\n`;
}
