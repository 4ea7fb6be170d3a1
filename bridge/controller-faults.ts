/** Faults of the controller as a whole, as commands that a scenario sets: `controller.silent` and so on. */
export const controllerFaults = {
  silent: { unit: '1', about: '1: none of its messages comes', rest: 0, least: 0, most: 1 },
  frozen: {
    unit: '1',
    about: '1: its messages come on time with the values that they had when this began',
    rest: 0,
    least: 0,
    most: 1,
  },
  restarting: {
    unit: '1',
    about: '1: it is restarting, and silent as long as this lasts; then it is told that it starts anew',
    rest: 0,
    least: 0,
    most: 1,
  },
} as const;
