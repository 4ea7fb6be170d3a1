/**
 * The units that files may use. Factors to SI are exact where the definition is exact, otherwise as in NIST Special
 * Publication 811 (2008), appendix B. Names are case-sensitive, as in the SI.
 */

/** Exponents of length, mass, time, current, temperature, amount of substance and plane angle. */
export type Dimension = readonly [number, number, number, number, number, number, number];

export interface NamedUnit {
  readonly factor: number;
  /** SI value at zero of this unit; only temperature scales have one. */
  readonly offset: number;
  readonly dimension: Dimension;
  /** An angle other than the radian is in it, so that dropping the angle would change the number. */
  readonly turns: boolean;
}

const d = (length = 0, mass = 0, time = 0, current = 0, temperature = 0, amount = 0, angle = 0): Dimension => [
  length,
  mass,
  time,
  current,
  temperature,
  amount,
  angle,
];

const none = d();
const length = d(1);
const mass = d(0, 1);
const time = d(0, 0, 1);
const force = d(1, 1, -2);
const pressure = d(-1, 1, -2);
const energy = d(2, 1, -2);
const power = d(2, 1, -3);
const volume = d(3);
const temperature = d(0, 0, 0, 0, 1);
const angle = d(0, 0, 0, 0, 0, 0, 1);
const angularSpeed = d(0, 0, -1, 0, 0, 0, 1);

const prefixes: Readonly<Record<string, number>> = {
  n: 1e-9,
  u: 1e-6,
  µ: 1e-6,
  μ: 1e-6,
  m: 1e-3,
  c: 1e-2,
  d: 1e-1,
  da: 10,
  h: 100,
  k: 1e3,
  M: 1e6,
  G: 1e9,
};

export const unitTable: ReadonlyMap<string, NamedUnit> = buildTable();

function buildTable(): Map<string, NamedUnit> {
  const table = new Map<string, NamedUnit>();
  const put = (name: string, factor: number, dimension: Dimension, more: { offset?: number; turns?: boolean } = {}) =>
    table.set(name, { factor, offset: more.offset ?? 0, dimension, turns: more.turns ?? false });
  /** The unit itself and its multiples with the prefixes named. */
  const family = (name: string, factor: number, dimension: Dimension, names: string) => {
    put(name, factor, dimension);
    // Division keeps 1/1000 exact to the last digit where the product by 0.001 would not.
    for (const prefix of names.split(' ').filter(Boolean)) {
      const size = prefixes[prefix]!;
      put(prefix + name, size < 1 ? factor / Math.round(1 / size) : factor * size, dimension);
    }
  };

  family('m', 1, length, 'n u µ μ m c d k');
  put('in', 0.0254, length);
  put('ft', 0.3048, length);
  put('yd', 0.9144, length);
  put('mi', 1609.344, length);
  family('g', 1e-3, mass, 'u µ μ m k');
  put('kg', 1, mass);
  put('t', 1000, mass);
  put('lb', 0.45359237, mass);
  put('oz', 0.028349523125, mass);
  family('s', 1, time, 'n u µ μ m');
  put('min', 60, time);
  put('h', 3600, time);
  put('d', 86400, time);
  family('A', 1, d(0, 0, 0, 1), 'u µ μ m k');
  put('K', 1, temperature);
  put('mK', 1e-3, temperature);
  put('degR', 5 / 9, temperature);
  put('degC', 1, temperature, { offset: 273.15 });
  put('°C', 1, temperature, { offset: 273.15 });
  put('degF', 5 / 9, temperature, { offset: 459.67 * (5 / 9) });
  put('°F', 5 / 9, temperature, { offset: 459.67 * (5 / 9) });
  put('mol', 1, d(0, 0, 0, 0, 0, 1));

  family('N', 1, force, 'm da k M');
  put('lbf', 4.4482216152605, force);
  put('kgf', 9.80665, force);
  family('Pa', 1, pressure, 'm h k M G');
  family('bar', 1e5, pressure, 'm');
  put('psi', 4.4482216152605 / (0.0254 * 0.0254), pressure);
  put('atm', 101325, pressure);
  put('mmHg', 133.3224, pressure);
  put('inHg', 3386.389, pressure);
  family('J', 1, energy, 'm k M G');
  put('Wh', 3600, energy);
  put('kWh', 3.6e6, energy);
  put('Btu', 1055.05585262, energy);
  put('cal', 4.1868, energy);
  family('W', 1, power, 'm k M');
  put('hp', 745.6998715822702, power);
  put('PS', 735.49875, power);

  put('L', 1e-3, volume);
  put('l', 1e-3, volume);
  put('dL', 1e-4, volume);
  put('cL', 1e-5, volume);
  put('mL', 1e-6, volume);
  put('ml', 1e-6, volume);
  put('hL', 0.1, volume);
  put('gal', 0.003785411784, volume);
  put('mph', 0.44704, d(1, 0, -1));
  put('gn', 9.80665, d(1, 0, -2));
  put('St', 1e-4, d(2, 0, -1));
  put('cSt', 1e-6, d(2, 0, -1));
  put('P', 0.1, d(-1, 1, -1));
  put('cP', 1e-3, d(-1, 1, -1));

  family('rad', 1, angle, 'm');
  put('deg', Math.PI / 180, angle, { turns: true });
  put('°', Math.PI / 180, angle, { turns: true });
  put('rev', 2 * Math.PI, angle, { turns: true });
  put('rpm', Math.PI / 30, angularSpeed, { turns: true });
  family('Hz', 1, d(0, 0, -1), 'm k M');

  family('V', 1, d(2, 1, -3, -1), 'm k');
  family('ohm', 1, d(2, 1, -3, -2), 'm k M');
  family('C', 1, d(0, 0, 1, 1), 'm');
  family('H', 1, d(2, 1, -2, -2), 'm u');

  put('%', 0.01, none);
  put('‰', 0.001, none);
  put('ppm', 1e-6, none);
  family('bit', 1, none, 'k M');
  put('1', 1, none);
  return table;
}

