import { signal } from '@preact/signals';
import { useEffect, useRef, useState } from 'preact/hooks';
import type { HandCommand, HandFacts } from '../../live/source.js';
import { control, giveToken, infoOf, order, status, subject } from '../store/connection.js';
import { who } from '../store/preferences.js';
import { number, shownOf, withUnit } from '../store/units.js';
import { beat, newest, usePaths } from '../store/values.js';

/** The answer to the newest hand, in words. */
const answer = signal<{ ok: boolean; text: string } | undefined>(undefined);

async function act(command: HandCommand, what: string): Promise<boolean> {
  try {
    const got = await order(command);
    answer.value = {
      ok: got.ok,
      text: got.ok ? `${what}: in the record at tick ${got.tick}` : `${what}: refused, ${got.text}`,
    };
    return got.ok;
  } catch (error) {
    answer.value = { ok: false, text: `${what}: ${(error as Error).message}` };
    return false;
  }
}

/** Driving the bench by hand. Shown always, so that it is clear why it is not allowed where it is not. */
export function Hands() {
  const facts = subject.value?.bench.hands ?? [];
  usePaths(facts.map((hand) => hand.path));
  const allowed = control.value === 'granted' && who.value.trim() !== '' && subject.value?.recording === undefined;
  const group = (kinds: readonly HandFacts['kind'][]) => facts.filter((hand) => kinds.includes(hand.kind));
  return (
    <section class="panel hands" aria-labelledby="hands-title">
      <header>
        <h2 id="hands-title">Hands</h2>
      </header>
      <p class="caution">
        <strong>⚠ Whatever you set here reaches the control unit.</strong> If it drives real hardware, keep the rig's
        own relief valves, interlocks and emergency stop in force; this page is none of them.
      </p>
      <Permission />
      <p role="status" class={answer.value?.ok === false ? 'refused' : 'quiet'}>
        {answer.value?.text ??
          'Every hand goes into the record with its tick and name; the verdict says that hands were used.'}
      </p>
      <fieldset disabled={!allowed}>
        <legend class="hidden">Everything that a hand may touch</legend>
        <div class="hand-groups">
          <ScenarioHands />
          <Group name="Pedals and selector" hands={group(['pedal', 'gear'])} />
          <Group name="Valves and displacements" hands={group(['valve', 'displacement'])} />
          <Group name="Key and supply" hands={group(['key', 'supply'])} />
          <Group name="Faults" hands={group(['fault'])} />
          <Note />
        </div>
      </fieldset>
    </section>
  );
}

function Permission() {
  const [problem, setProblem] = useState('');
  if (subject.value?.recording !== undefined) return <p>A recording cannot be steered.</p>;
  if (control.value === 'none')
    return (
      <p>
        This bench was started without control: the page only looks. Start it with <code>--control</code> to drive it by
        hand.
      </p>
    );
  return (
    <div class="permission">
      <label>
        Your name or initials, for the record
        <input
          value={who.value}
          maxLength={80}
          autocomplete="off"
          onInput={(event) => (who.value = event.currentTarget.value)}
        />
      </label>
      {control.value === 'granted' ? (
        <p>✓ Control granted to this page{who.value.trim() === '' ? ': say who you are to use it' : ''}.</p>
      ) : (
        <form
          onSubmit={(event) => {
            event.preventDefault();
            const input = event.currentTarget.elements.namedItem('token') as HTMLInputElement;
            giveToken(input.value)
              .then((got) => setProblem(got.ok ? '' : got.text))
              .catch((error: Error) => setProblem(error.message));
          }}
        >
          <label>
            Token, printed where the bench was started
            <input name="token" type="password" autocomplete="off" maxLength={256} required />
          </label>
          <button type="submit" class="primary">
            Take control
          </button>
          {problem !== '' && <p role="alert">{problem}</p>}
        </form>
      )}
    </div>
  );
}

function ScenarioHands() {
  const state = status.value?.scenario.state ?? 'not started';
  const button = (action: 'start' | 'hold' | 'continue' | 'end', text: string, possible: boolean) => (
    <button
      type="button"
      disabled={!possible}
      onClick={() => void act({ kind: 'scenario', action }, `Scenario ${action}`)}
    >
      {text}
    </button>
  );
  return (
    <section class="group">
      <h3>Scenario</h3>
      <p class="quiet">{state}</p>
      <div class="row">
        {button('start', '▶ Start', state === 'not started')}
        {state === 'held' ? button('continue', '▶ Go on', true) : button('hold', '❚❚ Hold', state === 'running')}
        {button('end', '■ End', state === 'running' || state === 'held')}
      </div>
    </section>
  );
}

function Group({ name, hands }: { name: string; hands: readonly HandFacts[] }) {
  if (hands.length === 0) return null;
  return (
    <section class="group">
      <h3>{name}</h3>
      {hands.map((hand) =>
        hand.choices !== undefined ||
        hand.kind === 'key' ||
        hand.kind === 'supply' ||
        (hand.kind === 'fault' && hand.increment === undefined) ? (
          <Choice key={hand.path} hand={hand} />
        ) : (
          <Slider key={hand.path} hand={hand} />
        ),
      )}
    </section>
  );
}

