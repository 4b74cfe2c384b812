import type { Bed } from './bed.js';

/** Rock next to the wall to the wall, and end steel to the first rock (radiation and contact) [W/m2K]. */
const WALL_EXCHANGE_W_M2K = 12;
const END_BED_EXCHANGE_W_M2K = 8;

/**
 * Conduction along and across, wall, ends and losses during `dt`, explicit; every heat leaves one
 * place and enters another. Heat is spread evenly over the shells of a cell.
 * @param stirred G d cp = Re Pr kf [W/mK]
 */
export function conductPart(bed: Bed, dt: number, stirred: number, ambient_K: number): void {
  const { p, c, mean, heat, wall, ends } = bed;
  const { cells: N, shells: S } = p;
  const R = c.rings;
  const kBed = c.bedConductivity.values;
  const dx = c.cellLength_m;
  heat.fill(0);
  const along = dt / (dx * dx);
  for (let r = 0; r < R; r++) {
    const axialStir = 0.5 * stirred * bed.ringFlow[r]!;
    for (let i = 0, k = r * N; i < N - 1; i++, k++) {
      const a = mean[k]!;
      const b = mean[k + 1]!;
      const q = along * (kBed[(a + b - 139.5) | 0]! + axialStir) * (b - a);
      heat[k] = heat[k]! + q;
      heat[k + 1] = heat[k + 1]! - q;
    }
  }
  const lateralStir = 0.1 * stirred;
  for (let r = 0; r < R - 1; r++) {
    const span = c.ringMiddle_m[r + 1]! - c.ringMiddle_m[r]!;
    const across = (2 * Math.PI * c.ringEdge_m[r]! * dt) / span;
    const inside = across / c.ringArea_m2[r]!;
    const outside = across / c.ringArea_m2[r + 1]!;
    for (let i = 0, k = r * N; i < N; i++, k++) {
      const a = mean[k]!;
      const b = mean[k + N]!;
      const q = (kBed[(a + b - 139.5) | 0]! + lateralStir) * (b - a);
      heat[k] = heat[k]! + inside * q;
      heat[k + N] = heat[k + N]! - outside * q;
    }
  }
  const radius = p.diameter_m / 2;
  const toWall = radius - c.ringMiddle_m[R - 1]!;
  const perVolume = (2 * Math.PI * radius) / c.ringArea_m2[R - 1]!;
  const wallLoss = p.wall_loss_W_m2K * bed.lossFactor;
  let lost = 0;
  for (let i = 0, k = (R - 1) * N; i < N; i++, k++) {
    const k_W_mK = kBed[((mean[k]! - 70) * 2 + 0.5) | 0]! + lateralStir;
    const q = (dt * (wall[i]! - mean[k]!)) / (1 / WALL_EXCHANGE_W_M2K + toWall / k_W_mK);
    const out = dt * wallLoss * (wall[i]! - ambient_K);
    heat[k] = heat[k]! + perVolume * q;
    wall[i] = wall[i]! - (q + out) / p.wall_capacity_J_m2K;
    lost += out;
  }
  bed.lostHeat_J += lost * 2 * Math.PI * radius * dx;
  for (let e = 0; e < 2; e++) {
    const steel = p.end_capacity_J_K[e]!;
    const loss = p.end_loss_W_m2K[e]! * bed.lossFactor;
    let given = 0;
    if (steel === 0) {
      // No steel node: the first rock loses straight to ambient.
      for (let r = 0; r < R; r++) {
        const k = r * N + (e === 0 ? 0 : N - 1);
        const q = dt * loss * (ambient_K - mean[k]!);
        heat[k] = heat[k]! + q / dx;
        bed.lostHeat_J -= c.ringArea_m2[r]! * q;
      }
      continue;
    }
    for (let r = 0; r < R; r++) {
      const k = r * N + (e === 0 ? 0 : N - 1);
      const q = dt * END_BED_EXCHANGE_W_M2K * (ends[e]! - mean[k]!);
      heat[k] = heat[k]! + q / dx;
      given += c.ringArea_m2[r]! * q;
    }
    const out = c.area_m2 * dt * loss * (ends[e]! - ambient_K);
    ends[e] = ends[e]! - (given + out) / steel;
    bed.lostHeat_J += out;
  }
  const { enthalpy, temperature } = bed;
  const { temperature: table, perStep } = c.rock;
  const perMass = 1 / c.rockDensity;
  for (let k = 0; k < R * N; k++) {
    const dh = heat[k]! * perMass;
    let sum = 0;
    for (let j = k * S; j < (k + 1) * S; j++) {
      const h = enthalpy[j]! + dh;
      enthalpy[j] = h;
      const y = h * perStep;
      const i = y | 0;
      const a = table[i]!;
      const T = a + (y - i) * (table[i + 1]! - a);
      temperature[j] = T;
      sum += T;
    }
    mean[k] = sum / S;
  }
}
