import type { ComponentChildren } from 'preact';
import { useLayoutEffect, useRef, useState } from 'preact/hooks';
import { watchExtent } from './watchExtent.js';

/** What is cut off by less is seen [px]. */
const EDGE_PX = 4;

/** What may be wider than its place and then scrolls in itself, by the keyboard too; and says so. */
export function Wide({
  label,
  name,
  children,
}: {
  label: string;
  /** Class of the part that scrolls. */
  name: string;
  children: ComponentChildren;
}) {
  const ref = useRef<HTMLElement>(null);
  const [more, setMore] = useState(false);
  useLayoutEffect(() => {
    const element = ref.current;
    if (element === null) return;
    const look = () => {
      const { scrollWidth, clientWidth, scrollLeft } = element;
      setMore(scrollWidth - clientWidth - scrollLeft > EDGE_PX);
    };
    return watchExtent(element, look);
  });
  return (
    <div class="wide-place">
      {/* Whoever has the page read hears all columns. */}
      <p class="wide-more" aria-hidden="true" hidden={!more}>
        goes on to the right ▶
      </p>
      {/* biome-ignore lint/a11y/noNoninteractiveTabindex: what scrolls has to be reached by keys */}
      <section ref={ref} class={name} tabIndex={0} aria-label={label}>
        {children}
      </section>
    </div>
  );
}
