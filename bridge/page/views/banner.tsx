import { clients, stale, status, subject, thinned, tick, wallClock } from '../store/connection.js';
import {
  type FlowUnit,
  flowUnit,
  flowUnits,
  type PressureUnit,
  pressureUnit,
  pressureUnits,
  type SpeedUnit,
  speedUnit,
  speedUnits,
  type Theme,
  theme,
} from '../store/preferences.js';
import { banner, lookOf, midSentence, nameOfPath } from '../store/pressures.js';
import { clock, format, number, shownAs, withUnit } from '../store/units.js';
import { beat, newest, usePaths } from '../store/values.js';

/** Run, time, and what a person sets for herself. Stays on top, with the state of the pressures in short. */
export function TopBar() {
  beat.value;
  const bench = subject.value?.bench;
  const run = status.value?.run;
  const { look } = banner.value;
  const step = bench?.step ?? 0.001;
  return (
    <header class="topbar">
      <h1>
        <span class="brand">oilspring</span> {bench?.name}
      </h1>
      <p class={`chip tone-${look.tone}`}>
        <span class="shape" aria-hidden="true">
          {look.shape}
        </span>{' '}
        {look.words}
      </p>
      <p class="run">
        <strong>{run?.phase ?? '–'}</strong> <span class="quiet">{run?.pace}</span>{' '}
        <span class="number time">{clock(tick.value, step)}</span>
      </p>
      {run !== undefined && run.notValid.length > 0 && <p class="invalid">✖ not valid: {run.notValid.join('; ')}</p>}
      {run !== undefined && run.hands > 0 && <p class="quiet">by hand: {run.hands}</p>}
      {thinned.value && <p class="quiet">picture thinned: this page reads slowly</p>}
      <Settings />
    </header>
  );
}

function Settings() {
  return (
    <details class="settings">
      <summary>Units and colours</summary>
      <div class="sheet">
        <Choice<PressureUnit> name="Pressure" held={pressureUnit} choices={pressureUnits} />
        <Choice<SpeedUnit> name="Speed" held={speedUnit} choices={speedUnits} />
        <Choice<FlowUnit> name="Flow" held={flowUnit} choices={flowUnits} />
        <Choice<Theme> name="Colours" held={theme} choices={['system', 'light', 'dark']} />
        <p class="quiet">
          {clients.value > 1 ? `${clients.value} pages look at this bench.` : 'Only this page looks at this bench.'}
        </p>
      </div>
    </details>
  );
}

function Choice<T extends string>({
  name,
  held,
  choices,
}: {
  name: string;
  held: { value: T };
  choices: readonly T[];
}) {
  return (
    <label>
      {name}
      <select value={held.value} onChange={(event) => (held.value = event.currentTarget.value as T)}>
        {choices.map((choice) => (
          <option key={choice} value={choice}>
            {choice}
          </option>
        ))}
      </select>
    </label>
  );
}

/** Since when the picture is not that of the bench. */
export function Stale() {
  const state = stale.value;
  return (
    <div class="stale-place" role="alert">
      {state !== undefined && (
        <p class="stale-bar">
          <strong>✖ Picture unchanged since {new Date(state.since).toLocaleTimeString([], { hour12: false })}</strong>{' '}
          <span class="number">({number(Math.max(0, wallClock.value - state.since) / 1000, 0)} s)</span>: {state.why}.
        </p>
      )}
    </div>
  );
}

/** For reading from across the room: the state of the pressures, and the step of the scenario. */
export function Banner() {
  const { look, warning, past } = banner.value;
  const path = warning?.path;
  usePaths([path]);
  beat.value;
  const shown = shownAs('Pa');
  const step = subject.value?.bench.step ?? 0.001;
  const others = (status.value?.warnings ?? []).filter((other) => other.active && other !== warning).length;
  return (
    <section
      class={`banner tone-${look.tone} ${past && warning !== undefined ? `past hem-${lookOf(warning).tone}` : ''}`}
      aria-label="State of the pressures and of the scenario"
    >
      <div class="state">
        <p class="words" aria-live="assertive">
          <span class="shape" aria-hidden="true">
            {look.shape}
          </span>{' '}
          {look.words}
        </p>
        <p class="detail">
          {warning === undefined ? (
            look.tone === 'unknown' ? (
              'The values below are old.'
            ) : (
              'Every watched pressure is within its settings.'
            )
          ) : past ? (
            <>
              Was {midSentence(lookOf(warning))}: {nameOfPath(warning.path)}, peak {withUnit(warning.peak, shown)}, from{' '}
              {clock(warning.sinceTick, step)}; not acknowledged
            </>
          ) : (
            <>
              {nameOfPath(warning.path)} <strong class="number">{withUnit(newest(path), shown)}</strong>, setting{' '}
              {format(warning.setting, shown)}, peak {format(warning.peak, shown)}, since{' '}
              {clock(warning.sinceTick, step)}
            </>
          )}
          {others > 0 && look.tone !== 'unknown' && ` · ${others} more`}
        </p>
      </div>
      <ScenarioStep />
    </section>
  );
}

function ScenarioStep() {
  const facts = subject.value?.bench.scenario;
  const scenario = status.value?.scenario;
  if (facts === undefined || scenario === undefined) return null;
  const step = subject.value?.bench.step ?? 0.001;
  const now = facts.steps[scenario.step];
  const next = facts.steps[scenario.step + 1];
  return (
    <div class="step">
      <p class="quiet">
        {facts.name} · {scenario.state}
        {now === undefined ? '' : ` · step ${scenario.step + 1} of ${facts.steps.length}`}
      </p>
      <p class="now">
        {now?.name ?? (scenario.state === 'ended' ? 'ended' : 'not started')}{' '}
        {now !== undefined && (
          <span class="number quiet">{clock(Math.max(0, tick.value - scenario.sinceTick), step, 0)}</span>
        )}
      </p>
      <p class="next">
        {next === undefined
          ? now === undefined
            ? facts.steps[0] === undefined
              ? ''
              : `first: ${facts.steps[0].name}`
            : 'last step'
          : `next: ${next.name}`}
      </p>
    </div>
  );
}

export function Caution() {
  const bench = subject.value?.bench;
  return (
    <footer class="caution-foot">
      <p>
        <strong>⚠ oilspring is not a safety device.</strong> These pressures are computed, not measured. A real bench
        has its own relief valves, interlocks and emergency stop; its hydraulic work follows local codes and is done by
        licensed people. Shut off and discharge accumulators before anybody works on a circuit.
        {bench?.invented ? ' The data behind this bench are invented.' : ''}
      </p>
    </footer>
  );
}
