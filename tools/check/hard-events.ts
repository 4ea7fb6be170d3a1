import { poppetWidth } from '../../plants/gas-accumulator-start.js';
import { accumulatorGasVolume } from '../../plants/laws/gas.js';
import type { Circuit } from '../../runtime/circuit/build.js';
import type { Plant } from '../../runtime/plant.js';

/** A short hard drive that starts from an instant of the duty, with the commands of that instant held but for `change`. */
export interface HardEvent {
  readonly name: string;
  readonly ticks: number;
  readonly state: Float64Array;
  readonly memory: Float64Array;
  readonly commands: Float64Array;
  /** Changes the commands of its k-th tick. */
  readonly change: (u: Float64Array, k: number) => void;
}

/** The instant of the duty at which something was largest. */
interface Instant {
  size: number;
  state: Float64Array | undefined;
  memory: Float64Array | undefined;
  commands: Float64Array | undefined;
}

const nothing = (): Instant => ({ size: 0, state: undefined, memory: undefined, commands: undefined });

/**
 * The hard events that a circuit can have, each from the worst instant of its duty: every isolation valve slammed shut at
 * its largest flow and opened again; every accumulator run empty and run full at its largest flow, its gas charge changed
 * so that this comes a tenth of a second later at the pressure of that instant; all wheels braked fully on a slippery
 * road at the highest speed, until they lock.
 */
export class HardEvents {
  private readonly instants: {
    readonly instant: Instant;
    /** How large it is now, given what is observed and commanded; below the threshold it does not count. */
    readonly size: (observed: Float64Array, u: Float64Array) => number;
    readonly threshold: number;
    readonly event: (instant: Instant) => HardEvent | undefined;
  }[] = [];

  constructor(private readonly circuit: Circuit) {
    for (const element of circuit.spec.elements) {
      if (element.kind.kind === 'isolation-valve') this.slam(element.name);
      if (element.kind.kind === 'gas-accumulator') {
        this.charge(element.name, 'runs empty', -1);
        this.charge(element.name, 'runs full', 1);
      }
      if (element.kind.kind === 'vehicle') this.lock(element.name);
    }
  }

  /** Looks at one tick of the duty: what was observed and commanded, and the state to start from. */
  look(observed: Float64Array, u: Float64Array, from: Plant): void {
    for (const one of this.instants) {
      const size = one.size(observed, u);
      if (size <= one.instant.size || size < one.threshold) continue;
      one.instant.size = size;
      one.instant.state = from.y.slice();
      one.instant.memory = from.m.slice();
      one.instant.commands = u.slice();
    }
  }

  found(): HardEvent[] {
    return this.instants.flatMap(({ instant, event }) => (instant.state ? (event(instant) ?? []) : []));
  }

  private reading(path: string): number {
    return this.circuit.readings.findIndex((slot) => slot.path === path);
  }

  private slam(name: string): void {
    const flow = this.reading(`${name}.massFlow`);
    const command = this.circuit.commands.findIndex((slot) => slot.element === name && !slot.fault);
    if (flow < 0 || command < 0) return;
    this.instants.push({
      instant: nothing(),
      threshold: 1e-6,
      size: (observed, u) => (u[command]! > 0.5 ? Math.abs(observed[flow]!) : 0),
      event: (instant) => ({
        ...held(instant),
        name: `${name} slammed at ${instant.size.toPrecision(3)} kg/s`,
        ticks: 600,
        change: (u, k) => {
          u[command] = k < 300 ? 0 : 1;
        },
      }),
    });
  }

  private charge(name: string, words: string, sign: number): void {
    const { circuit } = this;
    const inflow = this.reading(`${name}.inflow`);
    const volumeAt = this.reading(`${name}.oilVolume`);
    const state = (slot: string) => circuit.states.findIndex((one) => one.path === `${name}.${slot}`);
    const [mass, heat, gasMass] = [state('mass'), state('heat'), state('gasMass')] as const;
    const { parameters: parameter, fluid } = circuit.spec.elements.find((one) => one.name === name)!;
    const volume = parameter.volume!;
    const closing = poppetWidth(parameter);
    const end = (1 - parameter.leastGasShare!) * volume;
    const metal = parameter.metalShare! * fluid!.referenceDensity! * volume;
    let before = 0;
    const instant = nothing();
    this.instants.push({
      instant,
      threshold: 2e-5,
      size: (observed) => {
        const size = sign * observed[inflow]!;
        if (size > instant.size) before = observed[volumeAt]!;
        return size;
      },
      event: () => {
        const after = sign < 0 ? closing + 0.1 * instant.size : end - 0.1 * instant.size;
        if (!(after > 0.5 * closing && after < end && before > closing)) return undefined;
        const y = instant.state!.slice();
        const gasVolume = (oil: number) => accumulatorGasVolume(oil, volume, closing);
        y[gasMass] = (y[gasMass]! * gasVolume(after)) / gasVolume(before);
        const fuller = (y[mass]! * after) / before;
        y[heat] = (y[heat]! * (fuller + metal)) / (y[mass]! + metal);
        y[mass] = fuller;
        return {
          ...held(instant),
          state: y,
          name: `${name} ${words} at ${(instant.size * 60_000).toPrecision(3)} L/min`,
          ticks: 400,
          change: () => undefined,
        };
      },
    });
  }

  private lock(name: string): void {
    const { circuit } = this;
    const speed = this.reading(`${name}.speedMagnitude`);
    const commands = (kind: string, slot: string) =>
      circuit.commands.flatMap((command, i) =>
        command.name === slot && circuit.spec.elements.find((one) => one.name === command.element)!.kind.kind === kind
          ? [i]
          : [],
      );
    const brakes = commands('service-brake', 'demand');
    const surfaces = commands('tyre', 'surfaceFriction');
    if (brakes.length === 0 || surfaces.length === 0) return;
    this.instants.push({
      instant: nothing(),
      threshold: 2,
      size: (observed) => observed[speed]!,
      event: (instant) => ({
        ...held(instant),
        name: `wheels of ${name} locked on ice at ${(3.6 * instant.size).toFixed(0)} km/h`,
        ticks: 600,
        change: (u) => {
          for (const i of brakes) u[i] = 1;
          for (const i of surfaces) u[i] = 0.25;
        },
      }),
    });
  }
}

function held(instant: Instant): Pick<HardEvent, 'state' | 'memory' | 'commands'> {
  return { state: instant.state!, memory: instant.memory!, commands: instant.commands! };
}
