/** A made-up string and seeded noise for the tests of the front view; erf by its own series. */

/** Uniform numbers in (0, 1) from a linear congruential generator (Numerical Recipes). */
export function uniforms(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return (state + 0.5) / 4294967296;
  };
}

/** Standard normal numbers (Box & Muller 1958). */
export function normals(seed: number): () => number {
  const next = uniforms(seed);
  return () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
}

/** erf by its Maclaurin series to |z| < 4, beyond 1 to 2e-8: independent of src. */
export function erf(z: number): number {
  if (Math.abs(z) > 4) return Math.sign(z);
  let term = z;
  let sum = z;
  for (let n = 1; n < 120; n++) {
    term *= (-z * z) / n;
    sum += term / (2 * n + 1);
  }
  return (2 / Math.sqrt(Math.PI)) * sum;
}

export const HOT = 773.15;
export const COLD = 298.15;
export const LENGTH = 5;

export interface ErfFront {
  readonly p: number;
  readonly w: number;
  /** Plateaus at the charge inlet and at the other end [K]. */
  readonly A: number;
  readonly B: number;
}

export function temperatureOf({ p, w, A, B }: ErfFront, x: number): number {
  return A + (B - A) * 0.5 * (1 + erf((x - p) / (w * Math.SQRT2)));
}

/** Where the front passes theta of HOT and COLD, by bisection. */
export function crossingOf(front: ErfFront, theta: number): number {
  let low = -20;
  let high = 25;
  const falls = front.A > front.B;
  for (let i = 0; i < 80; i++) {
    const middle = 0.5 * (low + high);
    if (temperatureOf(front, middle) > COLD + theta * (HOT - COLD) === falls) low = middle;
    else high = middle;
  }
  return low;
}

export function halfCrossing(front: ErfFront): number {
  return crossingOf(front, 0.5);
}

/** Half the distance between the 16 % and 84 % crossings; 0.99446 w where the plateaus are HOT and COLD. */
export function widthOf(front: ErfFront): number {
  return 0.5 * Math.abs(crossingOf(front, 0.16) - crossingOf(front, 0.84));
}

/** Places of n thermocouples, evenly over the length. */
export function places(n: number): number[] {
  return Array.from({ length: n }, (_, i) => ((i + 0.5) * LENGTH) / n);
}
