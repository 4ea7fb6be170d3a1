import { useEffect, useState } from 'preact/hooks';
import type { SignalInfo } from '../../../runtime/contract.js';
import type { History } from '../../live/source.js';
import { chartView, visibleRange } from '../store/charts.js';
import { askHistory, subject, tick } from '../store/connection.js';
import { clock, format, shownOf } from '../store/units.js';
import { Scroll } from './scroll.js';

/** What a chart shows, as text: least and greatest value in ten stretches of the visible time. */
export function ChartTable({
  name,
  lines,
}: {
  name: string;
  lines: readonly { readonly info: SignalInfo; readonly at: number }[];
}) {
  const [history, setHistory] = useState<History | undefined>(undefined);
  const key = lines.map((line) => line.at).join();
  const view = chartView.value;
  // the key stands for the lines
  useEffect(() => {
    const look = () => {
      const [from, to] = visibleRange(chartView.peek(), tick.peek());
      void askHistory(
        lines.map((line) => line.at),
        from,
        to,
        10,
      )
        .then(setHistory)
        .catch(() => undefined);
    };
    look();
    const timer = setInterval(look, 2000);
    return () => clearInterval(timer);
  }, [key, view]);
  const bins = history?.ticks.length ?? 0;
  const step = subject.value?.bench.step ?? 0.001;
  return (
    <Scroll label={`Values of ${name}`}>
      <table>
        <caption>Least … greatest value in each stretch, brought up to date every two seconds</caption>
        <thead>
          <tr>
            <th scope="col">from</th>
            {lines.map(({ info }) => (
              <th scope="col" key={info.path}>
                {info.path} {shownOf(info).unit}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {Array.from({ length: bins }, (_, bin) => (
            <tr key={history?.ticks[bin]}>
              <th scope="row" class="number">
                {clock(history?.ticks[bin] ?? 0, step)}
              </th>
              {lines.map(({ info }, i) => (
                <td key={info.path} class="number">
                  {format(history?.least[i * bins + bin] ?? Number.NaN, shownOf(info))} …{' '}
                  {format(history?.most[i * bins + bin] ?? Number.NaN, shownOf(info))}
                </td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
    </Scroll>
  );
}
