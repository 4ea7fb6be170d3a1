import { useEffect, useRef, useState } from 'preact/hooks';
import uPlot from 'uplot';
import 'uplot/dist/uPlot.min.css';
import type { SignalInfo } from '../../../runtime/contract.js';
import { chartView, cursorTick, move, visibleRange, zoom } from '../store/charts.js';
import { askHistory, onFrame, onReset, subject, tick } from '../store/connection.js';
import { calm, coloursChanged, flowUnit, pressureUnit, speedUnit } from '../store/preferences.js';
import { Strip } from '../store/strip.js';
import { clock, format, shownOf, withUnit } from '../store/units.js';
import { beat, newest, signalsOf, usePaths } from '../store/values.js';
import { ChartTable } from './chart-table.js';
import { drawSoon, forgetDrawing } from './drawing.js';

const dashes: (number[] | undefined)[] = [undefined, [7, 4], [2, 3], [12, 4, 2, 4], [4, 2], [1, 4]];
const sync = uPlot.sync('time');

interface Line {
  readonly info: SignalInfo;
  readonly at: number;
}

/** One strip chart: lines over time with a cursor that all charts share. */
export function Chart({ name, paths, height }: { name: string; paths: readonly string[]; height?: number }) {
  const known = subject.value;
  const box = useRef<HTMLDivElement>(null);
  const strip = useRef<Strip>(new Strip([], 1));
  const [table, setTable] = useState(false);
  usePaths(paths);
  const lines: Line[] = paths.flatMap((path) => {
    const at = known?.index.get(path);
    return known === undefined || at === undefined ? [] : [{ info: known.signals[at], at }];
  });
  // the chart is built anew when anything changes that uPlot takes only at the start
  const key = [
    paths.join(),
    pressureUnit.value,
    speedUnit.value,
    flowUnit.value,
    coloursChanged.value,
    known?.recording?.name,
    known?.bench.name,
  ].join('|');

  // the key stands for everything that is read
  useEffect(() => {
    const place = box.current;
    if (place === null || known === undefined || lines.length === 0) return;
    return draw(place, known.bench.step, known.interval, lines, strip);
  }, [key]);

  beat.value;
  const cursor = cursorTick.value;
  const step = known?.bench.step ?? 0.001;
  const here = cursor === undefined ? undefined : strip.current.at(cursor);
  const said =
    here === undefined
      ? 'no cursor'
      : `${clock(here.tick, step, 2)}: ${lines.map((line, i) => `${line.info.path} ${withUnit(here.most[i], shownOf(line.info))}`).join(', ')}`;
  const [from, to] = visibleRange(chartView.value, tick.value);
  const keys = (event: KeyboardEvent) => {
    const now = cursor ?? to;
    const moves: Record<string, () => void> = {
      ArrowLeft: () => (cursorTick.value = strip.current.neighbour(now, event.shiftKey ? -20 : -1)),
      ArrowRight: () => (cursorTick.value = strip.current.neighbour(now, event.shiftKey ? 20 : 1)),
      Home: () => (cursorTick.value = strip.current.neighbour(0, 0)),
      End: () => (cursorTick.value = strip.current.lastTick),
      PageUp: () => move(-0.5),
      PageDown: () => move(0.5),
      '+': () => zoom(0.5),
      '-': () => zoom(2),
      Escape: () => (cursorTick.value = undefined),
    };
    const act = moves[event.key];
    if (act === undefined) return;
    event.preventDefault();
    act();
  };
  return (
    <figure class="chart">
      <figcaption>
        <h3>{name}</h3>
        <ul class="legend">
          {lines.map((line, i) => (
            <li key={line.info.path} title={line.info.about}>
              <svg class="sample" viewBox="0 0 26 8" aria-hidden="true">
                <line
                  x1="0"
                  y1="4"
                  x2="26"
                  y2="4"
                  class={`series${i % 6}`}
                  stroke-dasharray={dashes[i % 6]?.join(' ')}
                />
              </svg>
              <span class="path">{line.info.path}</span>
              <output class="number">
                {here === undefined
                  ? withUnit(newest(line.info.path), shownOf(line.info))
                  : span(here.least[i], here.most[i], line.info)}
              </output>
            </li>
          ))}
        </ul>
        <button type="button" class="small" aria-pressed={table} onClick={() => setTable(!table)}>
          Table
        </button>
      </figcaption>
      <div
        class="plot"
        ref={box}
        role="slider"
        tabIndex={0}
        aria-label={`Cursor of the chart ${name}`}
        aria-valuemin={Math.round(Math.max(0, from))}
        aria-valuemax={Math.round(to)}
        aria-valuenow={Math.round(cursor ?? to)}
        aria-valuetext={said}
        onKeyDown={keys}
        style={height === undefined ? undefined : { height: `${height}px` }}
      />
      {table && <ChartTable name={name} lines={lines} />}
    </figure>
  );
}

