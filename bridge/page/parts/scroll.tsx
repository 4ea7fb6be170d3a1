import type { ComponentChildren, Ref } from 'preact';

/** A part of the page that scrolls within itself; a keyboard can reach and scroll it. */
export function Scroll({
  label,
  tall = false,
  children,
  place,
}: {
  label: string;
  tall?: boolean;
  children: ComponentChildren;
  place?: Ref<HTMLElement>;
}) {
  return (
    <section
      class={tall ? 'scroll tall' : 'scroll'}
      aria-label={label}
      // biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls must be reachable by keyboard
      tabIndex={0}
      {...(place === undefined ? {} : { ref: place })}
    >
      {children}
    </section>
  );
}
