import { useEffect, useRef, useState } from 'preact/hooks';
import { Scroll } from '../parts/scroll.js';
import {
  askMoment,
  askShelf,
  goLive,
  offersRecordings,
  openRecording,
  shelf,
  subject,
  tick,
} from '../store/connection.js';
import { clock } from '../store/units.js';
import { showMoment } from '../store/values.js';

/** Recordings that the host knows; one opens in this page in place of the bench. */
export function Recordings() {
  useEffect(askShelf, []);
  return (
    <section class="panel" aria-labelledby="recordings-title">
      <header>
        <h2 id="recordings-title">Recordings</h2>
        {subject.value?.recording !== undefined && (
          <button type="button" class="primary" onClick={goLive}>
            Back to the bench
          </button>
        )}
      </header>
      {!offersRecordings.value && <p class="quiet">This server offers no recordings.</p>}
      {offersRecordings.value && shelf.value.length === 0 && <p class="quiet">There is none yet.</p>}
      {shelf.value.length > 0 && (
        <Scroll label="Table of recordings">
          <table class="full">
            <thead>
              <tr>
                <th scope="col">Recording</th>
                <th scope="col">Bench</th>
                <th scope="col">Scenario</th>
                <th scope="col">Started</th>
                <th scope="col" class="number">
                  Length
                </th>
                <th scope="col">Verdict</th>
                <th scope="col">
                  <span class="hidden">Open</span>
                </th>
              </tr>
            </thead>
            <tbody>
              {shelf.value.map((entry) => (
                <tr key={entry.name}>
                  <th scope="row">{entry.name}</th>
                  <td>{entry.bench}</td>
                  <td>{entry.scenario}</td>
                  <td class="number">{new Date(entry.startedAt).toLocaleString()}</td>
                  <td class="number">{clock(entry.length, 1, 0)}</td>
                  <td class={`verdict ${shapeOf(entry.verdict).kind}`}>
                    {shapeOf(entry.verdict).shape} {entry.verdict}
                  </td>
                  <td>
                    <button type="button" onClick={() => openRecording(entry.name)}>
                      Open<span class="hidden"> {entry.name}</span>
                    </button>
                  </td>
                </tr>
              ))}
            </tbody>
          </table>
        </Scroll>
      )}
    </section>
  );
}

/** A verdict's shape, so that colour does not say it alone. */
function shapeOf(verdict: string): { readonly shape: string; readonly kind: string } {
  if (verdict === 'pass') return { shape: '✓', kind: 'holds' };
  if (verdict === 'fail') return { shape: '✖', kind: 'violated' };
  if (verdict.startsWith('not valid')) return { shape: '▲', kind: 'violated' };
  return { shape: '○', kind: 'open' };
}

/** The moment of the recording that the page shows. */
export function Moment() {
  const recording = subject.value?.recording;
  const step = subject.value?.bench.step ?? 0.001;
  const [playing, setPlaying] = useState(false);
  const busy = useRef(0);
  const show = (at: number) => {
    if (recording === undefined) return;
    tick.value = Math.min(recording.lastTick, Math.max(recording.firstTick, Math.round(at)));
    clearTimeout(busy.current);
    busy.current = setTimeout(() => {
      askMoment(tick.peek());
      showMoment(tick.peek());
    }, 40) as unknown as number;
  };
  // plays from where it stands
  useEffect(() => {
    if (!playing || recording === undefined) return;
    const timer = setInterval(() => {
      if (tick.peek() >= recording.lastTick) setPlaying(false);
      show(tick.peek() + 0.1 / step);
    }, 100);
    return () => clearInterval(timer);
  }, [playing, recording]);
  if (recording === undefined) return null;
  return (
    <section class="moment" aria-label="Moment of the recording">
      <strong>Recording {recording.name}</strong>
      <button type="button" onClick={() => setPlaying(!playing)}>
        {playing ? '❚❚ Stop' : '▶ Play'}
      </button>
      <input
        type="range"
        aria-label="Moment"
        aria-valuetext={clock(tick.value, step)}
        min={recording.firstTick}
        max={recording.lastTick}
        step={1}
        value={tick.value}
        onInput={(event) => show(event.currentTarget.valueAsNumber)}
      />
      <span class="number">
        {clock(tick.value, step)} / {clock(recording.lastTick, step)}
      </span>
      <button type="button" class="primary" onClick={goLive}>
        Back to the bench
      </button>
    </section>
  );
}