function span(least: number, most: number, info: SignalInfo): string {
  const shown = shownOf(info);
  return format(least, shown) === format(most, shown)
    ? withUnit(most, shown)
    : `${format(least, shown)} … ${withUnit(most, shown)}`;
}

/** Settings of the pressures among the lines, drawn where they fall into the picture. */
function settingsOf(lines: readonly Line[]): { value: number; text: string }[] {
  const found = new Map<string, { value: number; text: string }>();
  for (const { info } of lines) {
    const facts = subject.peek()?.bench.pressures.find((pressure) => pressure.path === info.path);
    if (facts === undefined) continue;
    const shown = shownOf(info);
    const add = (text: string, si: number | undefined) => {
      if (si !== undefined) found.set(text, { value: si * shown.factor + shown.offset, text });
    };
    add('relief', facts.relief);
    add('PS', facts.maximumAllowable);
    add('precharge', facts.precharge);
  }
  return [...found.values()];
}

function draw(
  place: HTMLDivElement,
  step: number,
  interval: number,
  lines: readonly Line[],
  held: { current: Strip },
): () => void {
  const look = getComputedStyle(document.documentElement);
  const colour = (name: string) => look.getPropertyValue(name).trim();
  const em = Number.parseFloat(look.fontSize);
  const font = `${Math.round(em * 0.75)}px ${look.fontFamily}`;
  const units = [...new Set(lines.map((line) => shownOf(line.info).unit))];
  const settings = settingsOf(lines);
  const shown = lines.map((line) => shownOf(line.info));
  let loading = false;
  let again = false;

  const axis = {
    stroke: colour('--quiet'),
    font,
    grid: { stroke: colour('--grid'), width: 1 },
    ticks: { stroke: colour('--grid'), width: 1, size: 4 },
  };
  const plot = new uPlot(
    {
      width: Math.max(50, place.clientWidth),
      height: Math.max(50, place.clientHeight),
      legend: { show: false },
      cursor: {
        sync: { key: sync.key, setSeries: false },
        drag: { x: true, y: false, setScale: false },
        points: { show: false },
      },
      select: { show: true, left: 0, top: 0, width: 0, height: 0 },
      scales: {
        x: {
          time: false,
          range: () => {
            const [from, to] = visibleRange(chartView.peek(), tick.peek());
            return [from * step, Math.max(to, from + 1) * step];
          },
        },
        ...Object.fromEntries(units.map((unit) => [`u${unit}`, { range: padded }])),
      },
      axes: [
        {
          ...axis,
          size: em * 1.6,
          gap: 4,
          values: (_plot: uPlot, splits: number[]) =>
            splits.map((x) => (x < 0 ? '' : clock(x / step, step, splits[1] - splits[0] < 1 ? 1 : 0))),
        },
        ...units.slice(0, 2).map((unit, i) => ({
          ...axis,
          scale: `u${unit}`,
          side: (i === 0 ? 3 : 1) as uPlot.Axis.Side,
          grid: { show: i === 0, stroke: colour('--grid'), width: 1 },
          size: em * 3.4,
          gap: 4,
          label: unit,
          labelFont: font,
          labelSize: em * 1.1,
          space: em * 1.9,
        })),
      ],
      series: [
        {},
        ...lines.map((line, i) => ({
          label: line.info.path,
          scale: `u${shown[i].unit}`,
          stroke: colour(`--series${i % 6}`),
          width: Math.max(1.5, em / 10),
          ...(dashes[i % 6] === undefined ? {} : { dash: dashes[i % 6] as number[] }),
          points: { show: false },
          spanGaps: false,
        })),
      ],
      hooks: {
        setCursor: [(self) => moved(self)],
        setSelect: [
          (self) => {
            if (self.select.width < 8) return;
            const from = Math.max(0, Math.round(self.posToVal(self.select.left, 'x') / step));
            const to = Math.round(self.posToVal(self.select.left + self.select.width, 'x') / step);
            self.setSelect({ left: 0, top: 0, width: 0, height: 0 }, false);
            if (to - from >= 20) chartView.value = { live: false, from, to };
          },
        ],
        draw: [(self) => drawSettings(self, settings, `u${units[0]}`, colour('--ink'), colour('--panel'), font)],
      },
    },
    [[], ...lines.map(() => [])],
    place,
  );
  function moved(self: uPlot): void {
    // only the chart under the pointer speaks; the others follow by the shared key
    if (self.cursor.event === undefined || self.cursor.event === null) return;
    const left = self.cursor.left ?? -1;
    cursorTick.value = left < 0 ? undefined : Math.round(self.posToVal(left, 'x') / step);
  }

  let strip = new Strip(
    lines.map((line) => line.at),
    interval,
  );
  held.current = strip;
  function load(): void {
    const view = chartView.peek();
    const [from, to] = visibleRange(view, tick.peek());
    const bins = Math.min(2000, Math.max(200, Math.round(place.clientWidth)));
    const wide = Math.max(interval, Math.ceil((to - from) / bins / interval) * interval);
    if (loading) {
      again = true;
      return;
    }
    loading = true;
    const mine = new Strip(
      lines.map((line) => line.at),
      wide,
    );
    askHistory(mine.signals, from - wide, view.live ? to + 1e6 : to + wide, bins)
      .then((history) => {
        mine.replace(history);
        if (history.ticks.length > 1) mine.binTicks = Math.max(wide, history.ticks[1] - history.ticks[0]);
        strip = mine;
        held.current = mine;
        show();
      })
      .catch(() => undefined)
      .finally(() => {
        loading = false;
        if (again) {
          again = false;
          load();
        }
      });
  }
  const picture = (): void => {
    // the newest tick that is drawn, for measurements and tests
    place.dataset['tick'] = String(strip.lastTick + strip.binTicks - 1);
    plot.setData(strip.points(step, (i, value) => value * shown[i].factor + shown[i].offset) as uPlot.AlignedData);
  };
  const show = (): void => drawSoon(picture);
  let lastShown = 0;
  const offFrame = onFrame((message) => {
    const view = chartView.peek();
    if (!view.live) return;
    const order = signalsOf(message);
    // what it does not carry yet comes with the next
    if (order === undefined || strip.signals.some((at) => !order.includes(at))) return;
    strip.append(message, order);
    strip.forget(tick.peek() - view.seconds / step);
    if (calm.matches && performance.now() - lastShown < 500) return;
    lastShown = performance.now();
    show();
  });
  const offReset = onReset(load);
  const offView = chartView.subscribe(load);
  const offCursor = cursorTick.subscribe((at) => {
    if (plot.cursor.event !== undefined && plot.cursor.event !== null) return;
    if (at !== undefined && plot.data[0].length > 0)
      plot.setCursor({ left: plot.valToPos(at * step, 'x'), top: plot.over.clientHeight / 2 }, false);
  });
  const resize = new ResizeObserver(() =>
    plot.setSize({ width: Math.max(50, place.clientWidth), height: Math.max(50, place.clientHeight) }),
  );
  resize.observe(place);
  return () => {
    offFrame();
    offReset();
    offView();
    offCursor();
    resize.disconnect();
    forgetDrawing(picture);
    plot.destroy();
  };
}

