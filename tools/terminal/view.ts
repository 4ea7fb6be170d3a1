import type { TerminalFrame, TerminalNote } from './frame.js';
import { renderPanel, renderPlain } from './panel.js';
import { draw, type Line, redraws, type Style, span, styleOf, type TerminalStream, type Tone } from './style.js';
import { clean, wrap } from './text.js';

export interface TerminalOptions {
  readonly stream: TerminalStream;
  readonly environment?: NodeJS.ProcessEnv;
  /** Time between lines where nothing can be drawn again, ms. Default 5000. */
  readonly plainEvery?: number;
  /** ms; for tests. */
  readonly now?: () => number;
}

const hideCursor = '\x1b[?25l';
const showCursor = '\x1b[?25h';
const eraseLine = '\x1b[K';
const eraseBelow = '\x1b[J';
const up = (lines: number) => (lines > 0 ? `\x1b[${lines}A` : '');

/** Notes that one redraw lets scroll by; the recording has them all. */
const mostNotes = 8;
/** Without a size of its own. */
const usualColumns = 80;
const usualRows = 24;

/**
 * The live view of a run on the host thread. On a terminal a panel is drawn again in place and notes scroll by above it;
 * elsewhere a line comes every few seconds. Give it frames about five times a second and notes as they come.
 */
export class TerminalView {
  readonly style: Style;
  private readonly stream: TerminalStream;
  private readonly inPlace: boolean;
  private readonly plainEvery: number;
  private readonly now: () => number;
  private drawn = 0;
  private lastPlain = Number.NEGATIVE_INFINITY;
  private notes: TerminalNote[] = [];
  private left = 0;
  private begun = false;
  private resized = false;
  private closed = false;
  private readonly onResize = () => {
    this.resized = true;
  };
  private readonly onExit = () => this.stream.write(showCursor);

  constructor(options: TerminalOptions) {
    this.stream = options.stream;
    this.style = styleOf(options.stream, options.environment);
    this.inPlace = redraws(options.stream, options.environment);
    this.plainEvery = options.plainEvery ?? 5000;
    this.now = options.now ?? (() => performance.now());
  }

  get columns(): number {
    const columns = this.stream.columns ?? 0;
    return this.inPlace && columns > 0 ? columns : usualColumns;
  }

  /** Something happened. Shown with the next frame, or at once where lines only follow one another. */
  note(note: TerminalNote): void {
    if (this.closed) return;
    if (!this.inPlace) this.stream.write(`${renderNote(note, Number.POSITIVE_INFINITY, this.style).join('\n')}\n`);
    else if (this.notes.length < mostNotes) this.notes.push(note);
    else this.left += 1;
  }

  /** Shows the run as it is now. */
  update(frame: TerminalFrame): void {
    if (this.closed) return;
    if (!this.inPlace) {
      if (this.now() - this.lastPlain < this.plainEvery) return;
      this.lastPlain = this.now();
      this.stream.write(`${clean(renderPlain(frame))}\n`);
      return;
    }
    this.begin();
    const rows = panelRows(this.stream.rows || usualRows);
    const panel = renderPanel(frame, { columns: this.columns, rows }, this.style);
    let out = this.home();
    for (const line of this.takeNotes()) out += `${line}${eraseLine}\n`;
    for (const line of panel) out += `${line}${eraseLine}\n`;
    this.stream.write(out + eraseBelow);
    this.drawn = panel.length;
  }

  /** Takes the panel away, gives the cursor back; notes that are left stay. The summary can follow. */
  close(): void {
    if (this.closed) return;
    if (this.begun) {
      let out = this.home();
      for (const line of this.takeNotes()) out += `${line}${eraseLine}\n`;
      this.stream.write(out + eraseBelow + showCursor);
      this.stream.off?.('resize', this.onResize);
      process.off('exit', this.onExit);
    }
    this.closed = true;
  }

  private begin(): void {
    if (this.begun) return;
    this.begun = true;
    this.stream.on?.('resize', this.onResize);
    // However the process ends, the cursor comes back.
    process.on('exit', this.onExit);
    this.stream.write(hideCursor);
  }

  /** To the panel's first line. After a change of size nobody knows how lines were folded: the screen starts anew. */
  private home(): string {
    if (this.resized) {
      this.resized = false;
      return '\x1b[2J\x1b[H';
    }
    return `\r${up(this.drawn)}`;
  }

  private takeNotes(): string[] {
    const lines = this.notes.flatMap((note) => renderNote(note, this.columns, this.style));
    if (this.left > 0)
      lines.push(draw([span(`${' '.repeat(11)}${this.left} more in the recording`, 'dim')], this.columns, this.style));
    this.notes = [];
    this.left = 0;
    return lines;
  }
}

/** One line stays free below, so that a line's end never scrolls the panel away; some above are left to the notes. */
function panelRows(rows: number): number {
  return Math.max(1, rows - 1 - Math.min(4, Math.floor(rows / 6)));
}

const severityWords: Readonly<Record<TerminalNote['severity'], readonly [string, Tone]>> = {
  note: ['', 'plain'],
  warning: ['warning: ', 'warning'],
  alarm: ['ALARM: ', 'alarm'],
  error: ['ERROR: ', 'alarm'],
};

/** `  12.345 s  warning: ...`, wrapped under its own text. */
export function renderNote(note: TerminalNote, columns: number, style: Style): string[] {
  const time = `${note.time.toFixed(3).padStart(8)} s  `;
  const [word, tone] = severityWords[note.severity];
  const room = Math.max(16, columns - time.length);
  const lines = Number.isFinite(columns) ? wrap(word + clean(note.text), room) : [word + clean(note.text)];
  return lines.map((text, i) => {
    const head = i === 0 ? time : ' '.repeat(time.length);
    const spans: Line =
      i === 0 && word !== ''
        ? [span(head, 'dim'), span(text.slice(0, word.length), tone), span(text.slice(word.length))]
        : [span(head, 'dim'), span(text)];
    return draw(spans, columns, style);
  });
}
