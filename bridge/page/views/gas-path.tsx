import { useEffect, useRef, useState } from 'preact/hooks';
import type { AccumulatorFacts } from '../../live/source.js';
import { askHistory, onReset, subject, tick } from '../store/connection.js';
import { format, shownAs, withUnit } from '../store/units.js';
import { beat, newest, usePaths } from '../store/values.js';

const mostPoints = 900;

/** Where each accumulator's gas stands and came from, in the plane of pressure and volume. */
export function GasPaths() {
  const accumulators = subject.value?.bench.accumulators ?? [];
  if (accumulators.length === 0) return null;
  return (
    <section class="panel" aria-labelledby="gas-title">
      <header>
        <h2 id="gas-title">Gas in the accumulators</h2>
      </header>
      {accumulators.map((accumulator) => (
        <GasPath key={accumulator.name} facts={accumulator} />
      ))}
    </section>
  );
}

function GasPath({ facts }: { facts: AccumulatorFacts }) {
  usePaths([facts.pressure, facts.volume, facts.temperature]);
  const trail = useRef<[number, number][]>([]);
  const [, setTick] = useState(-1);
  const now = beat.value;
  // once per beat
  useEffect(() => {
    const [v, p] = [newest(facts.volume), newest(facts.pressure)];
    if (Number.isFinite(v) && Number.isFinite(p)) {
      trail.current.push([v, p]);
      if (trail.current.length > mostPoints) trail.current.shift();
    }
    setTick(tick.peek());
  }, [now]);
  // the accumulator does not change its paths
  useEffect(() => {
    const load = () => {
      const known = subject.peek();
      const indices = [facts.volume, facts.pressure].map((path) => known?.index.get(path) ?? 0);
      const to = tick.peek();
      const from = known?.recording?.firstTick ?? Math.max(0, to - 60 / (known?.bench.step ?? 0.001));
      void askHistory(indices, from, Math.max(from, to), 600)
        .then((history) => {
          const bins = history.ticks.length;
          const middle = (at: number) => (history.least[at] + history.most[at]) / 2;
          trail.current = Array.from(history.ticks, (_, bin) => [middle(bin), middle(bins + bin)]);
        })
        .catch(() => undefined);
    };
    load();
    return onReset(load);
  }, []);

  const pressure = shownAs('Pa');
  const volume = shownAs('m3');
  const [width, height, left, bottom] = [640, 360, 62, 44];
  const vMost = facts.gasVolume * 1.05;
  const pMost = (facts.maximumAllowable ?? facts.precharge * 2.5) * 1.08;
  const x = (v: number) => left + (v / vMost) * (width - left - 12);
  const y = (p: number) => 12 + (1 - p / pMost) * (height - bottom - 12);
  const line = (points: readonly (readonly [number, number])[]) =>
    points
      .filter(([, p]) => p <= pMost)
      .map(([v, p], i) => `${i === 0 ? 'M' : 'L'}${x(v).toFixed(1)} ${y(p).toFixed(1)}`)
      .join('');
  const [v, p] = [newest(facts.volume), newest(facts.pressure)];
  const curves = facts.curves?.map((curve) => ({
    name: curve.name,
    points: curve.volume.map((at, i): [number, number] => [at, curve.pressure[i]]),
  })) ?? [
    { name: 'isotherm', points: ideal(facts, 1) },
    { name: 'adiabat', points: ideal(facts, 1.4) },
  ];
  const said = `${facts.name}: ${withUnit(p, pressure)} at ${withUnit(v, volume)} of gas${facts.temperature === undefined ? '' : `, ${withUnit(newest(facts.temperature), shownAs('K'))}`}`;
  return (
    <figure class="gas">
      <svg viewBox={`0 0 ${width} ${height}`} role="img" aria-label={`Path in the pressure-volume plane. ${said}`}>
        {steps(pMost * pressure.factor + pressure.offset, 5).map((at) => (
          <g key={at}>
            <line
              class="grid"
              x1={left}
              x2={width - 12}
              y1={y((at - pressure.offset) / pressure.factor)}
              y2={y((at - pressure.offset) / pressure.factor)}
            />
            <text class="tick" x={left - 8} y={y((at - pressure.offset) / pressure.factor) + 4} text-anchor="end">
              {at}
            </text>
          </g>
        ))}
        {steps(vMost * volume.factor, 6).map((at) => (
          <g key={at}>
            <line class="grid" x1={x(at / volume.factor)} x2={x(at / volume.factor)} y1={12} y2={height - bottom} />
            <text class="tick" x={x(at / volume.factor)} y={height - bottom + 18} text-anchor="middle">
              {at}
            </text>
          </g>
        ))}
        {facts.maximumAllowable !== undefined && (
          <>
            <line
              class="limit"
              x1={left}
              x2={width - 12}
              y1={y(facts.maximumAllowable)}
              y2={y(facts.maximumAllowable)}
            />
            <text class="tick" x={width - 16} y={y(facts.maximumAllowable) - 5} text-anchor="end">
              PS {format(facts.maximumAllowable, pressure)}
            </text>
          </>
        )}
        {curves.map((curve, i) => {
          const inside = curve.points.filter((point) => point[1] <= pMost * 0.93);
          const at = inside[Math.floor(inside.length * (i % 2 === 0 ? 0.42 : 0.2))];
          return (
            <g key={curve.name}>
              <path class={`curve curve${i % 3}`} d={line(curve.points)} />
              {at !== undefined && (
                <text
                  class="tick"
                  x={x(at[0]) + (i % 2 === 0 ? -6 : 8)}
                  y={y(at[1]) + (i % 2 === 0 ? 14 : -4)}
                  text-anchor={i % 2 === 0 ? 'end' : 'start'}
                >
                  {curve.name}
                </text>
              )}
            </g>
          );
        })}
        <path class="trail" d={line(trail.current)} />
        {Number.isFinite(v) && Number.isFinite(p) && <circle class="here" cx={x(v)} cy={y(p)} r={6} />}
        <text class="tick" x={left} y={height - 6}>
          gas volume, {volume.unit}
        </text>
        <text class="tick" x={width - 12} y={height - 6} text-anchor="end">
          pressure, {pressure.unit}
        </text>
      </svg>
      <figcaption>
        <strong>{said}</strong>
        {facts.curves === undefined && (
          <span class="quiet">
            {' '}
            Curves: ideal gas from the precharge ({withUnit(facts.precharge, pressure)} at{' '}
            {withUnit(facts.prechargeTemperature, shownAs('K'))}); nitrogen departs from them above some 100 bar.
          </span>
        )}
      </figcaption>
    </figure>
  );
}

function ideal(facts: AccumulatorFacts, exponent: number): [number, number][] {
  return Array.from({ length: 60 }, (_, i) => {
    const v = facts.gasVolume * (1 - (i / 60) * 0.75);
    return [v, facts.precharge * (facts.gasVolume / v) ** exponent];
  });
}

/** Round numbers from 0 up to `most`, some `count` of them. */
function steps(most: number, count: number): number[] {
  const raw = most / count;
  const power = 10 ** Math.floor(Math.log10(raw));
  const step = [1, 2, 2.5, 5, 10].map((factor) => factor * power).find((candidate) => candidate >= raw) ?? power * 10;
  return Array.from({ length: Math.floor(most / step) + 1 }, (_, i) => Number((i * step).toPrecision(6)));
}
