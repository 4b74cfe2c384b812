/** A share of cases that come in groups (the seeds), as hits and cases of each group. */
export interface Share {
  readonly hits: number;
  readonly cases: number;
}

const TWO_SIDED_95 = 1.959963984540054;

/**
 * Interval in which a share with a given true value lies in 95 of 100 repetitions.
 *
 * Cases of one seed are alike, so n cases count as n over the design effect, the variance between
 * seeds over that of independent draws (Kish 1965), at least 1:
 * p +/- 1.96 sqrt(p (1-p) deff/n). Where all cases or none are hits it cannot be had, and each seed
 * counts as one.
 */
export function binomialInterval(
  p: number,
  groups: readonly Share[],
): { low: number; high: number; share: number; cases: number; effective: number } {
  const cases = groups.reduce((sum, g) => sum + g.cases, 0);
  const share = groups.reduce((sum, g) => sum + g.hits, 0) / cases;
  const counted = groups.filter((g) => g.cases > 0);
  const m = counted.length;
  const between =
    m > 1
      ? (counted.reduce((sum, g) => sum + (g.hits - g.cases * share) ** 2, 0) * m) / (m - 1)
      : 0;
  const single = cases * share * (1 - share);
  const effect = single > 0 ? Math.max(1, between / single) : Math.max(1, cases / m);
  const effective = cases / effect;
  const half = TWO_SIDED_95 * Math.sqrt((p * (1 - p)) / effective);
  return { low: Math.max(0, p - half), high: Math.min(1, p + half), share, cases, effective };
}

/** Mean pinball loss of a quantile: tau (y-q) above it, (1-tau) (q-y) below. */
export function pinball(
  tau: number,
  samples: readonly { readonly truth: number; readonly quantile: number }[],
): number {
  const loss = samples.reduce((sum, { truth, quantile }) => {
    const over = truth - quantile;
    return sum + Math.max(tau * over, (tau - 1) * over);
  }, 0);
  return loss / samples.length;
}

/**
 * The least mean pinball loss that forecasts reach with one constant added to all of them, none
 * below zero. The best constant is near the tau-quantile of the errors; all errors are tried.
 */
export function bestShiftedPinball(
  tau: number,
  samples: readonly { readonly truth: number; readonly forecast: number }[],
): { loss: number; shift: number } {
  let best = { loss: Number.POSITIVE_INFINITY, shift: 0 };
  for (const { truth, forecast } of samples) {
    const shift = truth - forecast;
    const loss = pinball(
      tau,
      samples.map((s) => ({ truth: s.truth, quantile: Math.max(0, s.forecast + shift) })),
    );
    if (loss < best.loss) best = { loss, shift };
  }
  return best;
}