function padded(_plot: uPlot, least: number | null, most: number | null): [number, number] {
  if (least === null || most === null || !Number.isFinite(least) || !Number.isFinite(most)) return [0, 1];
  const room = Math.max((most - least) * 0.08, Math.abs(most) * 0.01, 0.01);
  return [least - room, most + room];
}

function drawSettings(
  plot: uPlot,
  settings: readonly { value: number; text: string }[],
  scale: string,
  ink: string,
  panel: string,
  font: string,
): void {
  const { ctx, bbox } = plot;
  const ratio = devicePixelRatio;
  ctx.save();
  ctx.strokeStyle = ink;
  ctx.fillStyle = ink;
  ctx.lineWidth = ratio;
  ctx.setLineDash([2 * ratio, 4 * ratio]);
  ctx.font = font.replace(/^(\d+)px/, (_all, size: string) => `${Number(size) * ratio}px`);
  ctx.textAlign = 'right';
  const places: { x: number; y: number }[] = [];
  for (const { value, text } of settings) {
    const y = plot.valToPos(value, scale, true);
    if (!(y >= bbox.top && y <= bbox.top + bbox.height)) continue;
    ctx.beginPath();
    ctx.moveTo(bbox.left, y);
    ctx.lineTo(bbox.left + bbox.width, y);
    ctx.stroke();
    // beside the text that is already there, where two settings are close
    let x = bbox.left + bbox.width - 4 * ratio;
    for (const taken of places) if (Math.abs(taken.y - y) < 14 * ratio) x = Math.min(x, taken.x - 10 * ratio);
    ctx.setLineDash([]);
    ctx.strokeStyle = panel;
    ctx.lineWidth = 4 * ratio;
    ctx.strokeText(text, x, y - 4 * ratio);
    ctx.fillText(text, x, y - 4 * ratio);
    ctx.strokeStyle = ink;
    ctx.lineWidth = ratio;
    ctx.setLineDash([2 * ratio, 4 * ratio]);
    places.push({ x: x - ctx.measureText(text).width, y });
  }
  ctx.restore();
}
