import { signal } from '@preact/signals';
import { connected, stale, subject } from '../store/connection.js';
import { usePaths } from '../store/values.js';
import { Banner, Caution, Stale, TopBar } from './banner.js';
import { Charts } from './charts.js';
import { Circuit } from './circuit.js';
import { Messages, Timing } from './controller.js';
import { Energy } from './energy.js';
import { Events, Requirements, Warnings } from './evidence.js';
import { GasPaths } from './gas-path.js';
import { Hands } from './hands.js';
import { Pressures } from './pressures.js';
import { Moment, Recordings } from './recordings.js';

const views = [
  ['overview', 'Overview'],
  ['charts', 'Charts'],
  ['circuit', 'Circuit'],
  ['energy', 'Gas and energy'],
  ['controller', 'Controller'],
  ['record', 'Record'],
  ['hands', 'Hands'],
  ['recordings', 'Recordings'],
] as const;
type ViewName = (typeof views)[number][0];

const here = signal<ViewName>(named());
function named(): ViewName {
  const wanted = location.hash.replace(/^#\/?/, '');
  return views.find(([name]) => name === wanted)?.[0] ?? 'overview';
}
window.addEventListener('hashchange', () => {
  here.value = named();
});

const wide = window.matchMedia('(min-width: 1900px)');
const isWide = signal(wide.matches);
wide.addEventListener('change', () => (isWide.value = wide.matches));

export function App() {
  // peaks and predictions go on whatever is shown
  usePaths((subject.value?.bench.pressures ?? []).flatMap((pressure) => [pressure.path, pressure.timeToRelief]));
  if (subject.value === undefined) {
    return (
      <main class="waiting">
        <h1>oilspring</h1>
        <p role="status">{connected.value ? 'The bench answers…' : 'Looking for the bench…'}</p>
      </main>
    );
  }
  return (
    <>
      <button type="button" class="skip" onClick={() => document.getElementById('content')?.focus()}>
        To the content
      </button>
      <TopBar />
      <Stale />
      <Banner />
      <Moment />
      <nav aria-label="Views">
        {views.map(([name, text]) => (
          <a key={name} href={`#/${name}`} aria-current={here.value === name ? 'page' : undefined}>
            {text}
          </a>
        ))}
      </nav>
      <main id="content" tabIndex={-1} class={`view ${here.value} ${stale.value === undefined ? '' : 'stale'}`}>
        <View name={here.value} />
      </main>
      <Caution />
    </>
  );
}

function View({ name }: { name: ViewName }) {
  switch (name) {
    case 'overview':
      return isWide.value ? (
        <>
          <div class="stack">
            <Pressures />
            <Warnings />
            <Requirements />
          </div>
          <div class="stack">
            <Charts most={4} />
            <GasPaths />
          </div>
          <div class="stack">
            <Circuit share={0.54} />
            <div class="stack two">
              <Energy />
              <Messages brief />
            </div>
            <Events most={40} />
          </div>
        </>
      ) : (
        <>
          <div class="stack">
            <Pressures />
            <Warnings />
            <Requirements />
          </div>
          <div class="stack">
            <Charts most={4} />
            <Events most={40} />
          </div>
          <div class="across">
            <Circuit />
          </div>
        </>
      );
    case 'charts':
      return <Charts />;
    case 'circuit':
      return <Circuit />;
    case 'energy':
      return (
        <>
          <GasPaths />
          <Energy />
        </>
      );
    case 'controller':
      return (
        <>
          <Messages />
          <Timing />
        </>
      );
    case 'record':
      return (
        <>
          <div class="stack">
            <Warnings />
            <Requirements />
          </div>
          <Events />
        </>
      );
    case 'hands':
      return <Hands />;
    case 'recordings':
      return <Recordings />;
  }
}
