import type { RefObject } from 'preact';
import { useEffect, useState } from 'preact/hooks';
import { watchExtent } from '../../parts/watchExtent.js';

/** What is cut off by less is seen [px]. */
const EDGE_PX = 6;

/**
 * Says of a list that scrolls in itself how many stand below what is seen, or that the last one seen goes
 * on there, and goes there.
 */
export function EventsBelow({ list }: { list: RefObject<HTMLElement | null> }) {
  const [below, setBelow] = useState(0);
  const [cut, setCut] = useState(false);
  // After every drawing: the list's items come and go, and each may be opened.
  useEffect(() => {
    const element = list.current;
    if (element === null) return;
    const look = () => {
      const edge = element.getBoundingClientRect().bottom;
      const boxes = [...element.children].map((item) => item.getBoundingClientRect());
      setBelow(boxes.filter(({ top }) => top > edge - EDGE_PX).length);
      setCut(boxes.some(({ bottom }) => bottom > edge + EDGE_PX));
    };
    return watchExtent(element, look);
  });
  if (!cut) return null;
  return (
    <button
      type="button"
      class="events-below"
      onClick={() => list.current?.scrollBy({ top: 0.8 * list.current.clientHeight })}
    >
      {below === 0 ? '▼ goes on below' : `▼ ${below} more below`}
    </button>
  );
}
