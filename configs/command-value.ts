import type { SignalInfo } from '../runtime/contract.js';
import { type Expected, parseQuantity, QuantityError, shown } from './quantity.js';
import type { Section } from './section.js';
import type { Tree } from './source.js';

/** What a value that goes to a command may be. */
export function expectedOf(info: SignalInfo): Expected {
  return { unit: info.unit, difference: info.difference, least: info.least, most: info.most };
}

/** A quantity, or on and off for a command without a unit; SI. Adds what is wrong to the section's problems. */
export function commandValue(section: Section, value: Tree, target: SignalInfo, key: string): number | undefined {
  return valueAs(section, value, expectedOf(target), key);
}

export function valueAs(section: Section, value: Tree, expected: Expected, key: string): number | undefined {
  if (value.kind === 'scalar' && expected.unit === '1' && /^(on|off|true|false)$/.test(value.text)) {
    const number = value.text === 'on' || value.text === 'true' ? 1 : 0;
    return section.attempt(value, section.inner(key), () => {
      if (number >= (expected.least ?? 0) && number <= (expected.most ?? 1)) return number;
      throw new QuantityError(
        'a command that is not switched on and off',
        shown(value.text),
        undefined,
        'write a number',
      );
    });
  }
  if (value.kind !== 'scalar') return section.quantityIn(value, expected, key)?.value;
  return section.attempt(value, section.inner(key), () => parseQuantity(value.text, expected).value);
}
