import type { Histogram } from '../../live/source.js';
import { Scroll } from '../parts/scroll.js';
import { status, subject } from '../store/connection.js';
import { microseconds, number } from '../store/units.js';

/** Is the controller talking: messages with age, rate and errors. */
export function Messages({ brief = false }: { brief?: boolean }) {
  const facts = subject.value?.bench.messages ?? [];
  const states = status.value?.messages ?? [];
  return (
    <section class="panel" aria-labelledby="messages-title">
      <header>
        <h2 id="messages-title">Controller messages</h2>
      </header>
      <Scroll label="Table of messages">
        <table class="full">
          <thead>
            <tr>
              <th scope="col">Message</th>
              <th scope="col">State</th>
              <th scope="col" class="number">
                Age
              </th>
              <th scope="col" class="number">
                Rate
              </th>
              {!brief && (
                <th scope="col" class="number">
                  Due
                </th>
              )}
              {brief ? (
                <th scope="col" class="number">
                  Errors
                </th>
              ) : (
                <>
                  <th scope="col" class="number">
                    Lost
                  </th>
                  <th scope="col" class="number">
                    Late
                  </th>
                  <th scope="col" class="number">
                    Malformed
                  </th>
                </>
              )}
            </tr>
          </thead>
          <tbody>
            {facts.map((message, i) => {
              const state = states[i];
              if (state === undefined) return null;
              const never = state.age < 0;
              return (
                <tr key={message.name} class={state.timedOut ? 'bad' : ''}>
                  <th scope="row" title={message.about}>
                    {message.name}{' '}
                    <span class="quiet">{`${message.direction === 'received' ? '←' : '→'}${brief ? '' : ` ${message.link}`}`}</span>
                  </th>
                  <td class="talks">{state.timedOut ? '■ timed out' : never ? '○ never' : '● talking'}</td>
                  <td class="number">{never ? '–' : `${number(state.age * 1000, 0)} ms`}</td>
                  <td class="number">{number(state.rate, 1)}/s</td>
                  {!brief && <td class="number">{number(message.period * 1000, 0)} ms</td>}
                  {brief ? (
                    <td class="number">{state.lost + state.late + state.malformed}</td>
                  ) : (
                    <>
                      <td class="number">{state.lost}</td>
                      <td class="number">{state.late}</td>
                      <td class="number">{state.malformed}</td>
                    </>
                  )}
                </tr>
              );
            })}
          </tbody>
        </table>
      </Scroll>
      {facts.length === 0 && <p class="quiet">This bench exchanges no messages.</p>}
      {brief && <TimingFacts />}
    </section>
  );
}

/** Does the run count: lateness and step time against their budgets. */
export function Timing() {
  const timing = status.value?.timing;
  if (timing === undefined) return null;
  return (
    <section class="panel" aria-labelledby="timing-title">
      <header>
        <h2 id="timing-title">Timing</h2>
      </header>
      <div class="pair">
        <Bars name="Lateness of a tick" histogram={timing.lateness} />
        <Bars name="Time of a step" histogram={timing.stepTime} />
      </div>
      <TimingFacts />
    </section>
  );
}

function TimingFacts() {
  const timing = status.value?.timing;
  if (timing === undefined) return null;
  return (
    <dl class="facts">
      <div>
        <dt>Latest tick</dt>
        <dd class="number">{microseconds(timing.lateness.most)}</dd>
      </div>
      <div>
        <dt>Overruns</dt>
        <dd class="number">{timing.overruns}</dd>
      </div>
      <div>
        <dt>Collections</dt>
        <dd class="number">{Number.isFinite(timing.collections) ? timing.collections : 'counted at the end'}</dd>
      </div>
      <div>
        <dt>Drift</dt>
        <dd class="number">{number(timing.drift * 1000, 1)} ms</dd>
      </div>
      <div>
        <dt>Rows dropped</dt>
        <dd class="number">{status.value?.run.droppedRows ?? 0}</dd>
      </div>
    </dl>
  );
}

/** Counts on a logarithmic scale: the rare late ones are what matters. */
function Bars({ name, histogram }: { name: string; histogram: Histogram }) {
  const most = Math.max(10, ...histogram.counts);
  const share = (count: number) => (count <= 0 ? 0 : 0.04 + (0.96 * Math.log10(count)) / Math.log10(most));
  const label = (i: number) =>
    i < histogram.edges.length
      ? `≤ ${microseconds(histogram.edges[i])}`
      : `> ${microseconds(histogram.edges[histogram.edges.length - 1] ?? 0)}`;
  const over = histogram.budget > 0 && histogram.most > histogram.budget;
  return (
    <figure class="bars">
      <figcaption>
        {name}: at most <strong class="number">{microseconds(histogram.most)}</strong>
        {histogram.budget > 0 && (
          <>
            , budget {microseconds(histogram.budget)} {over ? <strong>■ over budget</strong> : '● kept'}
          </>
        )}
      </figcaption>
      <table>
        <caption class="hidden">{name}: ticks in each range</caption>
        <tbody>
          {histogram.counts.map((count, i) => (
            <tr key={label(i)}>
              <th scope="row" class="number">
                {label(i)}
              </th>
              <td class="bar">
                <div
                  class={histogram.budget > 0 && (histogram.edges[i - 1] ?? 0) >= histogram.budget ? 'over' : ''}
                  style={{ width: `${(share(count) * 100).toFixed(1)}%` }}
                />
              </td>
              <td class="number">{count.toLocaleString('en')}</td>
            </tr>
          ))}
        </tbody>
      </table>
    </figure>
  );
}
