import type { SignalGroup } from './contract.js';

/**
 * The signals that the runtime itself tells of a run, declared once: the readers of bench and scenario files look paths up here, and
 * whatever writes them takes unit and text from here.
 */
export interface OwnSignal {
  readonly path: string;
  readonly unit: string;
  readonly about: string;
  readonly group: SignalGroup;
  readonly least?: number;
  readonly most?: number;
  readonly difference?: boolean;
}

/** 0 or 1, and set by scripts, hands and the reset procedure. */
export const lifeSwitches = {
  supply: switched('life.supply', '1 while the controller has its supply'),
  key: switched('life.key', '1 while the key is on'),
  wakeUp: switched('life.wakeUp', '1 while the wake-up line is on'),
  /** The controller's to drive, where a message does. */
  relay: { ...switched('life.relay', '1 while the controller holds its main relay'), group: 'command' },
  clear: switched(
    'life.clear',
    '1 while the bench asks the controller to clear what it has learnt and the codes that it has stored',
  ),
} as const;

export const lifeSignals = {
  ...lifeSwitches,
  phase: { ...told('life.phase', '1', '0 pre-roll, 1 running, 2 after-run'), least: 0, most: 2 },
} as const;

export const scenarioSignals = {
  time: told('scenario.time', 's', 'time of the timeline: since tick 0, less what it was held'),
  step: told('scenario.step', '1', 'steps of the timeline done'),
  targetSpeed: told('scenario.targetSpeed', 'm/s', 'speed that the driver is to follow'),
  targetSpeedAhead: told('scenario.targetSpeedAhead', 'm/s', 'the same, a preview time ahead'),
  timeOuts: told(
    'scenario.timeOuts',
    '1',
    'steps of the timeline that were left out because what they wait for did not come',
  ),
  remaining: told('scenario.remaining', 's', 'time to the end of the scenario'),
} as const;

export const ledgerSignals = {
  supply: told('ledger.supply', 'W', 'power that comes in from outside', 'ledger'),
  leaving: told('ledger.leaving', 'W', 'dissipated power that leaves the circuit', 'ledger'),
  stored: told('ledger.stored', 'J', 'energy stored in all elements', 'ledger'),
  residual: told(
    'ledger.residual',
    'J',
    'stored now less at the start, less what came in, plus what left: zero when the physics closes',
    'ledger',
  ),
  turnover: told('ledger.turnover', 'J', 'largest energy that passed through any one branch', 'ledger'),
} as const;

/** Of a kind of stuff that is conserved, such as oil. */
export function stuffSignals(stuff: string) {
  return {
    bringing: told(`ledger.${stuff}Bringing`, 'kg/s', `${stuff} that comes in from outside`, 'ledger'),
    held: told(`ledger.${stuff}Held`, 'kg', `${stuff} held by all elements`, 'ledger'),
    residual: told(`ledger.${stuff}Residual`, 'kg', `${stuff} held now less at the start, less what came in`, 'ledger'),
  } as const;
}

/** Energy that a machine took up while braking and gave back. */
export function meterSignals(machine: string) {
  return {
    recovered: told(
      `ledger.${machine}.recovered`,
      'J',
      `energy of ${machine} taken from its shaft while pumping`,
      'ledger',
    ),
    returned: told(
      `ledger.${machine}.returned`,
      'J',
      `energy of ${machine} given to its shaft while motoring`,
      'ledger',
    ),
  } as const;
}

/** Of a live run; not part of the block, zero at fast pace. */
export const timingSignals = {
  lateness: told('timing.lateness', 's', 'start of this tick after its deadline (live)', 'timing'),
  step: told('timing.step', 's', 'length of the tick before (live)', 'timing'),
} as const;

export const watchSignals = {
  worst: told('watch.worst', '1', 'number of the most urgent level that is present; 0: nothing to say'),
  count: told('watch.count', '1', 'warnings that are present or not acknowledged'),
  unacknowledged: told('watch.unacknowledged', '1', 'warnings that are not acknowledged'),
} as const;

/** Of a watched signal; `far`: whether its largest or its least value is its peak. */
export function watchSignalsOf(path: string, unit: string, far: 'largest' | 'least') {
  return {
    level: told(`watch.${path}.level`, '1', `number of the level of ${path}; 0: nothing to say`),
    peak: told(`watch.${path}.peak`, unit, `${far} value of ${path} so far`),
    timeToRelief: told(
      `watch.${path}.timeToRelief`,
      's',
      `time to the relief setting of ${path} at the present rate; 1e6: none`,
    ),
  } as const;
}

function told(path: string, unit: string, about: string, group: SignalGroup = 'run'): OwnSignal {
  return { path, unit, about, group };
}

function switched(path: string, about: string): OwnSignal {
  return { path, unit: '1', about, group: 'run', least: 0, most: 1 };
}
