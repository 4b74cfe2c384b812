import { mulberry } from '../../support/random.js';

/** Seeded standard normal numbers (Box and Muller). */
export function normals(seed: number): () => number {
  const random = mulberry(seed);
  return () => Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
}
