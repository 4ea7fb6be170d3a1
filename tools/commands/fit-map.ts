import { readFileSync } from 'node:fs';
import { Command } from 'commander';
import { fitLossMap, type LossPoint } from '../fit/loss-map.js';
import { CommandError } from './failure.js';

/** Columns of the table, in this order, and what they are in SI. */
const columns = [
  ['speed', 'rpm', (2 * Math.PI) / 60],
  ['difference', 'bar', 1e5],
  ['displacement', 'share of the full one, negative as a motor', 1],
  ['flow', 'L/min', 1e-3 / 60],
  ['torque', 'N m', 1],
] as const;

export function fitMapCommand(): Command {
  return new Command('fit-map')
    .description('fits the losses of a pump-motor to measured points and writes its parameters for a bench file')
    .argument(
      'TABLE',
      `comma-separated, a row a point: ${columns.map(([name, unit]) => `${name} (${unit})`).join(', ')}`,
    )
    .requiredOption('--displacement <CM3>', 'full displacement per turn, cm3', Number)
    .addHelpText('after', '\nExample:\n  oilspring fit-map unit.csv --displacement 110')
    .action((file: string, options: { displacement: number }) => {
      if (!(options.displacement > 0))
        throw new CommandError(`--displacement ${options.displacement}: cm3 per turn, such as 110`);
      const points = read(file);
      const fitted = fitLossMap(points, options.displacement * 1e-6);
      const share = (value: number) => `${(100 * value).toPrecision(2)} %`;
      process.stdout.write(
        `# ${file}, ${points.length} points; off by ${share(fitted.flowDeviation)} of the largest flow and ` +
          `${share(fitted.torqueDeviation)} of the largest torque at most\nlosses: map\ncaseHeatShare: 0\n` +
          Object.entries(fitted.parameters)
            .map(([name, value]) => {
              const unit = name === 'ratedDifference' ? ' Pa' : name === 'ratedSpeed' ? ' rad/s' : '';
              return `${name}: ${Number(value.toPrecision(8))}${unit}\n`;
            })
            .join(''),
      );
      if (fitted.gaining.length > 0)
        process.stderr.write(
          `${file}: point ${fitted.gaining.join(', ')} gives more than the ideal unit: look at the displacement and at the signs\n`,
        );
    });
}

function read(file: string): LossPoint[] {
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (error) {
    throw new CommandError(`${file} cannot be read: ${(error as Error).message}`);
  }
  const points: LossPoint[] = [];
  text.split(/\r?\n/).forEach((line, i) => {
    if (line.trim() === '' || line.trim().startsWith('#')) return;
    const fields = line.split(',').map((field) => field.trim());
    const values = fields.map(Number);
    if (fields.length >= columns.length && i === 0 && values.some(Number.isNaN)) return;
    columns.forEach(([name, unit], k) => {
      if (!Number.isFinite(values[k]) || fields[k] === '')
        throw new CommandError(
          `${file}:${i + 1}:1 ${name}: ${fields[k] === undefined ? 'missing' : `\`${fields[k]}\` is no number`}, a row has ${columns.length} numbers; this one in ${unit}`,
        );
      if (name !== 'displacement' && !(values[k]! > 0))
        throw new CommandError(`${file}:${i + 1}:1 ${name}: ${fields[k]} ${unit}, must be above 0`);
    });
    const [speed, difference, displacement, flow, torque] = columns.map(([, , si], k) => values[k]! * si);
    points.push({
      speed: speed!,
      difference: difference!,
      displacement: displacement!,
      flow: flow!,
      torque: torque!,
    });
  });
  if (points.length < 8) throw new CommandError(`${file}: ${points.length} points, at least 8 are needed`);
  return points;
}
