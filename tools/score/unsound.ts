import { type Figure, figure, type Goal } from './figure.js';
import type { RowResult } from './tally.js';

const NONE: Goal = { most: 0, each: true };

/** Scans after which the state was not what a state must be, of some runs together. */
export function unsoundFigures(results: readonly RowResult[]): Figure[] {
  const sum = (of: (r: RowResult) => number) => results.reduce((total, r) => total + of(r), 0);
  const scans = `of ${sum((r) => r.unsound.scans)} scans`;
  return [
    figure(
      'scans with NaN in a state',
      sum((r) => r.unsound.not_finite),
      '',
      NONE,
      scans,
    ),
    figure(
      'covariances not symmetric to the bit',
      sum((r) => r.unsound.not_symmetric),
      '',
      NONE,
      scans,
    ),
    figure(
      'covariances with a negative variance',
      sum((r) => r.unsound.negative),
      '',
      NONE,
      scans,
    ),
    figure(
      'covariances with a negative eigenvalue',
      sum((r) => r.unsound.indefinite),
      '',
      NONE,
      `of ${sum((r) => r.unsound.factorised)} scans looked at, worst ${worstOf(results)}`,
    ),
  ];
}

function worstOf(results: readonly RowResult[]): string {
  const least = Math.min(0, ...results.map((r) => r.unsound.least));
  return least === 0 ? 'within rounding' : `${least.toExponential(1)} as correlation`;
}
