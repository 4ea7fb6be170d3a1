import type { Workshop } from './workshop.js';

export interface MeasureWish {
  /** Seconds of each row. */
  readonly seconds: number;
  /** Processors that the rows are measured on, one after the other. */
  readonly cores: readonly number[];
  /** Say what is going on. */
  readonly say: (text: string) => void;
  readonly workshop: Workshop;
}

/** What a part found: rows for the table, all numbers as JSON. */
export interface PartResult {
  readonly part: string;
  readonly about: string;
  /** The command that gives this. */
  readonly command: string;
  readonly rows: readonly { readonly what: string; readonly value: string; readonly goal?: string }[];
  readonly numbers: unknown;
}

export interface Part {
  readonly name: string;
  readonly about: string;
  run(wish: MeasureWish): Promise<Pick<PartResult, 'rows' | 'numbers'>>;
}

export function us(nanoseconds: number): string {
  const value = nanoseconds / 1e3;
  return `${value < 10 ? value.toFixed(1) : value.toFixed(0)} µs`;
}
export function percent(share: number): string {
  return `${(100 * share).toFixed(share > 0.995 && share < 1 ? 2 : 1)} %`;
}
