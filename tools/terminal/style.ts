import picocolors from 'picocolors';
import { clean, cut, width } from './text.js';

/** How a piece of text is set. Colour only repeats what the words say. */
export type Tone = 'plain' | 'dim' | 'strong' | 'good' | 'warning' | 'alarm';
export interface Span {
  readonly text: string;
  readonly tone?: Tone;
}
export type Line = readonly Span[];

export interface Style {
  readonly color: boolean;
  readonly unicode: boolean;
}

export const glyphs = {
  unicode: { full: '━', rest: '─', end: '╸', ellipsis: '…', dot: '·', degree: '°', micro: 'µ', dash: '–' },
  ascii: { full: '=', rest: '-', end: '>', ellipsis: '~', dot: '-', degree: ' deg', micro: 'u', dash: '-' },
} as const;
export function glyphsOf(style: Style): (typeof glyphs)['unicode' | 'ascii'] {
  return style.unicode ? glyphs.unicode : glyphs.ascii;
}

export interface TerminalStream {
  readonly isTTY?: boolean;
  readonly columns?: number;
  readonly rows?: number;
  write(text: string): unknown;
  on?(event: 'resize', listener: () => void): unknown;
  off?(event: 'resize', listener: () => void): unknown;
}

/** Whether lines can be drawn again in place. */
export function redraws(stream: TerminalStream, environment: NodeJS.ProcessEnv = process.env): boolean {
  return stream.isTTY === true && environment['TERM'] !== 'dumb';
}

/** Colour on a terminal unless NO_COLOR is set to anything; box characters where the locale is UTF-8. */
export function styleOf(stream: TerminalStream, environment: NodeJS.ProcessEnv = process.env): Style {
  const locale = environment['LC_ALL'] || environment['LC_CTYPE'] || environment['LANG'] || '';
  return {
    color: redraws(stream, environment) && (environment['NO_COLOR'] ?? '') === '',
    unicode: /utf-?8/i.test(locale),
  };
}

/** One line as text: cleaned, cut to the columns, coloured. No trailing spaces. */
export function draw(line: Line, columns: number, style: Style): string {
  const { ellipsis } = glyphsOf(style);
  const colors = picocolors.createColors(style.color);
  const paint: Record<Tone, (text: string) => string> = {
    plain: (text) => text,
    dim: colors.dim,
    strong: colors.bold,
    good: colors.green,
    warning: (text) => colors.bold(colors.yellow(text)),
    alarm: (text) => colors.bold(colors.red(text)),
  };
  let room = columns;
  let out = '';
  let pending = '';
  for (const { text, tone = 'plain' } of line) {
    if (room <= 0) break;
    const fitting = cut(style.unicode ? clean(text) : ascii(clean(text)), room, ellipsis);
    room -= width(fitting);
    const bare = fitting.trimEnd();
    if (bare !== '') {
      out += pending + paint[tone](bare);
      pending = '';
    }
    pending += fitting.slice(bare.length);
  }
  return out;
}

const plainForms: Readonly<Record<string, string>> = {
  '…': '~',
  '·': '-',
  '°': ' deg',
  µ: 'u',
  '–': '-',
  '×': 'x',
  '²': '2',
  '³': '3',
};

/** For terminals that take nothing else. */
function ascii(text: string): string {
  return text.replace(/[^\x20-\x7e]/gu, (character) => plainForms[character] ?? '?');
}

export function span(text: string, tone?: Tone): Span {
  return tone === undefined ? { text } : { text, tone };
}
