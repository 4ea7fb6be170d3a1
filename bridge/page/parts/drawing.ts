/**
 * Draws all charts together, at most once per picture of the screen, and leaves at least as much time free as drawing
 * takes: on a slow computer charts move less often, and buttons still answer.
 */
const waiting = new Set<() => void>();
let scheduled = false;
let freeAt = 0;

export function drawSoon(draw: () => void): void {
  waiting.add(draw);
  if (scheduled) return;
  scheduled = true;
  const pause = freeAt - performance.now();
  if (pause > 4) setTimeout(() => requestAnimationFrame(drawAll), pause);
  else requestAnimationFrame(drawAll);
}

export function forgetDrawing(draw: () => void): void {
  waiting.delete(draw);
}

function drawAll(): void {
  scheduled = false;
  const began = performance.now();
  const all = [...waiting];
  waiting.clear();
  for (const draw of all) draw();
  const ended = performance.now();
  freeAt = ended + Math.min(500, 2 * (ended - began));
}
