import { signal } from '@preact/signals';

const now = () => ({
  width: window.innerWidth,
  height: window.innerHeight,
  /** Size of the type, which grows with the screen [px]. */
  rem: Number.parseFloat(getComputedStyle(document.documentElement).fontSize) || 15,
});

/** Width and height of what is seen of the page, and the size of its type. */
export const viewport = signal(now());

window.addEventListener('resize', () => {
  const next = now();
  const { width, height, rem } = viewport.value;
  if (next.width !== width || next.height !== height || next.rem !== rem) viewport.value = next;
});
