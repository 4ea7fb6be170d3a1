/** One word, number, string or sign of a CAN database text, with its place, both counted from 1. */
export interface Token {
  readonly kind: 'word' | 'number' | 'string' | 'sign' | 'end';
  readonly text: string;
  readonly line: number;
  readonly column: number;
  /** First on its line. */
  readonly first: boolean;
}

const wordStart = /[A-Za-z_]/;
const wordPart = /[A-Za-z0-9_]/;
const number = /[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?/y;

/** Cuts a text into tokens; the last is of kind `end`. What no token begins with becomes a sign of one character. */
export function tokensOf(text: string): Token[] {
  const tokens: Token[] = [];
  let line = 1;
  let lineStart = 0;
  let first = true;
  let at = 0;
  const add = (kind: Token['kind'], from: number, value: string): void => {
    tokens.push({ kind, text: value, line, column: from - lineStart + 1, first });
    first = false;
  };
  while (at < text.length) {
    const character = text[at];
    if (character === '\n') {
      at += 1;
      line += 1;
      lineStart = at;
      first = true;
    } else if (/\s/.test(character) || character === '\ufeff') at += 1;
    else if (character === '"') {
      const from = at;
      let value = '';
      at += 1;
      let lines = 0;
      let lastLine = 0;
      while (at < text.length && text[at] !== '"') {
        if (text[at] === '\\' && text[at + 1] === '"') at += 1;
        if (text[at] === '\n') {
          lines += 1;
          lastLine = at + 1;
        }
        value += text[at];
        at += 1;
      }
      add('string', from, value);
      at += 1;
      if (lines > 0) {
        line += lines;
        lineStart = lastLine;
      }
    } else if (wordStart.test(character)) {
      const from = at;
      while (at < text.length && wordPart.test(text[at])) at += 1;
      add('word', from, text.slice(from, at));
    } else {
      number.lastIndex = at;
      const match = number.exec(text);
      // In `8@1-` and `0-3` the sign stands by itself: a number's own sign never follows a digit at once.
      const signed = character === '+' || character === '-';
      if (match && !(signed && at > 0 && wordPart.test(text[at - 1]))) {
        add('number', at, match[0]);
        at += match[0].length;
      } else {
        add('sign', at, character);
        at += 1;
      }
    }
  }
  tokens.push({ kind: 'end', text: 'the end of the file', line, column: Math.max(1, at - lineStart + 1), first: true });
  return tokens;
}
