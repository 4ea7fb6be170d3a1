import Elk, { type ELK, type ElkExtendedEdge, type ElkNode } from 'elkjs/lib/elk-api.js';
import workerUrl from 'elkjs/lib/elk-worker.min.js?url';
import type { ElementFacts } from '../../live/source.js';

export interface Placed {
  readonly element: ElementFacts;
  readonly x: number;
  readonly y: number;
  readonly width: number;
  readonly height: number;
}
export interface Tie {
  readonly key: string;
  readonly branch: ElementFacts;
  readonly kind: string;
  /** Place of the port among the branch's tied ports. */
  readonly order: number;
  /** From the store to the branch for the first port, from the branch to the store for the others. */
  readonly points: readonly (readonly [number, number])[];
}
export interface Layout {
  readonly width: number;
  readonly height: number;
  readonly nodes: readonly Placed[];
  readonly ties: readonly Tie[];
}
export const nodeWidth = 164;

/** Of the two drawings, the one that is larger in a place of this size, px. */
export function fitting(layouts: readonly Layout[], width: number, height: number): Layout | undefined {
  const scale = (layout: Layout) => Math.min(width / layout.width, height / layout.height);
  return layouts.reduce<Layout | undefined>(
    (best, layout) => (best === undefined || scale(layout) > scale(best) * 1.05 ? layout : best),
    undefined,
  );
}

export function nodeHeight(element: ElementFacts): number {
  const lines = Math.min(3, element.shows.length) + (element.position === undefined ? 0 : 1);
  return 42 + lines * 19;
}

let started: ELK | undefined;
/** The layout library works in a thread of its own: the page keeps moving meanwhile. */
function engine(): ELK {
  started ??= new Elk({ workerUrl });
  return started;
}

const known = new WeakMap<readonly ElementFacts[], Map<string, Promise<Layout>>>();
/** The same circuit is laid out once. */
export function laidOut(elements: readonly ElementFacts[], direction: 'RIGHT' | 'DOWN'): Promise<Layout> {
  let both = known.get(elements);
  if (both === undefined) known.set(elements, (both = new Map()));
  let layout = both.get(direction);
  if (layout === undefined) both.set(direction, (layout = layOut(elements, direction)));
  return layout;
}

/** Layered layout with orthogonal lines (Sugiyama, Tagawa and Toda 1981) by the Eclipse Layout Kernel. */
async function layOut(elements: readonly ElementFacts[], direction: 'RIGHT' | 'DOWN'): Promise<Layout> {
  const names = new Set(elements.map((element) => element.name));
  const children: ElkNode[] = elements.map((element) => ({
    id: element.name,
    width: nodeWidth,
    height: nodeHeight(element),
  }));
  const edges: ElkExtendedEdge[] = [];
  const ties = new Map<string, { branch: ElementFacts; kind: string; order: number }>();
  for (const branch of elements) {
    let order = 0;
    for (const port of branch.ports) {
      if (port.store === undefined || !names.has(port.store)) continue;
      const id = `${branch.name}.${port.name}`;
      edges.push(
        order === 0
          ? { id, sources: [port.store], targets: [branch.name] }
          : { id, sources: [branch.name], targets: [port.store] },
      );
      ties.set(id, { branch, kind: port.kind, order });
      order += 1;
    }
  }
  const graph: ElkNode = {
    id: 'circuit',
    layoutOptions: {
      'elk.algorithm': 'layered',
      'elk.direction': direction,
      'elk.edgeRouting': 'ORTHOGONAL',
      'elk.layered.spacing.nodeNodeBetweenLayers': direction === 'RIGHT' ? '40' : '28',
      'elk.spacing.nodeNode': '30',
      'elk.spacing.edgeNode': '22',
      'elk.spacing.edgeEdge': '12',
      'elk.layered.spacing.edgeEdgeBetweenLayers': '10',
      'elk.layered.spacing.edgeNodeBetweenLayers': direction === 'RIGHT' ? '22' : '14',
      'elk.layered.nodePlacement.strategy': 'NETWORK_SIMPLEX',
      'elk.layered.considerModelOrder.strategy': 'NODES_AND_EDGES',
      'elk.padding': '[top=10,left=10,bottom=10,right=10]',
    },
    children,
    edges,
  };
  const laid: ElkNode = await engine().layout(graph);
  const byName = new Map(elements.map((element) => [element.name, element]));
  return {
    width: laid.width ?? 0,
    height: laid.height ?? 0,
    nodes: (laid.children ?? []).map((node) => ({
      element: byName.get(node.id)!,
      x: node.x ?? 0,
      y: node.y ?? 0,
      width: node.width ?? 0,
      height: node.height ?? 0,
    })),
    ties: (laid.edges ?? []).flatMap((edge) => {
      const section = edge.sections?.[0];
      const tie = ties.get(edge.id);
      if (section === undefined || tie === undefined) return [];
      const points = [section.startPoint, ...(section.bendPoints ?? []), section.endPoint].map(
        (point): [number, number] => [point.x, point.y],
      );
      return [{ key: edge.id, ...tie, points }];
    }),
  };
}
