/** A small drawing for an element's kind, after the symbols in common use for fluid power; unknown kinds get a plain one. */
const drawings: readonly [RegExp, preact.JSX.Element][] = [
  [/accumulator/, <path d="M6 12a6 6 0 0 1 12 0v0a6 6 0 0 1-12 0ZM6 12h12M12 3.5v3" />],
  [/relief/, <path d="M5 5h14v14H5zM12 1.5v21M9 16l3 4 3-4M19 9l3-2M19 13l3-2" />],
  [/check/, <path d="M3 12h5M16 6l-8 6 8 6M19 12h3M16 9a3 3 0 1 0 0 6 3 3 0 0 0 0-6" />],
  [/pump|motor/, <path d="M12 3a9 9 0 1 0 0 18 9 9 0 0 0 0-18ZM12 3l-3.5 5h7ZM12 21l-3.5-5h7Z" />],
  [/valve/, <path d="M3 6v12l18-12v12ZM12 12V4M9 4h6" />],
  [/orifice|throttle|leak|line-resistance|pipe/, <path d="M2 12h20M5 5c4 4 10 4 14 0M5 19c4-4 10-4 14 0" />],
  [/clutch|synchron/, <path d="M2 12h7M9 4v16M13 4v16M13 12h9" />],
  [
    /gear|planet|ratio|cvt/,
    <path d="M12 6a6 6 0 1 0 0 12 6 6 0 0 0 0-12ZM12 2v4M12 18v4M2 12h4M18 12h4M5 5l3 3M16 16l3 3M19 5l-3 3M8 16l-3 3" />,
  ],
  [
    /vehicle|body/,
    <path d="M2 16V8h12v8M14 11h5l3 3v2H2M6.5 14.5a2 2 0 1 0 0 4 2 2 0 0 0 0-4M17.5 14.5a2 2 0 1 0 0 4 2 2 0 0 0 0-4" />,
  ],
  [/wheel|tyre|road/, <path d="M12 3a9 9 0 1 0 0 18 9 9 0 0 0 0-18ZM12 8a4 4 0 1 0 0 8 4 4 0 0 0 0-8" />],
  [/inertia|shaft|flywheel/, <path d="M2 12h5M7 4h10v16H7zM17 12h5" />],
  [/engine|cylinder/, <path d="M6 3v12h12V3M6 8h12M12 15v4M9 22l3-3 3 3" />],
  [/brake/, <path d="M12 5a7 7 0 1 0 0 14 7 7 0 0 0 0-14ZM5 3a12 12 0 0 0 0 18" />],
  [/heat|wall|cooler|thermal/, <path d="M8 21c-4-4 4-6 0-10s2-6 1-8M15 21c-4-4 4-6 0-10s2-6 1-8" />],
  [/reservoir|tank/, <path d="M4 6v14h16V6M4 11h16" />],
  [/volume|line/, <path d="M4 8h16v8H4zM1 12h3M20 12h3" />],
];
const plain = <path d="M5 5h14v14H5z" />;

export function Glyph({ kind }: { kind: string }) {
  return <g class="glyph">{drawings.find(([pattern]) => pattern.test(kind))?.[1] ?? plain}</g>;
}
