import { signal } from '@preact/signals';

const now = () => ({
  height: window.innerHeight,
  /** Size of the type, which grows with the screen [px]. */
  rem: Number.parseFloat(getComputedStyle(document.documentElement).fontSize) || 15,
});

/** Height of what is seen of the page, and the size of its type. */
export const viewport = signal(now());

window.addEventListener('resize', () => {
  const next = now();
  const { height, rem } = viewport.value;
  if (next.height !== height || next.rem !== rem) viewport.value = next;
});
