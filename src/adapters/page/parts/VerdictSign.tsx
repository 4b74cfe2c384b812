import type { Level } from '../lib/verdict.js';

/** A shape for each level, so that it is known without its colour. */
const SHAPES: Readonly<Record<Level, string>> = {
  well: 'M3,13 L9,19 L21,5',
  known: 'M4,5 H20 V19 H4 Z M4,12 H20',
  care: 'M4,4 H20 V20 H4 Z',
  urgent: 'M12,2 L23,21 H1 Z',
  unknown: 'M5,5 L19,19 M19,5 L5,19',
};

/** A tick where all is well, a square for care, a point for an alarm, a cross where nobody knows. */
export function VerdictSign({ level }: { level: Level }) {
  return (
    <svg class="verdict-sign" viewBox="0 0 24 24" data-level={level} aria-hidden="true">
      <path d={SHAPES[level]} />
    </svg>
  );
}
