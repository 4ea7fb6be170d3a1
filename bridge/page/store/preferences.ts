import { effect, signal } from '@preact/signals';

export type PressureUnit = 'bar(g)' | 'bar(a)' | 'MPa(g)' | 'MPa(a)' | 'psi(g)' | 'psi(a)';
export const pressureUnits: readonly PressureUnit[] = ['bar(g)', 'bar(a)', 'MPa(g)', 'MPa(a)', 'psi(g)', 'psi(a)'];
export type SpeedUnit = 'km/h' | 'm/s' | 'mph';
export const speedUnits: readonly SpeedUnit[] = ['km/h', 'm/s', 'mph'];
export type FlowUnit = 'L/min' | 'L/s' | 'gal/min';
export const flowUnits: readonly FlowUnit[] = ['L/min', 'L/s', 'gal/min'];
export type Theme = 'system' | 'light' | 'dark';

function kept<T extends string>(key: string, standard: T, allowed: readonly string[]) {
  const stored = read(key);
  const held = signal<T>(stored !== undefined && allowed.includes(stored) ? (stored as T) : standard);
  effect(() => write(key, held.value));
  return held;
}

/** A browser that refuses storage only forgets. */
export function read(key: string): string | undefined {
  try {
    return localStorage.getItem(`oilspring.${key}`) ?? undefined;
  } catch {
    return undefined;
  }
}
export function write(key: string, value: string): void {
  try {
    localStorage.setItem(`oilspring.${key}`, value);
  } catch {
    // see above
  }
}

export const pressureUnit = kept<PressureUnit>('pressure', 'bar(g)', pressureUnits);
export const speedUnit = kept<SpeedUnit>('speed', 'km/h', speedUnits);
export const flowUnit = kept<FlowUnit>('flow', 'L/min', flowUnits);
export const theme = kept<Theme>('theme', 'system', ['system', 'light', 'dark']);
/** What the person at the page calls herself; goes into the record with every hand. */
export const who = signal(read('who') ?? '');
effect(() => write('who', who.value));

const dark = window.matchMedia('(prefers-color-scheme: dark)');
/** Counts changes of what is drawn in which colours: canvases look their colours up again. */
export const coloursChanged = signal(0);
dark.addEventListener('change', () => (coloursChanged.value += 1));
effect(() => {
  document.documentElement.dataset['theme'] = theme.value;
  coloursChanged.value = coloursChanged.peek() + 1;
});
export const calm = window.matchMedia('(prefers-reduced-motion: reduce)');
