/** Seeded random numbers (splitmix32) of the demonstration plant; `clone` goes on with the same numbers. */
export interface Random {
  /** In [0, 1). */
  uniform(): number;
  normal(): number;
  clone(): Random;
}

export function createRandom(seed: number): Random {
  let state = seed >>> 0;
  const uniform = () => {
    state = (state + 0x9e3779b9) >>> 0;
    let z = state;
    z = Math.imul(z ^ (z >>> 16), 0x21f0aaad);
    z = Math.imul(z ^ (z >>> 15), 0x735a2d97);
    return ((z ^ (z >>> 15)) >>> 0) / 4294967296;
  };
  return {
    uniform,
    // Sum of twelve uniforms: mean 6, variance 1, no tails beyond 6 sigma.
    normal() {
      let sum = -6;
      for (let i = 0; i < 12; i++) sum += uniform();
      return sum;
    },
    clone: () => createRandom(state),
  };
}
