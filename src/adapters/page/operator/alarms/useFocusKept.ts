import type { RefObject } from 'preact';
import { useLayoutEffect, useRef } from 'preact/hooks';

interface Place {
  readonly id: string;
  readonly action: string | null;
  readonly index: number;
}

const ITEM = '[data-id]';

/**
 * Whoever goes through a list with the keyboard stays where he was when it changes under him: on the
 * same button, else on the same item, else on the one that came into its place.
 */
export function useFocusKept(list: RefObject<HTMLElement | null>): void {
  const place = useRef<Place | null>(null);
  useLayoutEffect(() => {
    const element = list.current;
    if (element === null) return;
    const note = (event: FocusEvent) => {
      const target = event.target as HTMLElement;
      const item = target.closest<HTMLElement>(ITEM);
      const id = item?.dataset.id;
      place.current =
        item === null || id === undefined
          ? null
          : { id, action: target.dataset.action ?? null, index: itemsOf(element).indexOf(item) };
    };
    // A focus that goes away together with its element gives no such event: that is what is mended.
    const leave = (event: FocusEvent) => {
      const inside = (event.target as HTMLElement).isConnected;
      if (inside && event.relatedTarget !== null) place.current = null;
    };
    element.addEventListener('focusin', note);
    element.addEventListener('focusout', leave);
    return () => {
      element.removeEventListener('focusin', note);
      element.removeEventListener('focusout', leave);
    };
  }, [list]);
  useLayoutEffect(() => {
    const element = list.current;
    const active = document.activeElement;
    if (element === null || place.current === null) return;
    if (active !== null && active !== document.body) return;
    const items = itemsOf(element);
    const { id, action, index } = place.current;
    const same = items.find((one) => one.dataset.id === id);
    const item = same ?? items[Math.min(index, items.length - 1)];
    const button = action === null ? null : same?.querySelector(`[data-action="${action}"]`);
    const target = button ?? item ?? element;
    (target as HTMLElement).focus({ preventScroll: true });
  });
}

const itemsOf = (list: HTMLElement) => [...list.querySelectorAll<HTMLElement>(ITEM)];
