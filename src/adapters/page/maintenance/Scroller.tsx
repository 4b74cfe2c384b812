import type { ComponentChildren } from 'preact';
import { Wide } from '../parts/Wide.js';

/** A table or picture that may be wider than its place. */
export function Scroller({ label, children }: { label: string; children: ComponentChildren }) {
  return (
    <Wide label={label} name="rock-scroll">
      {children}
    </Wide>
  );
}
