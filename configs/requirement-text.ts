import type { Expression, Formula } from '../runtime/judge/formula.js';
import { formatNumber } from './units.js';

/** A formula as text that reads back to the same formula. `step`: tick length, s. */
export function formulaText(formula: Formula, step: number): string {
  return new Printer(step).formula(formula);
}

/** An expression as text. */
export function expressionText(expression: Expression, step: number): string {
  return new Printer(step).expression(expression);
}

/** Binding strength of arithmetic: higher binds tighter. */
const strength = { sum: 1, difference: 1, product: 2, quotient: 2 } as const;
const sign = { sum: '+', difference: '-', product: '*', quotient: '/' } as const;

class Printer {
  constructor(private readonly step: number) {}

  formula(f: Formula): string {
    switch (f.is) {
      case 'compare':
        return this.compare(f);
      case 'and':
      case 'or':
      case 'implies':
        return `${this.tight(f.left)} ${f.is} ${this.tight(f.right)}`;
      case 'not':
        return `not ${this.tight(f.of)}`;
      case 'happens':
      case 'begins':
      case 'ends':
        return `${this.tight(f.of)} ${f.is}`;
      case 'start':
      case 'end':
        return `at the ${f.is} ${this.formula(f.of)}`;
      case 'given':
        return `if ${this.tight(f.condition)} then ${this.formula(f.consequence)}`;
      case 'until':
        return `${this.tight(f.left)} until ${this.times(f.from, f.to)}${this.tight(f.right)}`;
      case 'always':
        if (f.of.is === 'given' && f.from === 0 && f.to === null) {
          return `whenever ${this.tight(f.of.condition)} then ${this.formula(f.of.consequence)}`;
        }
        if (f.from === 0 && f.to !== null) return `${this.tight(f.of)} for ${this.time(f.to)}`;
        if (f.of.is === 'not') return `never ${this.times(f.from, f.to)}${this.formula(f.of.of)}`;
        return `always ${this.times(f.from, f.to)}${this.formula(f.of)}`;
      case 'eventually': {
        if (f.from !== 0 || f.to === null) return `eventually ${this.times(f.from, f.to)}${this.formula(f.of)}`;
        const stays = f.of.is === 'always' && f.of.from === 0 && f.of.to !== null ? f.of : undefined;
        if (stays) return `${this.tight(stays.of)} within ${this.time(f.to)} and stays for ${this.time(stays.to!)}`;
        return `${this.tight(f.of)} within ${this.time(f.to)}`;
      }
    }
  }

  /** In brackets unless it is a comparison. */
  private tight(f: Formula): string {
    return f.is === 'compare' ? this.compare(f) : `(${this.formula(f)})`;
  }

  private compare(f: Extract<Formula, { is: 'compare' }>): string {
    const per = f.per === undefined ? '' : ` per ${f.perWritten ?? plain(f.per)}`;
    return `${this.expression(f.left)} ${f.relation} ${this.expression(f.right)}${per}`;
  }

  private times(from: number, to: number | null): string {
    if (from === 0 && to === null) return '';
    if (to === null) return `from ${this.time(from)} `;
    return from === 0 ? `within ${this.time(to)} ` : `from ${this.time(from)} to ${this.time(to)} `;
  }

  private time(ticks: number): string {
    const seconds = Number((ticks * this.step).toPrecision(15));
    return seconds >= 1 || seconds === 0 ? `${seconds} s` : `${Number((seconds * 1000).toPrecision(15))} ms`;
  }

  expression(x: Expression, within = 0): string {
    switch (x.is) {
      case 'signal':
        return x.path;
      case 'number':
        return x.written ?? plain(x.value);
      case 'sum':
      case 'difference':
      case 'product':
      case 'quotient': {
        const own = strength[x.is];
        const text = `${this.expression(x.left, own)} ${sign[x.is]} ${this.expression(x.right, own + 1)}`;
        return own < within ? `(${text})` : text;
      }
      case 'negative':
        // A number behind the sign would become part of it.
        return x.of.is === 'number' ? `-(${this.expression(x.of)})` : `-${this.expression(x.of, 3)}`;
      case 'size':
        return `abs(${this.expression(x.of)})`;
      case 'lesser':
      case 'greater':
        return `${x.is === 'lesser' ? 'min' : 'max'}(${this.expression(x.left)}, ${this.expression(x.right)})`;
      case 'change':
      case 'rate':
        return `${x.is}(${this.expression(x.of)}, ${this.time(x.over)})`;
      case 'count':
        return `count(${this.formula(x.of)})`;
      case 'duration':
        return `duration(${this.formula(x.of)}${this.over(x.over)})`;
      default:
        return `${x.is}(${this.expression(x.of)}${this.over(x.over)})`;
    }
  }

  private over(ticks: number | null): string {
    return ticks === null ? '' : `, ${this.time(ticks)}`;
  }
}

function plain(value: number): string {
  return formatNumber(value, 17);
}
