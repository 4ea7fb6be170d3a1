import { useEffect, useRef, useState } from 'preact/hooks';
import type { ElementFacts } from '../../live/source.js';
import { Glyph } from '../parts/glyph.js';
import { Scroll } from '../parts/scroll.js';
import { fitting, type Layout, laidOut, type Placed, type Tie } from '../store/circuit-layout.js';
import { infoOf, status, subject } from '../store/connection.js';
import { lookOf, worst } from '../store/pressures.js';
import { shownAs, shownOf, withUnit } from '../store/units.js';
import { beat, newest, usePaths } from '../store/values.js';

/** The circuit as the bench file ties it, with what flows in it now. */
export function Circuit({ share = 0.72 }: { share?: number }) {
  const elements = subject.value?.bench.elements;
  const [layouts, setLayouts] = useState<readonly Layout[]>([]);
  const place = useRef<HTMLElement>(null);
  const [size, setSize] = useState<[number, number]>([900, 500]);
  const [problem, setProblem] = useState('');
  const [chosen, setChosen] = useState<string | undefined>(undefined);
  useEffect(() => {
    let gone = false;
    setLayouts([]);
    for (const direction of ['RIGHT', 'DOWN'] as const) {
      laidOut(elements ?? [], direction)
        .then((laid) => !gone && setLayouts((others) => [...others, laid]))
        .catch((error: unknown) => setProblem(String(error)));
    }
    return () => {
      gone = true;
    };
  }, [elements]);
  useEffect(() => {
    if (place.current === null) return;
    const watch = new ResizeObserver(([entry]) => setSize([entry.contentRect.width, window.innerHeight * share]));
    watch.observe(place.current);
    return () => watch.disconnect();
  }, [share]);
  const layout = fitting(layouts, size[0], size[1]);
  usePaths(
    (elements ?? []).flatMap((element) => [
      ...element.shows,
      element.flow,
      element.position?.path,
      ...element.faults.map((fault) => fault.path),
    ]),
  );
  const element = elements?.find((candidate) => candidate.name === chosen);
  return (
    <section class="panel circuit" aria-labelledby="circuit-title">
      <header>
        <h2 id="circuit-title">Circuit</h2>
        <ul class="key">
          <li class="oil">oil</li>
          <li class="shaft">shaft, road</li>
          <li class="gas">gas</li>
          <li class="heat">heat</li>
        </ul>
      </header>
      {problem !== '' && <p role="alert">The circuit could not be laid out: {problem}</p>}
      <Scroll label="Drawing of the circuit" place={place}>
        {layout === undefined && problem === '' && <p class="quiet">Laying the circuit out…</p>}
        {layout !== undefined && (
          <svg
            class="drawing"
            viewBox={`0 0 ${layout.width} ${layout.height}`}
            style={{
              minWidth: `${Math.round(layout.width * 0.6)}px`,
              maxWidth: `${Math.round(layout.width * Math.min(1.7, Math.max(0.6, size[1] / layout.height)))}px`,
            }}
          >
            <title>Stores and branches with their present values</title>
            {layout.ties.map((tie) => (
              <TieLine key={tie.key} tie={tie} />
            ))}
            {layout.nodes.map((node) => (
              <Node
                key={node.element.name}
                node={node}
                chosen={node.element.name === chosen}
                choose={() => setChosen(node.element.name === chosen ? undefined : node.element.name)}
              />
            ))}
          </svg>
        )}
      </Scroll>
      {element !== undefined && <Particulars element={element} close={() => setChosen(undefined)} />}
    </section>
  );
}

function faultsOf(element: ElementFacts): string[] {
  return element.faults
    .filter((fault) => {
      const value = newest(fault.path);
      return Number.isFinite(value) && Math.abs(value - fault.rest) > 1e-6;
    })
    .map((fault) => fault.about);
}

function TieLine({ tie }: { tie: Tie }) {
  beat.value;
  const flow = tie.branch.flow === undefined || tie.order > 1 ? Number.NaN : newest(tie.branch.flow);
  const info = tie.branch.flow === undefined ? undefined : infoOf(tie.branch.flow);
  const scale = info?.most ?? largest(tie.branch.flow, flow);
  const moves = Math.abs(flow) > scale * 0.002;
  const d = tie.points.map(([x, y], i) => `${i === 0 ? 'M' : 'L'}${x} ${y}`).join('');
  return (
    <g class={`tie ${tie.kind} ${moves ? 'moves' : ''}`}>
      <path d={d} />
      {moves && (
        <Arrow points={tie.points} forward={flow > 0} size={6 + 5 * Math.min(1, Math.sqrt(Math.abs(flow) / scale))} />
      )}
    </g>
  );
}

/** The largest flow that was seen, for signals that declare no range. */
const largestSeen = new Map<string, number>();
function largest(path: string | undefined, value: number): number {
  if (path === undefined) return 1;
  const seen = Math.max(largestSeen.get(path) ?? 1e-9, Number.isFinite(value) ? Math.abs(value) : 0);
  largestSeen.set(path, seen);
  // a trickle is no flow: 0.1 L/min, 1 N m
  return Math.max(seen, infoOf(path)?.unit === 'm3/s' ? 1e-3 : 100);
}

