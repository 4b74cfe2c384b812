import { requireNotNegative, requirePositive } from '../misuse.js';

/**
 * Front speed [m/s] for a mass flux: v = G cf (Th - Tc)/(H(Th) - H(Tc)), from the heat that the fluid
 * gives up against what the bed takes; for constant properties G cf/C.
 *
 * @param massFlux_kg_m2s G, signed: + charges [kg/m2s]
 * @param fluidStep_J_kg fluid enthalpy between the references [J/kg]
 * @param bedStep_J_m3 bed enthalpy between the references [J/m3]
 */
export function frontSpeed(
  massFlux_kg_m2s: number,
  fluidStep_J_kg: number,
  bedStep_J_m3: number,
): number {
  return (
    (massFlux_kg_m2s * requirePositive('fluidStep_J_kg', fluidStep_J_kg)) /
    requirePositive('bedStep_J_m3', bedStep_J_m3)
  );
}

/**
 * Expected growth of a front's width squared [m2]: 2 D t with D = (G cf)^2/(hv C) + kax/C, written
 * with the travel s = v t and the gas lag G cf/hv, which is 2 (G cf/hv) s + 2 (kax/C) t. Constant
 * properties: what c_s(T) sharpens or spreads besides is not in it, and the front view allows for
 * as much again (Schumann 1929 at large NTU; variances add).
 *
 * @param travel_m distance that the front went, either sense [m]
 * @param gasLag_m G cf/hv [m], 0 while standing
 * @param conductivity_W_mK effective axial conductivity of the bed [W/mK]
 * @param heatCapacity_J_m3K C [J/m3K]
 * @param dt_s [s]
 */
export function frontSpread(
  travel_m: number,
  gasLag_m: number,
  conductivity_W_mK: number,
  heatCapacity_J_m3K: number,
  dt_s: number,
): number {
  const convective = requireNotNegative('gasLag_m', Math.abs(gasLag_m)) * Math.abs(travel_m);
  const diffusivity =
    requireNotNegative('conductivity_W_mK', conductivity_W_mK) /
    requirePositive('heatCapacity_J_m3K', heatCapacity_J_m3K);
  return 2 * (convective + diffusivity * requireNotNegative('dt_s', dt_s));
}
