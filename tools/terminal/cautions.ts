/** Said at the start of every run, in every summary and in every report. */
export const cautions: readonly string[] = [
  'oilspring is not a safety device. A real bench has relief valves, interlocks and an emergency stop of its own.',
  'Work on hydraulic accumulators and lines follows local codes and belongs to people licensed for it.',
];