/** What to call a quantity of a dimension and how people usually write one; by SI unit. For messages. */
export const quantityNames: readonly { readonly unit: string; readonly name: string; readonly example: string }[] = [
  { unit: '1', name: 'a pure number', example: '0.5 or 50 %' },
  { unit: 'Pa', name: 'a pressure', example: '150 bar(g) or 16 MPa(a)' },
  { unit: 'Pa/s', name: 'a pressure rate', example: '20 bar/s' },
  { unit: 'm3', name: 'a volume', example: '50 L or 110 cm3' },
  { unit: 'm3/s', name: 'a volume flow', example: '200 L/min' },
  { unit: 'kg/s', name: 'a mass flow', example: '0.2 kg/s' },
  { unit: 'm', name: 'a length', example: '350 mm' },
  { unit: 'm2', name: 'an area', example: '30 mm2' },
  { unit: 'kg', name: 'a mass', example: '7.5 t' },
  { unit: 's', name: 'a time', example: '5 ms' },
  { unit: '1/s', name: 'a frequency or rate', example: '20 Hz or 3 1/s' },
  { unit: 'K', name: 'a temperature', example: '20 degC' },
  { unit: 'K/s', name: 'a temperature rate', example: '1 K/s' },
  { unit: 'rad', name: 'an angle', example: '15 deg' },
  { unit: 'rad/s', name: 'an angular speed', example: '1450 rpm' },
  { unit: 'rad/s2', name: 'an angular acceleration', example: '200 rad/s2' },
  { unit: 'm/s', name: 'a speed', example: '60 km/h' },
  { unit: 'm/s2', name: 'an acceleration', example: '1.5 m/s2' },
  { unit: 'N', name: 'a force', example: '12 kN' },
  { unit: 'N m', name: 'a torque or energy', example: '250 N m' },
  { unit: 'N m/rad', name: 'a torsional stiffness', example: '8000 N m/rad' },
  { unit: 'W', name: 'a power', example: '55 kW' },
  { unit: 'W/K', name: 'a heat conductance', example: '15 W/K' },
  { unit: 'J/K', name: 'a heat capacity', example: '20 kJ/K' },
  { unit: 'J/(kg K)', name: 'a specific heat capacity', example: '1900 J/(kg K)' },
  { unit: 'kg m2', name: 'a moment of inertia', example: '0.9 kg m2' },
  { unit: 'kg/m3', name: 'a density', example: '870 kg/m3' },
  { unit: 'Pa s', name: 'a dynamic viscosity', example: '40 cP' },
  { unit: 'm2/s', name: 'a kinematic viscosity', example: '46 mm2/s' },
  { unit: 'V', name: 'a voltage', example: '24 V' },
  { unit: 'A', name: 'a current', example: '700 mA' },
];

/** The unit in which people read a quantity that is kept in this SI unit; absent: the SI unit itself. */
export const tradeUnits: Readonly<Record<string, string>> = {
  Pa: 'bar(a)',
  m3: 'L',
  'm3/s': 'L/min',
  'm3/rad': 'cm3/rev',
  'rad/s': 'rpm',
  K: 'degC',
  'm/s': 'km/h',
  'm2/s': 'mm2/s',
  W: 'kW',
  'Pa/s': 'bar/s',
};
