import type { InstrumentKind, InstrumentUpdate } from '../../runtime/instrument.js';

/** One instrument on arrays of its own. Parameters not given take their defaults; optional inputs only when given. */
export class InstrumentBench {
  readonly block: Float64Array;
  readonly signals: Float64Array;
  private readonly update: InstrumentUpdate;
  private readonly input: Record<string, number> = {};
  private readonly output: Record<string, number> = {};
  private readonly command: Record<string, number> = {};
  tick = 0;

  constructor(
    kind: InstrumentKind,
    parameters: Readonly<Record<string, number>>,
    settings: { inputs?: readonly string[]; seed?: number; identity?: number; step?: number } = {},
  ) {
    const step = settings.step ?? 1e-3;
    const parameter = Object.fromEntries(
      Object.entries(kind.parameters).map(([name, declaration]) => {
        const value = parameters[name] ?? declaration.default;
        if (value === undefined) throw new Error(`${kind.kind}: ${name} is required`);
        return [name, value];
      }),
    );
    for (const name of Object.keys(parameters))
      if (!(name in kind.parameters)) throw new Error(`${kind.kind}: no parameter ${name}`);
    let signal = 0;
    for (const [name, { optional }] of Object.entries(kind.inputs)) {
      this.input[name] = optional && !settings.inputs?.includes(name) ? -1 : signal++;
    }
    for (const name of Object.keys(kind.outputs)) this.output[name] = signal++;
    let slot = 0;
    const memory: Record<string, number> = {};
    for (const name of Object.keys(kind.memory)) memory[name] = slot++;
    for (const name of Object.keys(kind.commands ?? {})) this.command[name] = slot++;
    const extra = slot;
    slot += kind.extraMemory?.(parameter, step) ?? 0;
    this.block = new Float64Array(slot);
    this.signals = new Float64Array(signal);
    for (const [name, { initial }] of Object.entries(kind.memory)) this.block[memory[name]!] = initial ?? 0;
    for (const [name, { rest }] of Object.entries(kind.commands ?? {})) this.block[this.command[name]!] = rest;
    const { input, output, command } = this;
    this.update = kind.build({
      name: 'test',
      parameter,
      input,
      output,
      memory,
      extra,
      command,
      seed: settings.seed ?? 1,
      identity: settings.identity ?? 0,
      step,
    });
  }

  set(command: string, value: number): void {
    if (!(command in this.command)) throw new Error(`no command ${command}`);
    this.block[this.command[command]!] = value;
  }

  get(output: string): number {
    if (!(output in this.output)) throw new Error(`no output ${output}`);
    return this.signals[this.output[output]!]!;
  }

  /** One tick with the given inputs; the first output. */
  run(inputs: Readonly<Record<string, number>>): number {
    for (const [name, value] of Object.entries(inputs)) {
      if (!(this.input[name]! >= 0)) throw new Error(`no input ${name}`);
      this.signals[this.input[name]!] = value;
    }
    this.update(this.block, this.signals, this.tick);
    this.tick += 1;
    return this.get(Object.keys(this.output)[0]!);
  }
}
