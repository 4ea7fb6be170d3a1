import type { ParameterDeclaration, Problem } from '../runtime/contract.js';
import * as oilLaws from './laws/oil.js';

/** What an oil is to element functions: `fluid.referenceDensity` and so on, all SI. */
export interface OilValues {
  /** of oil with its free air at the standard atmosphere and the reference temperature, kg/m3 */
  readonly referenceDensity: number;
  /** share of the volume at the standard atmosphere that is free air */
  readonly freeAir: number;
  /** coefficients of the pressure law, 1/Pa: see laws/oil.ts */
  readonly numerator: number;
  readonly denominator: number;
  /** J/(kg K) */
  readonly heatCapacity: number;
  /** Walther line of the kinematic viscosity */
  readonly viscosityIntercept: number;
  readonly viscositySlope: number;
  /** reference temperature, K */
  readonly temperature: number;
  readonly [name: string]: number;
}

/** A kind of fluid that a bench file can declare: `oil: { is: mineral-oil, grade: VG 46, ... }`. */
export interface FluidKind {
  readonly kind: string;
  readonly about: string;
  readonly source: string;
  readonly parameters: Readonly<Record<string, ParameterDeclaration>>;
  /** From parameters in SI (choices as indices) to what element functions see. */
  readonly values: (parameter: Readonly<Record<string, number>>) => Readonly<Record<string, number>>;
  /** Remarks on parameters that make no sense together. */
  readonly examine: (
    parameter: Readonly<Record<string, number>>,
  ) => readonly Pick<Problem, 'path' | 'what' | 'remedy'>[];
}

/** Kinematic viscosities at 40 degC and 100 degC of the grades, mm2/s: ISO 3448; those at 100 degC are common values. */
const grades = [
  { name: 'VG 32', at40: 32, at100: 5.4 },
  { name: 'VG 46', at40: 46, at100: 6.8 },
  { name: 'VG 68', at40: 68, at100: 8.7 },
] as const;

/** Walther line through two points: [intercept A, slope B] of log10 log10(nu + 0.7) = A - B log10 T, nu in mm2/s. */
export function waltherLine(at40: number, at100: number): readonly [number, number] {
  const twice = (viscosity: number) => Math.log10(Math.log10(viscosity + 0.7));
  const slope = (twice(at40) - twice(at100)) / (Math.log10(373.15) - Math.log10(313.15));
  return [twice(at40) + slope * Math.log10(313.15), slope];
}

function viscosities(parameter: Readonly<Record<string, number>>): readonly [number, number] {
  const grade = grades[parameter.grade!];
  return grade ? [grade.at40, grade.at100] : [parameter.viscosityAt40! * 1e6, parameter.viscosityAt100! * 1e6];
}

export const mineralOil: FluidKind = {
  kind: 'mineral-oil',
  about: 'mineral hydraulic oil with free air; pressure law at one temperature, viscosity at the local one',
  source: 'ISO 3448 (grades), ASTM D341 (viscosity), Gholizadeh, Burton and Schoenau 2011 (free air)',
  parameters: {
    grade: {
      unit: '1',
      about: 'viscosity grade, or own with the two viscosities given',
      default: 1,
      choices: [...grades.map((grade) => grade.name), 'own'],
    },
    viscosityAt40: {
      unit: 'm2/s',
      about: 'kinematic viscosity at 40 degC, for the grade own',
      default: 46e-6,
      least: 2e-6,
      most: 1e-3,
    },
    viscosityAt100: {
      unit: 'm2/s',
      about: 'kinematic viscosity at 100 degC, for the grade own',
      default: 6.8e-6,
      least: 1e-6,
      most: 1e-4,
    },
    density: { unit: 'kg/m3', about: 'density at 15 degC', default: 870, least: 600, most: 1300, usual: [850, 900] },
    thermalExpansion: {
      unit: '1/K',
      about: 'relative fall of density per kelvin',
      default: 7e-4,
      least: 0,
      most: 2e-3,
      usual: [6e-4, 8e-4],
    },
    bulkModulus: {
      unit: 'Pa',
      about: 'tangent bulk modulus of the liquid at atmospheric pressure and reference temperature',
      default: 1.5e9,
      least: 1e8,
      most: 1e13,
      difference: true,
      usual: [1e9, 2.2e9],
    },
    bulkModulusSlope: {
      unit: '1',
      about: 'rise of the bulk modulus per rise of pressure',
      default: 0,
      least: 0,
      most: 12,
    },
    air: {
      unit: '1',
      about: 'free air as a share of the volume at atmospheric pressure',
      default: 0.005,
      least: 1e-4,
      most: 0.2,
      usual: [0.001, 0.03],
    },
    heatCapacity: {
      unit: 'J/(kg K)',
      about: 'specific heat capacity',
      default: 1900,
      least: 500,
      most: 5000,
      usual: [1800, 2100],
    },
    at: {
      unit: 'K',
      about: 'reference temperature of the pressure law, and of oil that is not given another at the start',
      default: 323.15,
      least: 223.15,
      most: 423.15,
      usual: [293.15, 353.15],
    },
  },
  values: (parameter): OilValues => {
    const [intercept, slope] = waltherLine(...viscosities(parameter));
    const liquid = parameter.density! * (1 - parameter.thermalExpansion! * (parameter.at! - 288.15));
    return {
      referenceDensity: liquid * (1 - parameter.air!),
      freeAir: parameter.air!,
      numerator: oilLaws.liquidNumerator(parameter.bulkModulus!, parameter.bulkModulusSlope!),
      denominator: oilLaws.liquidDenominator(parameter.bulkModulus!, parameter.bulkModulusSlope!),
      heatCapacity: parameter.heatCapacity!,
      viscosityIntercept: intercept,
      viscositySlope: slope,
      temperature: parameter.at!,
    };
  },
  examine: (parameter) => {
    const [at40, at100] = viscosities(parameter);
    return at40 > at100
      ? []
      : [
          {
            path: 'viscosityAt100',
            what: 'the oil is not thinner at 100 degC than at 40 degC',
            remedy: 'exchange the two viscosities, or look at the data sheet',
          },
        ];
  },
};

/** All kinds of fluid by name. */
export const fluidKinds: Readonly<Record<string, FluidKind>> = { [mineralOil.kind]: mineralOil };

/** Relaxed mass of oil, kg, that fills `volume` m3 at `pressure` Pa: for start values. */
export function oilMass(volume: number, pressure: number, fluid: Readonly<Record<string, number>>): number {
  const ratio = oilLaws.oilVolumeRatio(pressure, fluid.freeAir!, fluid.numerator!, fluid.denominator!);
  return (volume * fluid.referenceDensity!) / ratio;
}

/** Error weight, 1/kg, of the oil mass in `volume`: one is the error that moves the pressure by 0.5 bar. */
export function massWeight(volume: number, fluid: Readonly<Record<string, number>>): number {
  return 1 / ((fluid.denominator! - fluid.numerator!) * fluid.referenceDensity! * volume * 0.5e5);
}
