import type { PlantedBug } from './planted-bugs.js';

/** A copy of a controller with one mistake in it. */
export interface Mutant {
  /** Unique; names its file: `planted.wrong-ratio`, `217.30 + to -`. */
  readonly name: string;
  readonly kind: 'planted' | 'mechanical';
  /** For people. */
  readonly what: string;
  /** TypeScript. */
  readonly source: string;
}

/** Puts a planted mistake into a source. Throws where a text does not stand in it exactly once. */
export function planted(source: string, bug: PlantedBug): Mutant {
  let text = source;
  for (const { from, to } of bug.edits) {
    const count = text.split(from).length - 1;
    if (count !== 1)
      throw new Error(
        `planted mistake ${bug.name}: \`${from.trim()}\` stands ${count} times in the source, expected once: write it anew`,
      );
    text = text.replace(from, () => to);
  }
  return { name: `planted.${bug.name}`, kind: 'planted', what: bug.mistake, source: text };
}