/** In the middle of the longest stretch of a line. */
function Arrow({
  points,
  forward,
  size,
}: {
  points: readonly (readonly [number, number])[];
  forward: boolean;
  size: number;
}) {
  let best = 0;
  const length = (i: number) => Math.hypot(points[i + 1][0] - points[i][0], points[i + 1][1] - points[i][1]);
  for (let i = 1; i + 1 < points.length; i += 1) if (length(i) > length(best)) best = i;
  const [[x1, y1], [x2, y2]] = [points[best], points[best + 1]];
  const angle = (Math.atan2(y2 - y1, x2 - x1) * 180) / Math.PI + (forward ? 0 : 180);
  return (
    <path
      class="arrow"
      d={`M${-size} ${-size * 0.75}L${size} 0L${-size} ${size * 0.75}Z`}
      transform={`translate(${(x1 + x2) / 2} ${(y1 + y2) / 2}) rotate(${angle})`}
    />
  );
}

/** A drawing has no button element; names of attributes in SVG are case-sensitive. */
const reachable = { role: 'button', tabindex: 0 } as const;

function Node({ node, chosen, choose }: { node: Placed; chosen: boolean; choose: () => void }) {
  beat.value;
  const { element } = node;
  const faults = faultsOf(element);
  const warning = worst(
    (status.value?.warnings ?? []).filter(
      (candidate) => candidate.active && candidate.path.startsWith(`${element.name}.`),
    ),
  );
  const tone = warning === undefined ? 'fine' : lookOf(warning).tone;
  const position = element.position === undefined ? undefined : newest(element.position.path);
  const lines = [
    ...element.shows.slice(0, 3).map((path) => {
      const info = infoOf(path);
      return info === undefined
        ? '–'
        : `${path === element.flow && newest(path) < 0 ? '◀ ' : ''}${withUnit(path === element.flow ? Math.abs(newest(path)) : newest(path), shownOf(info))}${path === element.flow && newest(path) > 0 ? ' ▶' : ''}`;
    }),
    ...(element.position === undefined || position === undefined
      ? []
      : [
          position > 0.98
            ? element.position.one
            : position < 0.02
              ? element.position.zero
              : `${Math.round(position * 100)} % ${element.position.one}`,
        ]),
  ];
  const said = `${element.name}, ${element.kind}: ${lines.join(', ')}${faults.length > 0 ? `; in fault: ${faults.join(', ')}` : ''}${warning === undefined ? '' : `; ${lookOf(warning).words}`}`;
  return (
    // biome-ignore lint/a11y/noStaticElementInteractions: its role comes with what makes it reachable
    // biome-ignore lint/a11y/useAriaPropsSupportedByRole: as above
    <g
      class={`node ${element.role} tone-${tone} ${faults.length > 0 ? 'fault' : ''} ${chosen ? 'chosen' : ''}`}
      transform={`translate(${node.x} ${node.y})`}
      {...reachable}
      aria-pressed={chosen}
      aria-label={said}
      onClick={choose}
      onKeyDown={(event) => {
        if (event.key !== 'Enter' && event.key !== ' ') return;
        event.preventDefault();
        choose();
      }}
    >
      <rect width={node.width} height={node.height} rx={element.role === 'store' ? 10 : 2} />
      <g transform="translate(7 8) scale(0.95)">
        <Glyph kind={element.kind} />
      </g>
      <text
        class="name"
        x={34}
        y={25}
        style={{ fontSize: `${Math.min(15.5, (node.width - 40) / (element.name.length * 0.66))}px` }}
      >
        {element.name}
      </text>
      {lines.map((line, i) => (
        <text class="number" key={i} x={node.width - 12} y={47 + i * 19} text-anchor="end">
          {line}
        </text>
      ))}
      {(faults.length > 0 || warning !== undefined) && (
        <g transform={`translate(${node.width - 14} 0)`}>
          <circle class="badge" r={11} />
          <text class="badge-text" text-anchor="middle" y={5}>
            {faults.length > 0 ? '⚡' : warning === undefined ? '' : lookOf(warning).shape}
          </text>
        </g>
      )}
    </g>
  );
}

function Particulars({ element, close }: { element: ElementFacts; close: () => void }) {
  const known = subject.value;
  const signals = known?.signals.filter((info) => info.path.startsWith(`${element.name}.`)) ?? [];
  usePaths(signals.map((info) => info.path));
  beat.value;
  return (
    <aside class="particulars" aria-label={`Particulars of ${element.name}`}>
      <header>
        <h3>
          {element.name} <span class="quiet">{element.kind}</span>
        </h3>
        <button type="button" class="small" onClick={close}>
          Close
        </button>
      </header>
      <p>{element.about}</p>
      {faultsOf(element).length > 0 && <p class="fault-text">⚡ in fault: {faultsOf(element).join(', ')}</p>}
      <div class="pair">
        <table>
          <caption>Signals</caption>
          <tbody>
            {signals.map((info) => (
              <tr key={info.path}>
                <th scope="row" title={info.about}>
                  {info.path.slice(element.name.length + 1)}
                </th>
                <td class="number">{withUnit(newest(info.path), shownOf(info))}</td>
              </tr>
            ))}
          </tbody>
        </table>
        {element.parameters.length > 0 && (
          <table>
            <caption>Parameters</caption>
            <tbody>
              {element.parameters.map((parameter) => (
                <tr key={parameter.name}>
                  <th scope="row" title={parameter.about}>
                    {parameter.name}
                  </th>
                  <td class="number">{withUnit(parameter.value, shownAs(parameter.unit))}</td>
                </tr>
              ))}
            </tbody>
          </table>
        )}
      </div>
    </aside>
  );
}
