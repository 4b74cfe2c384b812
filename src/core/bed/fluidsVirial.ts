export interface CriticalPoint {
  readonly temperature_K: number;
  readonly pressure_Pa: number;
  /** Acentric factor [-]. */
  readonly acentric: number;
}

/** Second virial coefficient B(T) of Z = 1 + B p/(R T), per kilogram, with its derivatives. */
export interface SecondVirial {
  /** B [m3/kg]. */
  value(temperature_K: number): number;
  /** dB/dT [m3/kgK]. */
  slope(temperature_K: number): number;
  /** d2B/dT2 [m3/kgK2]. */
  curvature(temperature_K: number): number;
}

/**
 * Second virial coefficient by corresponding states:
 *
 *   B pc/(R Tc) = 0.083 - 0.422/Tr^1.6 + w (0.139 - 0.172/Tr^4.2),   Tr = T/Tc
 *
 * @param gasConstant_J_kgK R/M
 * Source: Pitzer's form with the coefficients of Abbott (Smith & Van Ness), cited from memory and
 * checked against densities and heat capacities of CoolProp in the tests.
 */
export function secondVirial(gasConstant_J_kgK: number, critical: CriticalPoint): SecondVirial {
  const { temperature_K: Tc, pressure_Pa: pc, acentric: w } = critical;
  const scale = (gasConstant_J_kgK * Tc) / pc;
  return {
    value(temperature_K) {
      const Tr = temperature_K / Tc;
      return scale * (0.083 - 0.422 * Tr ** -1.6 + w * (0.139 - 0.172 * Tr ** -4.2));
    },
    slope(temperature_K) {
      const Tr = temperature_K / Tc;
      return (scale / Tc) * (0.422 * 1.6 * Tr ** -2.6 + w * 0.172 * 4.2 * Tr ** -5.2);
    },
    curvature(temperature_K) {
      const Tr = temperature_K / Tc;
      return (
        (-scale / (Tc * Tc)) * (0.422 * 1.6 * 2.6 * Tr ** -3.6 + w * 0.172 * 4.2 * 5.2 * Tr ** -6.2)
      );
    },
  };
}
