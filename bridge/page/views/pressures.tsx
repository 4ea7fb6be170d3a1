import { useEffect, useRef, useState } from 'preact/hooks';
import type { PressureFacts } from '../../live/source.js';
import { subject } from '../store/connection.js';
import {
  fine,
  lookOf,
  midSentence,
  peaks,
  pressureWarnings,
  resetPeaks,
  timeToRelief,
  worst,
} from '../store/pressures.js';
import { clock, format, number, shownAs } from '../store/units.js';
import { beat, newest, pulse, rangeOf, usePaths } from '../store/values.js';

/** Every watched pressure as a column against its settings. */
export function Pressures() {
  const pressures = subject.value?.bench.pressures ?? [];
  usePaths(pressures.flatMap((pressure) => [pressure.path, pressure.timeToRelief]));
  return (
    <section class="panel pressures" aria-labelledby="pressures-title">
      <header>
        <h2 id="pressures-title">Pressures</h2>
        <button type="button" class="small" onClick={resetPeaks}>
          Reset peaks
        </button>
      </header>
      {pressures.length === 0 && <p class="quiet">This bench declares no watched pressure.</p>}
      <div class="columns">
        {pressures.map((pressure) => (
          <Column key={pressure.path} pressure={pressure} />
        ))}
      </div>
    </section>
  );
}

function Column({ pressure }: { pressure: PressureFacts }) {
  beat.value;
  const shown = shownAs('Pa');
  const value = newest(pressure.path);
  const peak = peaks.value.get(pressure.path);
  const warning = worst(pressureWarnings.value.filter((candidate) => candidate.path === pressure.path));
  const look = warning?.active ? lookOf(warning) : fine;
  const seconds = timeToRelief(pressure);
  return (
    <article class={`column tone-${look.tone}`}>
      <h3>{pressure.name}</h3>
      <p class="value">
        <output class="number">{format(value, shown)}</output> <span class="unit number">{shown.unit}</span>
      </p>
      <p class="state">
        <span class="shape" aria-hidden="true">
          {look.shape}
        </span>{' '}
        {look === fine ? 'Within' : look.words}
      </p>
      <Glass pressure={pressure} />
      <dl>
        <dt>Peak</dt>
        <dd class="number">{peak === undefined ? '–' : format(peak, shown)}</dd>
        {pressure.relief !== undefined && (
          <>
            <dt>Relief in</dt>
            <dd class="number">
              {value >= pressure.relief ? 'reached' : seconds === undefined ? '–' : `${number(seconds, 1)} s`}
            </dd>
          </>
        )}
      </dl>
      {warning !== undefined && !warning.acknowledged && !warning.active && (
        <p class="quiet">
          was {midSentence(lookOf(warning))} at {clock(warning.sinceTick, subject.value?.bench.step ?? 0.001)}
        </p>
      )}
    </article>
  );
}

/** The column itself, like oil in a gauge glass: follows the display rate. */
function Glass({ pressure }: { pressure: PressureFacts }) {
  pulse.value;
  const box = useRef<HTMLDivElement>(null);
  const [height, setHeight] = useState(260);
  useEffect(() => {
    if (box.current === null) return;
    const watch = new ResizeObserver(([entry]) => setHeight(Math.max(60, entry.contentRect.height)));
    watch.observe(box.current);
    return () => watch.disconnect();
  }, []);
  const shown = shownAs('Pa');
  const base = subject.value?.bench.ambientPressure ?? 101325;
  // settings are round numbers: a decimal only where it tells something
  const short = (si: number) => {
    const value = si * shown.factor + shown.offset;
    return number(value, Math.abs(value) >= 100 || Math.abs(value - Math.round(value)) < 0.05 ? 0 : shown.decimals);
  };
  const share = (si: number | undefined) =>
    si === undefined || !Number.isFinite(si) ? 0 : Math.min(1, Math.max(0, (si - base) / (pressure.scaleMost - base)));
  const [least, most] = rangeOf(pressure.path);
  const peak = peaks.value.get(pressure.path);
  const em = Number.parseFloat(getComputedStyle(document.documentElement).fontSize);
  const marks = labels(
    [
      { at: pressure.maximumAllowable, text: 'PS', kind: 'limit' },
      { at: pressure.relief, text: 'relief', kind: 'relief' },
      { at: pressure.precharge, text: 'precharge', kind: 'low' },
      { at: pressure.leastInlet, text: 'least inlet', kind: 'low' },
    ].flatMap((mark) =>
      mark.at === undefined ? [] : [{ share: share(mark.at), text: `${short(mark.at)} ${mark.text}`, kind: mark.kind }],
    ),
    (em * 0.95) / height,
  );
  const percent = (x: number) => `${(x * 100).toFixed(2)}%`;
  return (
    <div class="glass" ref={box} aria-hidden="true">
      <div class="tube">
        {pressure.workingLeast !== undefined && pressure.workingMost !== undefined && (
          <div
            class="working"
            style={{
              bottom: percent(share(pressure.workingLeast)),
              height: percent(share(pressure.workingMost) - share(pressure.workingLeast)),
            }}
          />
        )}
        <div class="fill" style={{ height: percent(share(least)) }} />
        <div
          class="breath"
          style={{ bottom: percent(share(least)), height: percent(Math.max(0.004, share(most) - share(least))) }}
        />
        {peak !== undefined && <div class="peak" style={{ bottom: percent(share(peak)) }} />}
      </div>
      <svg
        aria-hidden="true"
        class="marks"
        width="100%"
        height={height}
        viewBox={`0 0 100 ${height}`}
        preserveAspectRatio="none"
      >
        {marks.map((mark) => (
          <polyline
            key={mark.text}
            class={`mark ${mark.kind}`}
            points={`0,${(1 - mark.share) * height} 8,${(1 - mark.share) * height} 16,${(1 - mark.placed) * height}`}
          />
        ))}
      </svg>
      {marks.map((mark) => (
        <span key={mark.text} class={`label ${mark.kind}`} style={{ bottom: percent(mark.placed) }}>
          {mark.text}
        </span>
      ))}
    </div>
  );
}

/** Moves labels apart until none covers another. */
function labels<T extends { share: number }>(marks: readonly T[], gap: number): (T & { placed: number })[] {
  const sorted = [...marks]
    .sort((a, b) => a.share - b.share)
    .map((mark) => ({ ...mark, placed: Math.max(gap / 2, mark.share) }));
  for (let i = 1; i < sorted.length; i += 1) sorted[i].placed = Math.max(sorted[i].placed, sorted[i - 1].placed + gap);
  let ceiling = 1 - gap / 2;
  for (let i = sorted.length - 1; i >= 0; i -= 1) {
    sorted[i].placed = Math.min(sorted[i].placed, ceiling);
    ceiling = sorted[i].placed - gap;
  }
  return sorted;
}
