import type { ComponentChildren } from 'preact';
import { Wide } from '../parts/Wide.js';

/** A table that may be wider than a phone. */
export function Scrolled({ label, children }: { label: string; children: ComponentChildren }) {
  return (
    <Wide label={label} name="scrolled">
      {children}
    </Wide>
  );
}