function present(hand: HandFacts): string {
  const info = infoOf(hand.path);
  return info === undefined ? '–' : withUnit(newest(hand.path), shownOf(info));
}

function Choice({ hand }: { hand: HandFacts }) {
  beat.value;
  const choices = hand.choices ?? [
    { name: 'off', value: hand.kind === 'fault' ? hand.rest : hand.least },
    { name: 'on', value: hand.most },
  ];
  const value = newest(hand.path);
  return (
    <fieldset class="hand" aria-label={hand.name}>
      <span class="hand-name">{hand.name}</span>
      <div class="row">
        {choices.map((choice) => (
          <button
            type="button"
            key={choice.name}
            aria-pressed={Math.abs(value - choice.value) < 1e-6}
            onClick={() =>
              void act({ kind: 'set', path: hand.path, value: choice.value }, `${hand.name} ${choice.name}`)
            }
          >
            {choice.name}
          </button>
        ))}
      </div>
    </fieldset>
  );
}

/**
 * A value that counts only while it is held where there is a dead man: by the pointer on the slider, or by the space
 * bar on the button. It is renewed three times within the time-out; the host lets go when that stops.
 */
function Slider({ hand }: { hand: HandFacts }) {
  beat.value;
  const [value, setValue] = useState(hand.rest);
  const [held, setHeld] = useState(false);
  const wanted = useRef(value);
  wanted.current = value;
  const renew = useRef<ReturnType<typeof setInterval> | undefined>(undefined);
  const sendIt = () => act({ kind: 'set', path: hand.path, value: wanted.current }, hand.name);
  const take = () => {
    if (hand.deadMan === undefined || renew.current !== undefined) return;
    setHeld(true);
    void sendIt();
    renew.current = setInterval(
      () => {
        void sendIt().then((ok) => {
          if (!ok) drop();
        });
      },
      (hand.deadMan * 1000) / 3,
    );
  };
  const stop = () => {
    clearInterval(renew.current);
    renew.current = undefined;
    setHeld(false);
  };
  const drop = () => stop();
  const release = () => {
    if (renew.current === undefined) return;
    stop();
    void act({ kind: 'release', path: hand.path, reason: 'let go' }, `${hand.name} let go`);
  };
  // the functions read only references
  useEffect(() => {
    const hidden = () => document.visibilityState === 'hidden' && release();
    window.addEventListener('blur', release);
    document.addEventListener('visibilitychange', hidden);
    return () => {
      window.removeEventListener('blur', release);
      document.removeEventListener('visibilitychange', hidden);
      release();
    };
  }, []);
  const holds = (event: KeyboardEvent) => event.key === ' ' || event.key === 'Enter';
  return (
    <fieldset class="hand" aria-label={hand.name}>
      <span class="hand-name">
        {hand.name} <span class="quiet number">now {present(hand)}</span>
      </span>
      <div class="row">
        <input
          type="range"
          aria-label={`${hand.name}, value to set`}
          min={hand.least}
          max={hand.most}
          step={hand.increment ?? (hand.most - hand.least) / 100}
          value={value}
          onInput={(event) => {
            setValue(event.currentTarget.valueAsNumber);
            wanted.current = event.currentTarget.valueAsNumber;
            if (renew.current !== undefined) void sendIt();
          }}
          onPointerDown={take}
          onPointerUp={release}
          onPointerCancel={release}
        />
        <output class="number">{number(value, 2)}</output>
        {hand.deadMan === undefined ? (
          <button type="button" onClick={() => void sendIt()}>
            Set
          </button>
        ) : (
          <button
            type="button"
            class={held ? 'held' : ''}
            aria-pressed={held}
            title={`Counts while it is pressed; lets go ${hand.deadMan} s after the last sign of this page`}
            onPointerDown={take}
            onPointerUp={release}
            onPointerLeave={release}
            onKeyDown={(event) => {
              if (!holds(event)) return;
              event.preventDefault();
              take();
            }}
            onKeyUp={(event) => holds(event) && release()}
            onBlur={release}
          >
            {held ? 'Holding' : 'Hold'}
          </button>
        )}
      </div>
    </fieldset>
  );
}

function Note() {
  return (
    <form
      class="group"
      onSubmit={(event) => {
        event.preventDefault();
        const field = event.currentTarget.elements.namedItem('note') as HTMLTextAreaElement;
        void act({ kind: 'note', text: field.value }, 'Note').then((ok) => {
          if (ok) field.value = '';
        });
      }}
    >
      <h3>Note for the record</h3>
      <label>
        <span class="hidden">Text of the note</span>
        <textarea name="note" rows={2} maxLength={2000} required />
      </label>
      <button type="submit">Write it down</button>
    </form>
  );
}
