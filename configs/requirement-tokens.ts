import { parseUnit, type Unit, UnitError } from './units.js';

/** A piece of a requirement's text. Offsets count characters of the text. */
export type Token =
  | {
      readonly kind: 'number';
      readonly value: number;
      readonly written: string;
      readonly unit: Unit | undefined;
      readonly start: number;
      readonly end: number;
    }
  | {
      readonly kind: 'word' | 'path' | 'symbol' | 'end';
      readonly text: string;
      readonly start: number;
      readonly end: number;
    };

/** A text that cannot be read, at an offset of it. */
export class TextError extends Error {
  override readonly name = 'TextError';
  constructor(
    readonly at: number,
    readonly what: string,
    readonly remedy: string,
    readonly value?: string,
  ) {
    super(`${what}, ${remedy}`);
  }
}

/** Words with a meaning; none of them is a unit or, alone, a signal. */
export const keywords: ReadonlySet<string> = new Set(
  'always never eventually whenever then if and or not implies until within from to for at the is on off between rises falls crosses above below settles happens begins ends stays over per of'.split(
    ' ',
  ),
);

const numberPattern = /(?:\d+(?:\.\d+)?|\.\d+)(?:[eE][-+]?\d+)?/y;
const wordPattern = /[A-Za-z_][A-Za-z0-9_]*(?:\.[A-Za-z0-9_]+)*/y;
const symbolPattern = /<=|>=|≤|≥|\+-|±|[<>()+\-*/,=]/y;
const unitWord = /[A-Za-zµμΩ°%‰]+(?:\([ag]\))?(?:\^?-?\d+)?|\([^()]{1,40}\)/y;
const longestText = 4000;

/** Splits a text into tokens, the last of kind `end`. Throws TextError. */
export function tokens(text: string): Token[] {
  if (text.length > longestText)
    throw new TextError(0, 'a requirement too long to be read', `keep it below ${longestText} characters`);
  const found: Token[] = [];
  let at = 0;
  for (;;) {
    while (at < text.length && /\s/.test(text[at]!)) at += 1;
    if (at >= text.length) break;
    const number = matchAt(numberPattern, text, at);
    const word = matchAt(wordPattern, text, at);
    const symbol = matchAt(symbolPattern, text, at);
    if (number !== undefined) {
      const value = Number(number);
      if (!Number.isFinite(value)) throw new TextError(at, 'not a finite number', 'write a smaller one', number);
      const unit = unitBehind(text, at + number.length);
      const end = unit?.end ?? at + number.length;
      const written = unit ? `${number} ${unit.unit.text}` : number;
      found.push({ kind: 'number', value, written, unit: unit?.unit, start: at, end });
      at = end;
    } else if (word !== undefined) {
      found.push({ kind: word.includes('.') ? 'path' : 'word', text: word, start: at, end: at + word.length });
      at += word.length;
    } else if (symbol !== undefined) {
      const plain = symbol === '≤' ? '<=' : symbol === '≥' ? '>=' : symbol === '±' ? '+-' : symbol;
      found.push({ kind: 'symbol', text: plain, start: at, end: at + symbol.length });
      at += symbol.length;
    } else {
      const character = String.fromCodePoint(text.codePointAt(at)!);
      throw new TextError(at, 'a character that has no meaning here', 'remove it', character);
    }
  }
  found.push({ kind: 'end', text: '', start: text.length, end: text.length });
  return found;
}

function matchAt(pattern: RegExp, text: string, at: number): string | undefined {
  pattern.lastIndex = at;
  return pattern.exec(text)?.[0];
}

/**
 * The longest unit behind a number: words side by side or joined by strokes, up to a keyword. A stroke belongs to the unit only
 * where no space stands before it: `5 m/s`, but `5 m / x.y`.
 */
function unitBehind(text: string, from: number): { readonly unit: Unit; readonly end: number } | undefined {
  const ends: number[] = [];
  let at = from;
  let first = '';
  for (;;) {
    let next = at;
    if (ends.length > 0 && text[next] === '/') next += 1;
    else if (ends.length > 0 && text[next] !== ' ') break;
    else while (text[next] === ' ' || text[next] === '\n') next += 1;
    const word = matchAt(unitWord, text, next);
    if (word === undefined || keywords.has(word)) break;
    if (word.startsWith('(') && text[next - 1] !== '/') break;
    const end = next + word.length;
    // A name that goes on is a signal or a function.
    if (/[A-Za-z0-9_.(]/.test(text[end] ?? '')) {
      if (ends.length === 0 && text[end] === '(')
        throw new TextError(next, 'unknown unit', 'use (a) or (g) behind a pressure', text.slice(next, next + 12));
      break;
    }
    if (first === '') first = word;
    ends.push(end);
    at = end;
    if (ends.length >= 8) break;
  }
  let failure: UnitError | undefined;
  for (const end of ends.reverse()) {
    try {
      return { unit: parseUnit(text.slice(from, end)), end };
    } catch (error) {
      if (!(error instanceof UnitError)) throw error;
      failure = error;
    }
  }
  if (failure) throw new TextError(from, failure.what, failure.remedy, first);
  return undefined;
}
