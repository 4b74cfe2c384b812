import { alongOf, type Standing, standingOf } from './standing.js';
import type { Indicator } from './wire.js';

const WIDTH = 168;
const HEIGHT = 22;
const HEALTHY = 44;
const LIMIT = 124;
const MIDDLE = HEIGHT / 2;
const EDGE = 7;

const at = (along: number) => HEALTHY + along * (LIMIT - HEALTHY);
const inside = (x: number) => Math.min(WIDTH - EDGE, Math.max(EDGE, x));

/**
 * An indicator on the ruler that all share: healthy and limit stand at the same two places, whatever
 * is measured, so that a column of them is read at one look. Whiskers are two sigmas; what lies beyond
 * the ruler ends in an arrow.
 */
export function Ruler({ indicator }: { indicator: Indicator }) {
  const { value, sigma } = indicator;
  const standing = standingOf(indicator);
  const along = value === null ? null : alongOf(indicator, value);
  const half =
    value === null || sigma === null
      ? 0
      : Math.abs((alongOf(indicator, value + 2 * sigma) ?? 0) - (along ?? 0));
  return (
    <svg class="rock-ruler" viewBox={`0 0 ${WIDTH} ${HEIGHT}`} aria-hidden="true">
      <path class="line" d={`M${EDGE},${MIDDLE} H${WIDTH - EDGE}`} />
      <path class="healthy" d={`M${HEALTHY},${MIDDLE - 6} v12`} />
      <path class="limit" d={`M${LIMIT},0 V${HEIGHT} M${LIMIT},0 h5 M${LIMIT},${HEIGHT} h5`} />
      {along !== null && <Whiskers from={at(along - half)} to={at(along + half)} />}
      {along !== null && <Mark x={at(along)} standing={standing} />}
    </svg>
  );
}

function Whiskers({ from, to }: { from: number; to: number }) {
  const [a, b] = [inside(from), inside(to)];
  if (b - a < 2) return null;
  const end = (x: number, beyond: boolean) => (beyond ? '' : `M${x},${MIDDLE - 4} v8 `);
  return (
    <path
      class="whiskers"
      d={`M${a},${MIDDLE} H${b} ${end(a, from < EDGE)}${end(b, to > WIDTH - EDGE)}`}
    />
  );
}

function Mark({ x, standing }: { x: number; standing: Standing }) {
  const within = inside(x);
  if (within !== x) {
    const way = x > within ? 1 : -1;
    const d = `M${within + 6 * way},${MIDDLE} l${-10 * way},-6 v12 Z`;
    return <path class="mark" data-standing={standing} d={d} />;
  }
  if (standing === 'changed') {
    const d = `M${x},${MIDDLE - 7} l6,7 l-6,7 l-6,-7 Z`;
    return <path class="mark" data-standing={standing} d={d} />;
  }
  return <circle class="mark" data-standing={standing} cx={x} cy={MIDDLE} r="4.2" />;
}
