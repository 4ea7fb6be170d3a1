import { useRef } from 'preact/hooks';
import { infoOf, subject } from '../store/connection.js';
import { shownAs, withUnit } from '../store/units.js';
import { beat, newest, usePaths } from '../store/values.js';

const headings: Record<string, string> = {
  supply: 'From outside',
  stored: 'Into stores',
  'kept loss': 'Losses that heat the oil',
  'leaving loss': 'Losses that leave',
  residual: 'Does not balance',
};

/** Where the power goes, from the ledger. */
export function Energy() {
  const powers = subject.value?.bench.powers ?? [];
  usePaths(powers.map((power) => power.path));
  beat.value;
  const shown = shownAs('W');
  // the scale only grows, so that a bar that shrinks means less power
  const largest = useRef(1000);
  largest.current = Math.max(largest.current, ...powers.map((power) => Math.abs(newest(power.path)) || 0));
  const most = largest.current;
  // what never carried half a watt is left out
  const seen = useRef(new Set<string>());
  for (const { path } of powers) if (Math.abs(newest(path)) > 0.5) seen.current.add(path);
  if (powers.length === 0) return null;
  const roles = [...new Set(powers.map((power) => power.role))];
  return (
    <section class="panel" aria-labelledby="energy-title">
      <header>
        <h2 id="energy-title">Energy flows</h2>
        <span class="quiet number">full bar {withUnit(most, shown)}</span>
      </header>
      <table class="energy full">
        <caption class="hidden">Powers of the ledger now</caption>
        {roles.map((role) => (
          <tbody key={role}>
            <tr>
              <th colSpan={3} scope="rowgroup" class="role">
                {headings[role]}
              </th>
            </tr>
            {powers
              .filter(
                (power) =>
                  power.role === role &&
                  (seen.current.has(power.path) || role === 'residual' || power.path.startsWith('ledger.')),
              )
              .map((power) => {
                const value = newest(power.path);
                const share = Math.min(1, Math.abs(value) / most) || 0;
                return (
                  <tr key={power.path}>
                    <th scope="row" title={infoOf(power.path)?.about}>
                      {power.name}
                    </th>
                    <td class="balance">
                      <div
                        class={value < 0 ? 'out' : 'in'}
                        style={{ width: `${(share * 50).toFixed(2)}%`, [value < 0 ? 'right' : 'left']: '50%' }}
                      />
                    </td>
                    <td class="number">{withUnit(value, shown)}</td>
                  </tr>
                );
              })}
          </tbody>
        ))}
      </table>
    </section>
  );
}
