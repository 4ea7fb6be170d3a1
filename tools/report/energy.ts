import type { ReportedEnergy } from './data.js';
import { energyText, escaped } from './text.js';

interface Share {
  readonly name: string;
  readonly energy: number;
  readonly kind: 'supplied' | 'taken' | 'fromStore' | 'toStore' | 'lost';
}

const width = 764;
const trunk = 80;
const gapBetween = 7;
const tall = 230;
const words = {
  supplied: 'from outside',
  taken: 'to outside',
  fromStore: 'from store',
  toStore: 'into store',
  lost: 'lost as heat',
} as const;

/** Both sides of the balance, largest first: what came in (from outside, out of stores) and what it became. */
export function energySides(energy: ReportedEnergy): { readonly left: Share[]; readonly right: Share[] } {
  const left: Share[] = [];
  const right: Share[] = [];
  const add = (side: Share[], name: string, amount: number, kind: Share['kind']) => {
    if (amount > 0) side.push({ name, energy: amount, kind });
  };
  for (const { element, supplied, stored, lost } of energy.parts) {
    add(left, element, supplied, 'supplied');
    add(left, element, -stored, 'fromStore');
    add(right, element, -supplied, 'taken');
    add(right, element, stored, 'toStore');
    add(right, element, lost, 'lost');
  }
  const bySize = (a: Share, b: Share) => b.energy - a.energy;
  return { left: gathered(left.sort(bySize)), right: gathered(right.sort(bySize)) };
}

/** The small ones as one, by kind. */
function gathered(shares: Share[]): Share[] {
  const total = shares.reduce((sum, share) => sum + share.energy, 0);
  const large = shares.filter((share, i) => i < 9 && share.energy >= total * 0.004);
  const small = shares.filter((share) => !large.includes(share));
  for (const kind of new Set(small.map((share) => share.kind))) {
    const same = small.filter((share) => share.kind === kind);
    const name = same.length === 1 ? same[0]!.name : `${same.length} smaller`;
    large.push({ name, energy: same.reduce((sum, share) => sum + share.energy, 0), kind });
  }
  return large;
}

/** Streams from the left into a trunk and out of it to the right, as wide as their energy. */
export function energySvg(energy: ReportedEnergy): string {
  const { left, right } = energySides(energy);
  const sum = (side: Share[]) => side.reduce((total, share) => total + share.energy, 0);
  const most = Math.max(sum(left), sum(right));
  if (!(most > 0) || !Number.isFinite(most)) return '<p>No energy was turned over.</p>';
  const scale = tall / most;
  const height = Math.max(columnHeight(left, scale), columnHeight(right, scale), tall) + 44;
  const middle = 30 + (height - 44 - tall) / 2;
  const parts = [
    `<rect class="trunk" x="${width / 2 - trunk / 2}" y="${middle.toFixed(1)}" width="${trunk}" height="${tall}"/>`,
    `<text class="trunkText" x="${width / 2}" y="${(middle + tall / 2).toFixed(1)}" text-anchor="middle">${energyText(most)}</text>`,
    `<text class="trunkText small" x="${width / 2}" y="${(middle + tall / 2 + 14).toFixed(1)}" text-anchor="middle">turned over</text>`,
    '<text class="side" x="4" y="14">Came from</text>',
    `<text class="side" x="${width - 4}" y="14" text-anchor="end">Went to</text>`,
  ];
  for (const [side, sign] of [
    [left, -1],
    [right, 1],
  ] as const) {
    let inside = middle;
    let outside = 30 + (height - 44 - columnHeight(side, scale)) / 2;
    for (const share of side) {
      const thick = Math.max(share.energy * scale, 0.8);
      const edge = width / 2 + (sign * trunk) / 2;
      const end = width / 2 + sign * 172;
      const bend = (edge + end) / 2;
      const slot = Math.max(thick, 13);
      const out = outside + (slot - thick) / 2;
      const p = (n: number) => n.toFixed(1);
      parts.push(
        `<path class="stream ${share.kind}" d="M${edge} ${p(inside)}C${bend} ${p(inside)} ${bend} ${p(out)} ${end} ${p(out)}v${p(thick)}C${bend} ${p(out + thick)} ${bend} ${p(inside + thick)} ${edge} ${p(inside + thick)}z"><title>${escaped(share.name)}: ${energyText(share.energy)} ${words[share.kind]}</title></path>`,
      );
      const anchor = sign < 0 ? 'end' : 'start';
      const label = share.name.length > 15 ? `${share.name.slice(0, 14)}…` : share.name;
      parts.push(
        `<text class="share" x="${end + sign * 6}" y="${p(outside + slot / 2 + 3.5)}" text-anchor="${anchor}">${escaped(label)} <tspan class="quiet">${words[share.kind]} ${energyText(share.energy)}</tspan></text>`,
      );
      inside += thick;
      outside += slot + gapBetween;
    }
  }
  return `<svg class="energy" viewBox="0 0 ${width} ${height.toFixed(0)}" role="img" aria-label="Energy balance of the run">${parts.join('')}</svg>`;
}

function columnHeight(side: readonly Share[], scale: number): number {
  return (
    side.reduce((sum, share) => sum + Math.max(share.energy * scale, 13), 0) + gapBetween * Math.max(0, side.length - 1)
  );
}
