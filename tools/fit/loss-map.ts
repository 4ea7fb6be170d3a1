import { Matrix, solve } from 'ml-matrix';

/** One steady point of a test of a pump or motor, as results after ISO 4409 are tabulated. SI. */
export interface LossPoint {
  /** Shaft speed, rad/s, > 0. */
  readonly speed: number;
  /** Pressure difference, Pa, > 0. */
  readonly difference: number;
  /** Displacement as a share of the full one, above 0 as a pump and below 0 as a motor. */
  readonly displacement: number;
  /** Volume flow at the high-pressure side, m3/s, without sign. */
  readonly flow: number;
  /** Shaft torque, N m, without sign. */
  readonly torque: number;
}

export interface FittedMap {
  /** Parameters of the pump-motor, losses: map. */
  readonly parameters: Readonly<Record<string, number>>;
  /** Largest deviation of flow and torque, as a share of the greatest in the table. */
  readonly flowDeviation: number;
  readonly torqueDeviation: number;
  /** Rows whose measured loss is negative, which is no loss: one-based places in the table. */
  readonly gaining: readonly number[];
}

const leakageNames = [
  'mapLeakage',
  'mapLeakageDisplacement',
  'mapLeakagePressure',
  'mapLeakageSpeed',
  'mapLeakageBoth',
] as const;
const torqueNames = [
  'mapTorque',
  'mapTorqueSpeed',
  'mapTorqueSquare',
  'mapTorquePressure',
  'mapTorqueDisplacement',
  'mapTorqueBoth',
] as const;

/**
 * Fits the map of a pump-motor of `fullDisplacement` m3 per turn to measured points by least squares. Points that do not
 * tell the coefficients apart (all at one speed, say) leave those that they cannot tell at a small size: the normal
 * equations carry a thousandth of a millionth on their diagonal.
 */
export function fitLossMap(points: readonly LossPoint[], fullDisplacement: number): FittedMap {
  const radian = fullDisplacement / (2 * Math.PI);
  const ratedDifference = Math.max(...points.map((point) => point.difference));
  const ratedSpeed = Math.max(...points.map((point) => point.speed));
  const losses = points.map((point) => {
    const share = Math.abs(point.displacement);
    const idealFlow = share * radian * point.speed;
    const idealTorque = share * radian * point.difference;
    const pumps = point.displacement >= 0 ? 1 : -1;
    return { leakage: pumps * (idealFlow - point.flow), torque: pumps * (point.torque - idealTorque) };
  });
  const relative = points.map((point) => ({
    s: point.speed / ratedSpeed,
    p: point.difference / ratedDifference,
    x: Math.abs(point.displacement),
  }));
  const leakageRows = relative.map(({ s, p, x }) => [1, x, p, s, s * x].map((term) => term * p));
  const torqueRows = relative.map(({ s, p, x }) => [1, s, s * s, p, p * x, p * s]);
  const leakage = leastSquares(
    leakageRows,
    losses.map((loss) => loss.leakage / (radian * ratedSpeed)),
  );
  const torque = leastSquares(
    torqueRows,
    losses.map((loss) => loss.torque / (radian * ratedDifference)),
  );
  const worst = (
    rows: readonly number[][],
    coefficients: readonly number[],
    unit: number,
    of: (i: number) => number,
    scale: number,
  ) => Math.max(...rows.map((row, i) => Math.abs(Math.max(0, dot(row, coefficients)) * unit - of(i)))) / scale;
  return {
    parameters: {
      ratedDifference,
      ratedSpeed,
      ...Object.fromEntries(leakageNames.map((name, i) => [name, leakage[i]!])),
      ...Object.fromEntries(torqueNames.map((name, i) => [name, torque[i]!])),
    },
    flowDeviation: worst(
      leakageRows,
      leakage,
      radian * ratedSpeed,
      (i) => losses[i]!.leakage,
      Math.max(...points.map((point) => point.flow)),
    ),
    torqueDeviation: worst(
      torqueRows,
      torque,
      radian * ratedDifference,
      (i) => losses[i]!.torque,
      Math.max(...points.map((point) => point.torque)),
    ),
    gaining: losses.flatMap((loss, i) => (loss.leakage < 0 || loss.torque < 0 ? [i + 1] : [])),
  };
}

function leastSquares(rows: number[][], values: readonly number[]): number[] {
  const a = new Matrix(rows);
  const normal = a.transpose().mmul(a);
  for (let i = 0; i < normal.rows; i += 1) normal.set(i, i, normal.get(i, i) + 1e-9 * rows.length);
  return solve(normal, a.transpose().mmul(Matrix.columnVector([...values]))).to1DArray();
}

function dot(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, value, i) => sum + value * b[i]!, 0);
}
