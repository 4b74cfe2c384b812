import type { ComponentChildren } from 'preact';

/** What may be wider than its place and then scrolls in itself, by the keyboard too. */
export function Scroller({ label, children }: { label: string; children: ComponentChildren }) {
  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls has to take the keyboard
    <section class="rock-scroll" aria-label={label} tabIndex={0}>
      {children}
    </section>
  );
}
