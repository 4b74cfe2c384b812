/** Spherical particles cut into shells of equal volume. */
export interface ShellConductances {
  /** Between shell s and s+1, s = 0 the innermost, per particle and unit conductivity [m]. */
  readonly between: Float64Array;
  /** Between the outermost shell and the surface, per particle and unit conductivity [m]. */
  readonly surface: number;
}

/**
 * Conductances between shell means which are exact for the parabolic profile T = Ts - b (R^2 - r^2)
 * of a particle warmed at a constant rate: flux through r is 8 pi k b r^3, the mean of r^2 over a
 * shell is 3/5 (r2^5 - r1^5)/(r2^3 - r1^3). The mean then lags the surface by q R/(5 k) for any
 * number of shells, as for a whole sphere (Jeffreson 1972 [M]), and transients within are resolved.
 */
export function shellConductances(diameter_m: number, shells: number): ShellConductances {
  if (!(shells >= 1)) throw new RangeError(`shells must be at least 1, got ${shells}`);
  const R = diameter_m / 2;
  const edge = (s: number) => R * Math.cbrt(s / shells);
  const meanSquare = (s: number) =>
    (0.6 * (edge(s + 1) ** 5 - edge(s) ** 5)) / (edge(s + 1) ** 3 - edge(s) ** 3);
  const between = new Float64Array(shells - 1);
  for (let s = 0; s < shells - 1; s++) {
    between[s] = (8 * Math.PI * edge(s + 1) ** 3) / (meanSquare(s + 1) - meanSquare(s));
  }
  return { between, surface: (8 * Math.PI * R ** 3) / (R * R - meanSquare(shells - 1)) };
}
