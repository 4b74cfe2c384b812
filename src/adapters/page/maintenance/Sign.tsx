import type { Standing } from './standing.js';

/** Standing by shape: a filled diamond, an open triangle, a disc, a dashed ring. */
export function Sign({ standing }: { standing: Standing }) {
  return (
    <svg class="rock-sign" data-standing={standing} viewBox="0 0 16 16" aria-hidden="true">
      {standing === 'changed' && <path d="M8,1 L15,8 L8,15 L1,8 Z" />}
      {standing === 'open' && <path d="M8,2 L15,14 H1 Z" />}
      {standing === 'healthy' && <circle cx="8" cy="8" r="4" />}
      {standing === 'unknown' && <circle cx="8" cy="8" r="5" />}
    </svg>
  );
}
