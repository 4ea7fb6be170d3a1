import { useState } from 'preact/hooks';
import type { LiveEvent, WarningStatus } from '../../live/source.js';
import { Scroll } from '../parts/scroll.js';
import { control, eventNames, events, order, status, subject, tick } from '../store/connection.js';
import { who } from '../store/preferences.js';
import { lookOf, midSentence, nameOfPath } from '../store/pressures.js';
import { clock, number, shownAs, withUnit } from '../store/units.js';

export const shapes: Record<string, string> = { note: '○', warning: '▲', alarm: '◆', error: '■' };

/** Warnings that stand: what, where, how much, since when, and what it would mean on a vehicle. */
export function Warnings() {
  const warnings = [...(status.value?.warnings ?? [])].sort(
    (a, b) => Number(b.active) - Number(a.active) || lookOf(b).rank - lookOf(a).rank,
  );
  return (
    <section class="panel" aria-labelledby="warnings-title">
      <header>
        <h2 id="warnings-title">Warnings</h2>
        <span class="quiet">{warnings.length === 0 ? 'none stands' : `${warnings.length} stand`}</span>
      </header>
      {warnings.length === 0 && <p class="quiet">Each warning stays here until it is acknowledged.</p>}
      <ul class="warnings">
        {warnings.map((warning) => (
          <Warning key={warning.identifier} warning={warning} />
        ))}
      </ul>
    </section>
  );
}

function Warning({ warning }: { warning: WarningStatus }) {
  const [answer, setAnswer] = useState('');
  const look = lookOf(warning);
  const shown = shownAs(warning.unit);
  const step = subject.value?.bench.step ?? 0.001;
  const may = control.value === 'granted' && who.value.trim() !== '';
  const acknowledge = () =>
    void order({ kind: 'acknowledge', warning: warning.identifier })
      .then((got) => setAnswer(got.ok ? '' : got.text))
      .catch((error: Error) => setAnswer(error.message));
  return (
    <li class={`warning tone-${warning.active ? look.tone : 'past'}`}>
      <p class="head">
        <span class="shape" aria-hidden="true">
          {look.shape}
        </span>{' '}
        <strong>
          {nameOfPath(warning.path)}: {midSentence(look)}
        </strong>{' '}
        {warning.active ? '' : '(over)'}
      </p>
      <p class="number">
        setting {withUnit(warning.setting, shown)} · peak {withUnit(warning.peak, shown)} · since{' '}
        {clock(warning.sinceTick, step)}
      </p>
      <p>{warning.meaning}</p>
      {warning.acknowledged ? (
        <p class="quiet">✓ acknowledged{warning.active ? ', still active' : ''}</p>
      ) : subject.value?.recording !== undefined ? null : (
        <button
          type="button"
          disabled={!may}
          title={may ? undefined : 'needs control: token and name under Hands'}
          onClick={acknowledge}
        >
          Acknowledge
          <span class="hidden">
            {' '}
            {look.words} of {nameOfPath(warning.path)}
          </span>
        </button>
      )}
      {answer !== '' && <p role="alert">{answer}</p>}
    </li>
  );
}

/** The text of an event with its places filled in; `{a:Pa}` carries the unit. */
export function eventText(event: LiveEvent): string {
  const names = eventNames.value;
  const kind = names.kinds[event.kind];
  if (kind === undefined) return `event ${event.kind}`;
  return kind.text.replace(/\{(subject|a|b|c)(?::([^}]*))?\}/g, (_all, place: string, unit: string | undefined) => {
    if (place === 'subject') return names.subjects[event.subject] ?? `subject ${event.subject}`;
    const value = event[place as 'a' | 'b' | 'c'];
    return unit === undefined ? number(value, Number.isInteger(value) ? 0 : 3) : withUnit(value, shownAs(unit));
  });
}

export function Events({ most = 200 }: { most?: number }) {
  const [least, setLeast] = useState('note');
  const order_ = ['note', 'warning', 'alarm', 'error'];
  const names = eventNames.value;
  const recording = subject.value?.recording !== undefined;
  const step = subject.value?.bench.step ?? 0.001;
  const list = events.value
    .filter(
      (event) =>
        order_.indexOf(names.kinds[event.kind]?.severity ?? 'note') >= order_.indexOf(least) &&
        (!recording || event.tick <= tick.value),
    )
    .slice(-most)
    .reverse();
  return (
    <section class="panel events" aria-labelledby="events-title">
      <header>
        <h2 id="events-title">Events</h2>
        <label>
          From{' '}
          <select value={least} onChange={(change) => setLeast(change.currentTarget.value)}>
            {order_.map((severity) => (
              <option key={severity} value={severity}>
                {shapes[severity]} {severity}
              </option>
            ))}
          </select>
        </label>
      </header>
      <Scroll tall label="List of events, newest first">
        <ol class="log">
          {list.map((event, i) => {
            const severity = names.kinds[event.kind]?.severity ?? 'note';
            return (
              <li key={`${event.tick}.${event.kind}.${event.subject}.${i}`} class={`is-${severity}`}>
                <span class="number">{clock(event.tick, step, 3)}</span>{' '}
                <span aria-hidden="true">{shapes[severity]}</span>
                <span class="hidden">{severity}:</span> {eventText(event)}
              </li>
            );
          })}
        </ol>
        {list.length === 0 && <p class="quiet">Nothing yet.</p>}
      </Scroll>
    </section>
  );
}

/** Requirements with their margin so far: the least is what counts. */
export function Requirements() {
  const facts = subject.value?.bench.requirements ?? [];
  const states = status.value?.requirements ?? [];
  const step = subject.value?.bench.step ?? 0.001;
  return (
    <section class="panel" aria-labelledby="requirements-title">
      <header>
        <h2 id="requirements-title">Requirements</h2>
      </header>
      {facts.length === 0 && <p class="quiet">This scenario judges nothing.</p>}
      <ul class="requirements">
        {facts.map((requirement, i) => {
          const state = states[i];
          if (state === undefined) return null;
          const shown = shownAs(requirement.unit, true);
          const share =
            requirement.comfortable === undefined
              ? 0
              : Math.min(1, Math.abs(state.margin) / requirement.comfortable) || 0;
          const shape = state.verdict === 'violated' ? '✖' : state.verdict === 'holds so far' ? '✓' : '○';
          return (
            <li
              key={requirement.name}
              class={state.verdict === 'violated' ? 'violated' : state.verdict === 'holds so far' ? 'holds' : 'open'}
            >
              <p>
                <strong>{requirement.name}</strong>{' '}
                <span class="verdict">
                  {shape} {state.verdict}
                </span>
              </p>
              <p class="quiet">{requirement.text}</p>
              {Number.isFinite(state.margin) && (
                <>
                  {requirement.comfortable !== undefined && (
                    <div class="balance" aria-hidden="true">
                      <div
                        class={state.margin < 0 ? 'out' : 'in'}
                        style={{ width: `${(share * 50).toFixed(1)}%`, [state.margin < 0 ? 'right' : 'left']: '50%' }}
                      />
                    </div>
                  )}
                  <p class="number">
                    least margin {withUnit(state.margin, shown)} at {clock(state.atTick, step)}
                  </p>
                </>
              )}
            </li>
          );
        })}
      </ul>
    </section>
  );
}
