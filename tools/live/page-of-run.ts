import path from 'node:path';
import { BuildError } from '../../runtime/contract.js';
import type { RunHooks } from '../run/host-run.js';
import type { RunPlan } from '../run/plan.js';
import { LivePage, type PageWish, pageIsBuilt, readPageWish } from './live-page.js';
import { recordingShelf } from './recording-shelf.js';
import { RunSource } from './run-source.js';

/**
 * The page's place, taken before anything is built. `true`: at the usual place, without hands. A run matters more than
 * its page: what nobody asked for in so many words is said on standard error and left out. Throws BuildError otherwise.
 */
export async function placeOfPage(plan: RunPlan, said: PageWish | boolean | undefined): Promise<LivePage | undefined> {
  if (said === undefined || said === false) return undefined;
  const wish = said === true ? readPageWish(true, false)! : said;
  if (wish.control && plan.wish.pace === 'fast')
    throw new BuildError([
      { path: '--control', what: 'no hand keeps up with fast pace', value: 'fast', remedy: 'use --pace live' },
    ]);
  try {
    return await LivePage.reserve(wish);
  } catch (error) {
    if (wish.control || (said !== true && pageIsBuilt())) throw error;
    process.stderr.write(`no live page: ${(error as Error).message}\n`);
    return undefined;
  }
}

/** Serves the page from the moment the bench is built, with the recordings beside that of the run for looking back. */
export function pageHooks(
  page: LivePage,
  plan: RunPlan,
  remark: (text: string) => void,
): Required<Pick<RunHooks, 'control' | 'onReady' | 'onRows' | 'onEvent'>> {
  let source: RunSource | undefined;
  return {
    control: page.control,
    onReady(run) {
      if (run.ready === undefined) return;
      source = new RunSource(run, run.ready);
      const folder = plan.recording === undefined ? 'recordings' : path.dirname(plan.recording);
      page
        .serve(source, recordingShelf(folder, { writing: plan.recording }))
        .catch((error: Error) => remark(`the live page could not be served: ${error.message}`));
    },
    onRows: (_run, ticks, values, count) => source?.rows(ticks, values, count),
    onEvent: (_run, event) => source?.event(event),
  };
}
