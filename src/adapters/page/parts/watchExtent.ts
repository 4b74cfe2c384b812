/**
 * Looks at what scrolls now, when it or what is in it changes its size, and when it is scrolled.
 * @returns ends that
 */
export function watchExtent(element: Element, look: () => void): () => void {
  const watch = new ResizeObserver(look);
  for (const one of [element, ...element.children]) watch.observe(one);
  element.addEventListener('scroll', look, { passive: true });
  look();
  return () => {
    watch.disconnect();
    element.removeEventListener('scroll', look);
  };
}
