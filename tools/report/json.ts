import type { RunReportData } from './data.js';

/**
 * The report as JSON for machines: everything but the curves and histogram buckets. SI, ticks. What JSON has no number for is text:
 * "Infinity", "-Infinity", "NaN".
 */
export function reportJson(data: RunReportData): string {
  const { plots: _plots, ...rest } = data;
  const timing = data.timing && {
    ...data.timing,
    measures: data.timing.measures.map(({ buckets: _buckets, ...measure }) => measure),
  };
  return `${JSON.stringify({ format: 'oilspring run report', version: 1, ...rest, timing }, plain, 2)}\n`;
}

function plain(_key: string, value: unknown): unknown {
  return typeof value === 'number' && !Number.isFinite(value) ? String(value) : value;
}
