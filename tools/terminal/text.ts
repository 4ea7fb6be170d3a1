/** Text on a terminal: what it may hold, how wide it is, how it is cut and wrapped. */

/** Controls, marks that reorder or hide text, separators of lines, private and unassigned characters, lone surrogates. */
const unsafe = /[\p{C}\p{Zl}\p{Zp}]/gu;

/** Makes names and messages harmless: a control character is shown as `\x1b`, `\u202e`. */
export function clean(text: string): string {
  return text.replace(unsafe, (character) => {
    const code = character.codePointAt(0)!;
    if (code < 0x100) return `\\x${code.toString(16).padStart(2, '0')}`;
    return code < 0x10000 ? `\\u${code.toString(16).padStart(4, '0')}` : `\\u{${code.toString(16)}}`;
  });
}

const combining = /^\p{M}$/u;
/** Wide and fullwidth forms after UAX 11, in coarse ranges; emoji count as wide. */
const wide =
  /^[\u1100-\u115f\u2e80-\u303e\u3041-\u33ff\u3400-\u4dbf\u4e00-\u9fff\ua000-\ua4cf\ua960-\ua97f\uac00-\ud7a3\uf900-\ufaff\ufe30-\ufe6f\uff00-\uff60\uffe0-\uffe6\u{1f300}-\u{1f64f}\u{1f680}-\u{1f6ff}\u{1f900}-\u{1faff}\u{20000}-\u{3fffd}]$/u;

function widthOf(character: string): number {
  if (combining.test(character)) return 0;
  return wide.test(character) ? 2 : 1;
}

/** Columns that a clean text takes. */
export function width(text: string): number {
  let sum = 0;
  for (const character of text) sum += widthOf(character);
  return sum;
}

/** The text in at most `columns`; what is cut off leaves an ellipsis. */
export function cut(text: string, columns: number, ellipsis = '…'): string {
  if (width(text) <= columns) return text;
  if (columns <= 0) return '';
  const room = columns - width(ellipsis);
  if (room < 0) return '';
  let taken = '';
  let used = 0;
  for (const character of text) {
    const next = widthOf(character);
    if (used + next > room) break;
    taken += character;
    used += next;
  }
  return taken.trimEnd() + ellipsis;
}

export function left(text: string, columns: number, ellipsis = '…'): string {
  const fitting = cut(text, columns, ellipsis);
  return fitting + ' '.repeat(Math.max(0, columns - width(fitting)));
}

export function right(text: string, columns: number, ellipsis = '…'): string {
  const fitting = cut(text, columns, ellipsis);
  return ' '.repeat(Math.max(0, columns - width(fitting))) + fitting;
}

/** A number and its unit stay together. */
const united = /(\d) (?=(?:m?s|µs|[kM]?J|bar|%|[kM]?g|B|K|L|rpm|km\/h|°C|N m)(?![\w/]))/g;

/** Breaks at spaces into lines of at most `columns`; a longer word is cut through. */
export function wrap(text: string, columns: number): string[] {
  return breakLines(text.replace(united, '$1\u00a0'), columns).map((line) => line.replace(/\u00a0/g, ' '));
}

function breakLines(text: string, columns: number): string[] {
  const lines: string[] = [];
  let line = '';
  const room = Math.max(1, columns);
  for (let word of text.split(' ')) {
    if (line !== '' && width(line) + 1 + width(word) > room) {
      lines.push(line);
      line = '';
    }
    while (width(word) > room) {
      let head = '';
      for (const character of word) {
        if (head !== '' && width(head) + widthOf(character) > room) break;
        head += character;
      }
      lines.push(head);
      word = word.slice(head.length);
    }
    line = line === '' ? word : `${line} ${word}`;
  }
  if (line !== '' || lines.length === 0) lines.push(line);
  return lines;
}
