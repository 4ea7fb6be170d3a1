import { mineralOil } from '../../plants/fluids.js';

/** Numbers of a mineral oil as element functions see them; parameters not given take their defaults. */
export function oil(parameters: Readonly<Record<string, number>> = {}): Readonly<Record<string, number>> {
  const values: Record<string, number> = {};
  for (const key of Object.keys(parameters))
    if (!(key in mineralOil.parameters)) throw new Error(`no ${key} in mineral-oil`);
  for (const [key, declaration] of Object.entries(mineralOil.parameters))
    values[key] = parameters[key] ?? declaration.default!;
  return mineralOil.values(values);
}

export const bar = 1e5;
export const litre = 1e-3;
export const litresPerMinute = 1e-3 / 60;
export const rpm = (2 * Math.PI) / 60;
