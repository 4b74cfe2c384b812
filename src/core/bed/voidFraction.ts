/**
 * Mean void fraction of spheres poured into a tube, eps = 0.375 + 0.17 d/D + 0.39 (d/D)^2:
 * the wall keeps the pieces apart.
 *
 * @param ratio d/D of particle to tube diameter, 0 to 0.5
 * @throws RangeError outside that range
 * Source: Dixon 1988, cited from memory. Crushed rock packs between 0.35 and 0.45: measure it.
 */
export function voidFractionOfSpheres(ratio: number): number {
  if (!(ratio >= 0 && ratio <= 0.5)) {
    throw new RangeError(`ratio must lie between 0 and 0.5, got ${ratio}`);
  }
  return 0.375 + 0.17 * ratio + 0.39 * ratio * ratio;
}
