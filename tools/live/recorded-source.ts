import type { LiveSource, RecordingShelf } from '../../bridge/live/source.js';

/** What a page is greeted with when no bench runs: the facts of a recording, and no row. Throws when it cannot be read. */
export async function recordedSource(shelf: RecordingShelf, name: string): Promise<LiveSource> {
  const view = await shelf.open(name);
  try {
    const status = await view.statusAt(view.lastTick);
    return {
      bench: view.bench,
      signals: view.signals,
      events: view.events,
      attach: () => () => {},
      status: () => status,
    };
  } finally {
    await view.close();
  }
}
