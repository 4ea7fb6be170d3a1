const sequence = '\x1b';
const tokens = new RegExp(`${sequence}\\[[?\\d;]*[A-Za-z]|[\\s\\S]`, 'gu');

/** As much of a terminal as the view uses: what stands on it after what was written to it. */
export class Screen {
  readonly isTTY = true;
  lines: string[] = [''];
  /** First line that is on the screen. Lines above it have scrolled away and cannot be reached. */
  top = 0;
  row = 0;
  column = 0;
  cursorShown = true;
  written = '';
  private listeners: (() => void)[] = [];

  constructor(
    public columns: number,
    public rows: number,
  ) {}

  on(_event: 'resize', listener: () => void): void {
    this.listeners.push(listener);
  }
  off(_event: 'resize', listener: () => void): void {
    this.listeners = this.listeners.filter((one) => one !== listener);
  }
  resize(columns: number, rows: number): void {
    this.columns = columns;
    this.rows = rows;
    this.top = Math.max(this.top, this.row + 1 - rows);
    for (const listener of this.listeners) listener();
  }

  write(text: string): void {
    this.written += text;
    for (const [token] of text.matchAll(tokens)) this.take(token);
  }

  private take(token: string): void {
    const rest = token.slice(2);
    if (token === '\n') {
      this.row += 1;
      this.column = 0;
      while (this.lines.length <= this.row) this.lines.push('');
      this.top = Math.max(this.top, this.row + 1 - this.rows);
    } else if (token === '\r') this.column = 0;
    else if (!token.startsWith(sequence)) this.put(token);
    else if (rest === 'K') this.lines[this.row] = this.lines[this.row].slice(0, this.column);
    else if (rest === 'J') {
      this.lines[this.row] = this.lines[this.row].slice(0, this.column);
      this.lines.length = this.row + 1;
    } else if (rest === 'H') [this.row, this.column] = [this.top, 0];
    else if (rest === '2J') this.lines.fill('', this.top);
    else if (rest === '?25l') this.cursorShown = false;
    else if (rest === '?25h') this.cursorShown = true;
    else if (/^\d+A$/.test(rest)) this.row = Math.max(this.top, this.row - Number(rest.slice(0, -1)));
    else if (!/^[\d;]*m$/.test(rest)) throw new Error(`unknown on this terminal: ${JSON.stringify(token)}`);
  }

  private put(character: string): void {
    if (character < ' ') throw new Error(`unknown on this terminal: ${JSON.stringify(character)}`);
    if (this.column >= this.columns) throw new Error(`line is wider than ${this.columns}: ${this.lines[this.row]}`);
    const line = this.lines[this.row].padEnd(this.column);
    this.lines[this.row] = line.slice(0, this.column) + character + line.slice(this.column + 1);
    this.column += 1;
  }
}
