import type { MessageMap, MessageSpec } from '../../../bridge/message-map.js';
import type { Circuit } from '../../../runtime/circuit/build.js';
import { places } from '../../../runtime/circuit/build.js';

export interface PlantInC {
  readonly step: number;
  readonly substeps: number;
  /** Signals in a row of evidence; slots of the block beside the plant's own. */
  readonly row: number;
  readonly blockMore: number;
}

/**
 * The generated functions of a circuit as C: they are straight lines of `const name = expression;`, calls and stores, so
 * that the text itself says it. With the start values and what a tick does with the messages.
 */
export function plantInC(circuit: Circuit, map: MessageMap, options: PlantInC): string {
  requireSolver(circuit);
  const at = places(circuit);
  const list = (values: readonly number[]) =>
    values.length === 0 ? '0' : values.map((value) => literal(value)).join(', ');
  const latches = circuit.memory.flatMap((slot, i) => (slot.gradual ? [] : [i]));
  const define = (name: string, value: number | string) => `#define ${name} ${value}`;
  return [
    define('STATES', circuit.states.length),
    define('MEMORY', circuit.memory.length),
    define('COMMANDS', circuit.commands.length),
    define('RATES', at.rateCount),
    define('JACOBIAN', circuit.jacobian.rows.length),
    define('ELIMINATION', circuit.elimination.size),
    define('OBSERVED', at.observeCount),
    define('LEDGER_AT', at.supplied),
    define('STEP', literal(options.step)),
    define('SUBSTEPS', options.substeps),
    define('ROW', Math.max(1, options.row)),
    define('BLOCK_MORE', options.blockMore),
    define('LATCHES', latches.length),
    `static const int latches[] = {${latches.join(', ') || '0'}};`,
    `static const double y_start[] = {${list(circuit.states.map((one) => one.initial))}};`,
    `static const double m_start[] = {${list(circuit.memory.map((one) => one.initial))}};`,
    `static const double u_start[] = {${list(circuit.commands.map((one) => one.rest))}};`,
    functionsInC(circuit.code),
    use(circuit, map),
    publish(map),
  ].join('\n');
}

const SCALARS = new Set(['h', 'c']);

/** JavaScript of the generated kind to C. Blocks, constants, stores and calls. Throws on anything else. */
export function functionsInC(code: string): string {
  const lines: string[] = [];
  for (const line of code.split('\n')) {
    const head = /^function (\w+)\(([^)]*)\) \{$/.exec(line);
    if (head) {
      const parameters = head[2]!
        .split(',')
        .map((name) => name.trim())
        .filter((name) => name !== '');
      lines.push(
        `static void ${head[1]}(${parameters.map((name) => (SCALARS.has(name) ? `double ${name}` : `double *restrict ${name}`)).join(', ')}) {`,
      );
      continue;
    }
    const array = /^const (\w+) = new Float64Array\((\d+)\);$/.exec(line);
    if (array) {
      lines.push(`static double ${array[1]}[${array[2]}];`);
      continue;
    }
    if (/\b(let|var|for|while|if|new|return)\b|=>|['"`]/.test(line))
      throw new Error(`generated code of a kind that is not known here: ${line.trim().slice(0, 80)}`);
    lines.push(expression(line.replace(/\bconst (\w+) = /g, 'const double $1 = ')));
  }
  return lines.join('\n');
}

const NAMES: Record<string, string> = { max: 'maximum', min: 'minimum', sign: 'signum', abs: 'fabs' };

function expression(text: string): string {
  return (
    text
      .replace(/Math\.(\w+)/g, (_, name: string) => NAMES[name] ?? name)
      .replace(/\bInfinity\b/g, 'INFINITY')
      .replace(/===/g, '==')
      .replace(/!==/g, '!=')
      // whole numbers are doubles too; indices stay
      .replace(/(?<![\w.[])\d[\d.]*(?:e[+-]?\d+)?/g, (number) => (/[.e]/.test(number) ? number : `${number}.0`))
  );
}

function literal(value: number): string {
  if (!Number.isFinite(value)) return value > 0 ? 'INFINITY' : value < 0 ? '-INFINITY' : 'NAN';
  const text = String(value);
  return /[.e]/.test(text) ? text : `${text}.0`;
}

/** The solver's calls stand in twin.c by hand: they must be there. Throws when the solver has moved on. */
function requireSolver(circuit: Circuit): void {
  for (const name of [
    'update',
    'observe',
    'rates',
    'ratesAndJacobian',
    'factor',
    'stageOne',
    'stageTwo',
    'stageThree',
    'strideError',
  ]) {
    if (!new RegExp(`^function ${name}\\(`, 'm').test(circuit.code))
      throw new Error(`the circuit has no function ${name}: the twin no longer fits the solver`);
  }
}

function use(circuit: Circuit, map: MessageMap): string {
  const command = new Map(circuit.commands.map((one, i) => [one.path, i]));
  const cases = map.messages
    .filter((message) => message.direction === 'received')
    .map((message) => {
      const sets = message.signals.flatMap((signal) => {
        const index = command.get(signal.path);
        return index === undefined
          ? []
          : [
              `      u[${index}] = oilspring_get_${message.name}_${signal.name}(&got) * ${literal(signal.unitScale)} + ${literal(signal.unitOffset)};`,
            ];
      });
      return `    case ${message.identifier}: {\n      struct oilspring_${message.name} got;\n      memcpy(&got, datagram, sizeof got);\n${sets.join('\n')}\n      break;\n    }`;
    });
  return `static void use(unsigned message, const unsigned char *datagram, double *u) {
  switch (message) {
${cases.join('\n')}
    default: break;
  }
}`;
}

function publish(map: MessageMap): string {
  const sends = map.messages.filter((message) => message.direction === 'sent').map(send);
  return `static void publish(long t, const double *observed, uint32_t *sequences, int link, const struct sockaddr_in *peer) {
${sends.join('\n')}
}`;
}

function send(message: MessageSpec): string {
  const sets = message.signals.map(
    (signal, i) => `    oilspring_set_${message.name}_${signal.name}(&said, observed[${i} % OBSERVED]);`,
  );
  return `  if ((t % ${message.every} + ${message.every}) % ${message.every} == ${message.phase}) {
    struct oilspring_${message.name} said;
${sets.join('\n')}
    size_t length = oilspring_finish_${message.name}(&said, sequences[${message.identifier % 256}]++, (uint32_t)t);
    sendto(link, &said, length, 0, (const struct sockaddr *)peer, sizeof *peer);
  }`;
}
