import type { RefObject } from 'preact';
import { useEffect, useState } from 'preact/hooks';

/** What is cut off by less is seen [px]. */
const EDGE_PX = 6;

/** Says how many of a list that scrolls in itself are not wholly seen below, and goes on there. */
export function EventsBelow({ list }: { list: RefObject<HTMLElement | null> }) {
  const [below, setBelow] = useState(0);
  // After every drawing: the list's items come and go, and each may be opened.
  useEffect(() => {
    const element = list.current;
    if (element === null) return;
    const look = () => {
      const edge = element.getBoundingClientRect().bottom + EDGE_PX;
      const items = [...element.children];
      setBelow(items.filter((item) => item.getBoundingClientRect().bottom > edge).length);
    };
    const watch = new ResizeObserver(look);
    for (const one of [element, ...element.children]) watch.observe(one);
    element.addEventListener('scroll', look, { passive: true });
    look();
    return () => {
      watch.disconnect();
      element.removeEventListener('scroll', look);
    };
  });
  if (below === 0) return null;
  return (
    <button
      type="button"
      class="events-below"
      onClick={() => list.current?.scrollBy({ top: 0.8 * list.current.clientHeight })}
    >
      {`▼ ${below} more below`}
    </button>
  );
}
