import type { Bed } from './bed.js';

/**
 * Gas through one ring during `dt`; returns its outlet temperature [K].
 *
 * Along the flow, per volume of bed, g (Tin - Tout)/dx = K (Tgas - Tsurface) + storage in the fluid,
 * Tgas = w Tout + (1-w) Tin. With w = 1/2 (box scheme) the scheme spreads a front exactly as the
 * film does, sigma^2 = 2 (v g/K) t; above n = K dx/g = 2, where it would overshoot,
 * w = 1 - 1/n keeps it monotone. In time fluid and shells advance by the trapezoidal rule, cell
 * after cell in the direction of the flow, with c(T) of the start of the step. The linear system
 * of a cell is a chain from the innermost shell to the gas and is solved by elimination.
 *
 * @param flux mass flux of the ring [kg/m2s], positive
 */
export function march(
  bed: Bed,
  ring: number,
  dt: number,
  flux: number,
  inlet_K: number,
  forward: boolean,
): number {
  const { cells, shells: S } = bed.p;
  const { enthalpy, temperature, mean, gas, surface, scratch, c } = bed;
  const filmA = c.filmA.values;
  const filmB = c.filmB.values;
  const rockK = c.rockConductivity.values;
  const gasC = c.gasCapacity.values;
  const flux06 = flux ** 0.6;
  const phi = bed.heatTransferFactor;
  const shellMass = c.rockDensity / S;
  const aPerC = shellMass / (0.5 * dt);
  const aFluid = c.fluidCapacity / (0.5 * dt);
  const between = c.shellBetween;
  const capacityTable = c.rock.capacity;
  const temperatureTable = c.rock.temperature;
  const perStep = c.rock.perStep;
  const fluidT = c.fluid.temperature;
  const fluidPerStep = c.fluid.perStep;
  const flowPerVolume = flux / c.cellLength_m;
  let Tin = inlet_K;
  let hin = c.fluid.enthalpyAt(inlet_K);
  for (let step = 0; step < cells; step++) {
    const k = ring * cells + (forward ? step : cells - 1 - step);
    const base = k * S;
    const at = ((gas[k]! - 70) * 2 + 0.5) | 0;
    const film = phi * (filmA[at]! + flux06 * filmB[at]!);
    const g = flowPerVolume * gasC[((Tin - 70) * 2 + 0.5) | 0]!;
    const n = film / g;
    const w = n > 2 ? 1 - 1 / n : 0.5;
    const ks = rockK[((mean[k]! - 70) * 2 + 0.5) | 0]!;
    // psi_s = (rhs_s + K_s psi_(s+1))/d_s at the middle of the step, innermost shell first.
    let d = 0;
    let rhs = 0;
    let inner = 0;
    for (let s = 0; s < S; s++) {
      const a = aPerC * capacityTable[(enthalpy[base + s]! * perStep + 0.5) | 0]!;
      const next = s < S - 1 ? between[s]! * ks : 0;
      if (s === 0) {
        rhs = a * temperature[base]!;
        d = a + next;
      } else {
        rhs = a * temperature[base + s]! + (inner * rhs) / d;
        d = a + inner - (inner * inner) / d + next;
      }
      inner = next;
      scratch[s] = d;
      scratch[S + s] = rhs;
    }
    // Outermost shell, its surface and the film in series, then the gas.
    const toSurface = c.shellSurface * ks;
    const link = (toSurface * film) / (toSurface + film);
    const flowLink = g / w;
    const gasOwn = flowLink + link + aFluid;
    const gasRhs = flowLink * Tin + aFluid * gas[k]!;
    let psi = (rhs + (link * gasRhs) / gasOwn) / (d + link - (link * link) / gasOwn);
    const psiGas = (gasRhs + link * psi) / gasOwn;
    const toRock = link * (psiGas - psi) * dt;
    surface[k] = psi + toRock / (dt * toSurface);
    const toFluid = 2 * c.fluidCapacity * (psiGas - gas[k]!);
    gas[k] = aFluid > 0 ? 2 * psiGas - gas[k]! : psiGas;
    let arriving = toRock;
    let sum = 0;
    for (let s = S - 1; s >= 0; s--) {
      let leaving = 0;
      if (s > 0) {
        const K = between[s - 1]! * ks;
        const below = (scratch[S + s - 1]! + K * psi) / scratch[s - 1]!;
        leaving = K * (psi - below) * dt;
        psi = below;
      }
      const h = enthalpy[base + s]! + (arriving - leaving) / shellMass;
      enthalpy[base + s] = h;
      const y = h * perStep;
      const i = y | 0;
      const T0 = temperatureTable[i]!;
      const T = T0 + (y - i) * (temperatureTable[i + 1]! - T0);
      temperature[base + s] = T;
      sum += T;
      arriving = leaving;
    }
    mean[k] = sum / S;
    hin -= (toRock + toFluid) / (flowPerVolume * dt);
    const y = hin * fluidPerStep;
    const i = y | 0;
    const T0 = fluidT[i]!;
    Tin = T0 + (y - i) * (fluidT[i + 1]! - T0);
  }
  return Tin;
}

/** Without flow the grains even out inside: slowest mode of an insulated sphere, R^2/(4.4934^2 alpha). */
export function relaxShells(bed: Bed, dt: number): void {
  const { shells: S, solid, particle_diameter_m } = bed.p;
  const { enthalpy, c } = bed;
  for (let k = 0; k < bed.mean.length; k++) {
    const T = bed.mean[k]!;
    const perVolume =
      solid.density_kg_m3 * c.rock.capacity[(enthalpy[k * S]! * c.rock.perStep) | 0]!;
    const rate = (20.19 * c.rockConductivity.at(T)) / (perVolume * (particle_diameter_m / 2) ** 2);
    const share = 1 - Math.exp(-rate * dt);
    let total = 0;
    for (let s = 0; s < S; s++) total += enthalpy[k * S + s]!;
    for (let j = k * S; j < (k + 1) * S; j++)
      enthalpy[j] = enthalpy[j]! + share * (total / S - enthalpy[j]!);
    bed.surface[k] = T;
    if (c.fluidCapacity === 0) bed.gas[k] = T;
  }
}
