import { useId, useState } from 'preact/hooks';
import { Chart } from '../parts/chart.js';
import { changeCharts, charts, chartView, live, move, pause, visibleRange, windows, zoom } from '../store/charts.js';
import { subject, tick } from '../store/connection.js';
import { clock } from '../store/units.js';
import { beat } from '../store/values.js';

/** Buttons that act on all charts. */
export function ChartTools() {
  const view = chartView.value;
  beat.value;
  const [from, to] = visibleRange(view, tick.peek());
  const step = subject.value?.bench.step ?? 0.001;
  const isRecording = subject.value?.recording !== undefined;
  return (
    <div class="tools" role="toolbar" aria-label="Time shown in the charts">
      <label>
        Window{' '}
        <select
          value={view.live ? String(view.seconds) : ''}
          disabled={!view.live}
          onChange={(event) => (chartView.value = { live: true, seconds: Number(event.currentTarget.value) })}
        >
          {!view.live && <option value="">free</option>}
          {windows.map(([seconds, text]) => (
            <option key={seconds} value={String(seconds)}>
              {text}
            </option>
          ))}
        </select>
      </label>
      <button type="button" onClick={() => move(-0.5)}>
        ◀ Earlier
      </button>
      {!isRecording && (
        <button type="button" class={view.live ? '' : 'primary'} onClick={view.live ? pause : live}>
          {view.live ? '❚❚ Pause' : '▶ Live'}
        </button>
      )}
      <button type="button" disabled={view.live} onClick={() => move(0.5)}>
        Later ▶
      </button>
      <button type="button" aria-label="Zoom in" onClick={() => zoom(0.5)}>
        +
      </button>
      <button type="button" aria-label="Zoom out" onClick={() => zoom(2)}>
        −
      </button>
      <span class="number quiet">
        {clock(Math.max(0, from), step)} – {clock(to, step)}
      </span>
    </div>
  );
}

export function Charts({ most }: { most?: number }) {
  const list = charts.value.slice(0, most);
  return (
    <section class="panel charts" aria-labelledby="charts-title">
      <header>
        <h2 id="charts-title">Charts</h2>
        <ChartTools />
      </header>
      {list.map((chart, i) => (
        <Chart key={`${i}${chart.paths.join()}`} name={chart.name} paths={chart.paths} />
      ))}
      {most === undefined && <Composer />}
    </section>
  );
}

/** Which signals stand in which chart. */
function Composer() {
  const list = useId();
  const [problem, setProblem] = useState('');
  const known = subject.value;
  const change = (at: number, paths: readonly string[]) =>
    changeCharts(
      charts.value.flatMap((chart, i) => (i !== at ? [chart] : paths.length === 0 ? [] : [{ ...chart, paths }])),
    );
  const add = (at: number, path: string): boolean => {
    if (known?.index.get(path) === undefined) {
      setProblem(`There is no signal called ${path}.`);
      return false;
    }
    setProblem('');
    if (at < 0) changeCharts([...charts.value, { name: path, paths: [path] }]);
    else change(at, [...charts.value[at].paths.filter((other) => other !== path), path]);
    return true;
  };
  return (
    <details class="composer">
      <summary>Choose signals</summary>
      <datalist id={list}>
        {known?.signals.map((info) => (
          <option key={info.path} value={info.path}>
            {info.about}
          </option>
        ))}
      </datalist>
      {problem !== '' && <p role="alert">{problem}</p>}
      {[...charts.value, undefined].map((chart, at) => (
        <form
          key={at}
          class="compose"
          onSubmit={(event) => {
            event.preventDefault();
            const input = event.currentTarget.elements.namedItem('path') as HTMLInputElement;
            if (add(chart === undefined ? -1 : at, input.value.trim())) input.value = '';
          }}
        >
          <strong>{chart?.name ?? 'New chart'}</strong>
          {chart?.paths.map((path) => (
            <button
              type="button"
              class="chip"
              key={path}
              aria-label={`Remove ${path} from ${chart.name}`}
              onClick={() =>
                change(
                  at,
                  chart.paths.filter((other) => other !== path),
                )
              }
            >
              {path} ×
            </button>
          ))}
          <label>
            <span class="hidden">Signal to add to {chart?.name ?? 'a new chart'}</span>
            <input
              name="path"
              list={list}
              placeholder="element.signal"
              autocomplete="off"
              spellcheck={false}
              required
            />
          </label>
          <button type="submit">Add</button>
        </form>
      ))}
      <button type="button" onClick={() => changeCharts(known?.bench.charts ?? [])}>
        Charts as the bench has them
      </button>
    </details>
  );
}
