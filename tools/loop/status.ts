import type { Assembly } from '../../configs/assemble.js';
import { type BoardHandle, BoardWriter } from '../../runtime/status-board.js';
import { SLOT } from '../../runtime/watch-tables.js';

/** s between two writings of the board. */
const boardEvery = 0.02;
/** Slots of the block that the host shows, beside those of the warnings. */
const slots = ['scenario.next', 'scenario.held', 'scenario.delay', 'hands.count'];

/** The board of a bench: its warnings, the state of its scenario, its life, the counts of its messages and links. */
export function statusBoard(assembly: Assembly): { writer: BoardWriter; handle: BoardHandle } {
  const { layout, table, watch } = assembly;
  const numbers = new Map(Array.from({ length: layout.length }, (_, i) => [layout.path(i), i]));
  const chosen = slots.map((path) => numbers.get(path)!);
  for (let i = 0; i < SLOT.count * watch.ladders.length; i += 1) chosen.push(watch.warningSlot + i);
  const shown = table.all.flatMap((info, i) => (info.group === 'link' || /^(life|judge)\./.test(info.path) ? [i] : []));
  const every = Math.max(1, Math.round(boardEvery / assembly.spec.step));
  const writer = new BoardWriter(Int32Array.from(chosen), Int32Array.from(shown), every);
  const names = [...chosen.map((slot) => layout.path(slot)), ...shown.map((i) => table.all[i]!.path)];
  return { writer, handle: { memory: writer.memory, names } };
}
