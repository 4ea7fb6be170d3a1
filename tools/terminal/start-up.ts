import { cautions } from './cautions.js';
import { show, showClock } from './show.js';
import { draw, type Line, type Style, span } from './style.js';
import { left, wrap } from './text.js';

/** What is said before a run. Times in s. */
export interface StartUp {
  readonly version: string;
  readonly bench: string;
  readonly about: string;
  readonly benchFile: string;
  readonly scenario: string;
  readonly length: number;
  readonly pace: 'live' | 'fast';
  /** In words: `a process of its own over UDP, 127.0.0.1:47111`. */
  readonly controller: string;
  readonly recording: string | null;
  /** Address of the live page. */
  readonly page?: string;
  readonly seed: number;
  /** What the machine refused, what the bench file remarks. */
  readonly remarks: readonly string[];
  /** Pressures at which something happens, by path, Pa. */
  readonly relief: Readonly<Record<string, number>>;
}

/** The text at the start of a run: what runs, how to end it, cautions. Ends with a line end. */
export function renderStart(start: StartUp, columns: number, style: Style): string {
  const field = (name: string, text: string): Line[] =>
    wrap(text, Math.max(20, columns - 12)).map((line, i) => [span(left(i === 0 ? name : '', 12), 'dim'), span(line)]);
  const relief = Object.entries(start.relief).map(([path, setting]) => `${path} ${show(setting, 'Pa')}`);
  const lines: Line[] = [
    [span(`oilspring ${start.version}`, 'strong')],
    ...field('bench', `${start.bench}${start.about === '' ? '' : `: ${start.about}`} (${start.benchFile})`),
    ...field('scenario', `${start.scenario}, ${showClock(start.length)}, seed ${start.seed}`),
    ...field('pace', start.pace === 'live' ? 'real time' : 'as fast as it goes, controller in lockstep'),
    ...field('controller', start.controller),
    ...(relief.length > 0 ? field('relief', relief.join(', ')) : []),
    ...field('recording', start.recording ?? 'none'),
    ...(start.page === undefined ? [] : field('live page', start.page)),
    ...start.remarks.flatMap((remark) => field('remark', remark)),
    ...cautionLines(columns),
    [span('Ctrl-C ends the run; the recording stays whole.', 'dim')],
  ];
  return `${lines.map((line) => draw(line, columns, style)).join('\n')}\n\n`;
}

export function cautionLines(columns: number): Line[] {
  return cautions.flatMap((text) =>
    wrap(text, Math.max(20, columns - 12)).map((line, i) => [
      span(left(i === 0 ? 'caution' : '', 12), 'warning'),
      span(line),
    ]),
  );
}
