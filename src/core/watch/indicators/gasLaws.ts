import type { Mode } from '../../definitions.js';
import { type BaselineState, startBaseline } from '../baseline.js';
import type { Healthy } from '../follow.js';
import { healthyBy } from './sides.js';

/** When the healthy value of a law in a mode is kept, in ln. */
export const RULE = { floor: 0.002, enough: 0.003, least: 3 };

const MODES = ['charge', 'stand', 'discharge'] as const;
/** `held`: pressures are kept, gas goes to and from a buffer. `closed`: the loop keeps its gas. */
export const LAWS = ['held', 'closed'] as const;
export type Law = (typeof LAWS)[number];

/** Healthy value of one law in one mode, and the scatter about it. */
export interface Learned {
  readonly healthy: BaselineState;
  /** Sums of values less the first, and of their squares. */
  first: number;
  sum: number;
  squares: number;
}

/** What is learned of either law in each mode. */
export type GasLaws = Record<Law, Record<Mode, Learned>>;

/** What is learned of a law, by mode. */
export const byMode = (begun_ms: number | null = null): Record<Mode, Learned> => ({
  charge: startLearned(begun_ms),
  stand: startLearned(begun_ms),
  discharge: startLearned(begun_ms),
});

function startLearned(begun_ms: number | null): Learned {
  return { healthy: { ...startBaseline(), begun_ms }, first: 0, sum: 0, squares: 0 };
}

/** All that is learned, of either law in every mode. */
export const baselinesOf = (laws: GasLaws): BaselineState[] =>
  LAWS.flatMap((law) => MODES.map((mode) => laws[law][mode].healthy));

/** The law with the less scatter about its own means; `held` until three values of a mode are known. */
export function lawOf(laws: GasLaws): Law {
  const scatter = (law: Law): number => {
    let sum = 0;
    for (const mode of MODES) {
      const { healthy, sum: s, squares } = laws[law][mode];
      if (healthy.count >= 3) sum += squares - (s * s) / healthy.count;
    }
    return sum;
  };
  return scatter('closed') < scatter('held') ? 'closed' : 'held';
}

/**
 * Healthy ln of a law in a mode. Pressures above what the configuration allows are no norm, and neither is
 * that bound, as it is not on the safe side: put right, they would count as lost. The configured ones stay.
 */
export function healthyOf({ healthy }: Learned, configured: Healthy): Healthy {
  const known = healthyBy(healthy, { configured, baseline: RULE });
  return known.sigma === 0 && known.value > configured.value ? configured : known;
}
