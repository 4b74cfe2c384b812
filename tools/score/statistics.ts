/** A share of cases that come in groups (the seeds), as hits and cases of each group. */
export interface Share {
  readonly hits: number;
  readonly cases: number;
}

const TWO_SIDED_95 = 1.959963984540054;
/** Student's t, two-sided 95 %, for 1 to 10 degrees of freedom. */
const STUDENT_95 = [12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.365, 2.306, 2.262, 2.228];

/** Two-sided 95 % point of Student's t; beyond the table by its expansion in 1/degrees, to 1e-4. */
export function student95(degrees: number): number {
  const tabled = STUDENT_95[degrees - 1];
  if (tabled !== undefined) return tabled;
  const z = TWO_SIDED_95;
  const first = (z ** 3 + z) / 4;
  const second = (5 * z ** 5 + 16 * z ** 3 + 3 * z) / 96;
  return z + first / degrees + second / degrees ** 2;
}

/**
 * Interval in which a share with a given true value lies in 95 of 100 repetitions.
 *
 * Answers of one seed are alike: hours asked every hour come from one plant with one drawn machine,
 * and one that is too sure is so all day. So the seed is the unit of chance, not the answer: n cases
 * count as n over the design effect, the variance of the hits between seeds over that of independent
 * draws (Kish 1965), at least 1. It lies between 1 (answers as if independent) and the cases of a
 * seed (all alike: a seed counts as one):
 *
 *   p +/- t sqrt(p (1-p) deff/n),   deff = [m/(m-1) sum (hits_g - cases_g share)^2]/[n share (1-share)]
 *
 * The variance is estimated from m seeds, hence t with m - 1 degrees of freedom (2.03 with 35). Where
 * all cases or none are hits the effect cannot be had: each seed then counts as one, and as nothing
 * is estimated the normal point holds.
 *
 * Where half of a seed's answers are alike it holds the truth in 93 (p = 10 %) and 94 (20 %) of 100
 * repetitions with 35 seeds, by simulation; with 12 or fewer in 80 to 92, as groups without a hit
 * hide how alike they are. So few seeds are judged too strictly, not too kindly.
 */
export function binomialInterval(
  p: number,
  groups: readonly Share[],
): { low: number; high: number; share: number; cases: number; effective: number } {
  const cases = groups.reduce((sum, g) => sum + g.cases, 0);
  const share = groups.reduce((sum, g) => sum + g.hits, 0) / cases;
  const counted = groups.filter((g) => g.cases > 0);
  const m = counted.length;
  const single = cases * share * (1 - share);
  const estimated = m > 1 && single > 0;
  const between =
    (counted.reduce((sum, g) => sum + (g.hits - g.cases * share) ** 2, 0) * m) / (m - 1);
  const effect = estimated ? Math.max(1, between / single) : Math.max(1, cases / m);
  const effective = cases / effect;
  const point = estimated ? student95(m - 1) : TWO_SIDED_95;
  const half = point * Math.sqrt((p * (1 - p)) / effective);
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
