import { describe, expect, it } from 'vitest';
import { runChild } from '../../support/child.js';

interface Seen {
  readonly known: boolean;
  readonly functions: number;
  readonly optimised: number;
  readonly lost: readonly { readonly name: string; readonly tick: number }[];
  readonly late: readonly { readonly name: string; readonly tick: number }[];
}

describe('code watch', () => {
  it('sees code that is given up and code that is compiled later, names it with its tick, and allocates nothing', async () => {
    const result = await runChild(new URL('./code-watch-child.ts', import.meta.url));
    expect(result.errors).toBe('');
    const { quiet, troubled, bytes, finished } = JSON.parse(result.output) as {
      quiet: Seen;
      troubled: Seen;
      bytes: number;
      finished: Seen;
    };
    expect(quiet).toMatchObject({ known: true, functions: 3, optimised: 1, lost: [], late: [] });
    expect(troubled.lost.map((one) => one.name)).toEqual(['Sum.of']);
    // three functions, one a tick
    expect(troubled.lost[0]!.tick).toBeLessThan(1003);
    expect(troubled.lost[0]!.tick).toBeGreaterThanOrEqual(1000);
    expect(troubled.late.map((one) => one.name)).toEqual(['Sum.late']);
    expect(finished.lost).toEqual(troubled.lost);
    expect(bytes).toBeLessThan(1);
  });
});
