import { type BedStep, type BedWork, numericalConductivity } from './kernel.js';
import { type BedTables, fluidEnthalpyAt } from './tables.js';

/**
 * How the temperatures after a substep move with the logarithms of mass flux and of heat-transfer
 * factor [K], exactly, in the same two passes as the step itself and without another exponential:
 *
 *   n = hv dx/(G cf), a = 1 - exp(-n), p = a G cf dt/(C dx), b = a (1 - exp(-p))/p
 *   d ln n = d ln hv - d ln G,   da = (1 - a) n d ln n,   dp = p (da/a + d ln G),
 *   db = da r + a r' dp,         r = (1 - exp(-p))/p,  r' = (exp(-p) - r)/p
 *
 * and along the flow  d e_out = d e_in - db (e_in - e_s) - b d e_in.
 *
 * @param enthalpy after the substep [J/m3]
 * @param work of that substep, as `bedSubstep` left it
 * @param flow column of ln G, length cells
 * @param transfer column of ln phi_h, length cells
 */
export function parameterColumns(
  tables: BedTables,
  enthalpy: Float64Array,
  step: BedStep,
  work: BedWork,
  flow: Float64Array,
  transfer: Float64Array,
): void {
  const { cells } = work;
  const dx = tables.bed.length_m / cells;
  const flux = Math.abs(step.massFlux_kg_m2s);
  const factor = step.dt_s / (dx * dx);
  const perCell = (flux * step.dt_s) / dx;
  const forward = step.massFlux_kg_m2s > 0;
  const { slopeFlow, slopeTransfer } = work;
  for (let i = 0; i < cells; i++) conductivitySlopes(tables, work, i, dx, flux);
  for (let i = 0; i < cells; i++) {
    flow[i] = 0;
    transfer[i] = 0;
  }
  for (let i = 0; i + 1 < cells; i++) {
    const drop =
      0.5 * factor * ((work.temperature[i + 1] as number) - (work.temperature[i] as number));
    const byFlow = drop * ((slopeFlow[i] as number) + (slopeFlow[i + 1] as number));
    const byTransfer = drop * ((slopeTransfer[i] as number) + (slopeTransfer[i + 1] as number));
    flow[i] = (flow[i] as number) + byFlow;
    flow[i + 1] = (flow[i + 1] as number) - byFlow;
    transfer[i] = (transfer[i] as number) + byTransfer;
    transfer[i + 1] = (transfer[i + 1] as number) - byTransfer;
  }
  let e = fluidEnthalpyAt(tables, step.inlet_K);
  let eFlow = 0;
  let eTransfer = 0;
  const last = tables.segments - 1;
  for (let k = 0; k < cells; k++) {
    const i = forward ? k : cells - 1 - k;
    const b = work.pickup[i] as number;
    const apart = e - (work.equilibrium[i] as number);
    const n = dx / (work.gasLag_m[i] as number);
    const a = work.relaxed[i] as number;
    const p = work.exchange[i] as number;
    const r = b / a;
    // (exp(-p) - r)/p loses digits for small p; its series is exact to p^2.
    const slope = p > 1e-3 ? (1 - p * r - r) / p : -0.5 + p / 3 - (p * p) / 8;
    // A flow so small that all is taken up at once: 0 times infinity.
    const da = a < 1 ? (1 - a) * n : 0;
    const byFlow = da * ((work.filmSlope[i] as number) - 1);
    const dbFlow = byFlow * r + a * slope * p * (byFlow / a + 1);
    const dbTransfer = da * r + slope * p * da;
    const takenFlow = dbFlow * apart + b * eFlow;
    const takenTransfer = dbTransfer * apart + b * eTransfer;
    let s = Math.floor((enthalpy[i] as number) * tables.inverse_dH);
    if (s < 0) s = 0;
    else if (s > last) s = last;
    const c = tables.heatCapacity[s] as number;
    flow[i] = ((flow[i] as number) + perCell * (takenFlow + b * apart)) / c;
    transfer[i] = ((transfer[i] as number) + perCell * takenTransfer) / c;
    e -= b * apart;
    eFlow -= takenFlow;
    eTransfer -= takenTransfer;
  }
}

/** d k/d ln G and d k/d ln phi_h of the net conductivity of cell i [W/mK] into the work's slopes. */
function conductivitySlopes(
  tables: BedTables,
  work: BedWork,
  i: number,
  dx: number,
  flux: number,
): void {
  const cf = work.fluidHeatCapacity[i] as number;
  const lag = work.gasLag_m[i] as number;
  const film = work.filmSlope[i] as number;
  if (work.sharpest[i] === 1) {
    // The net conductivity stands at its least, in proportion to G^2 cf^2/hv.
    const k = work.conductivity[i] as number;
    work.slopeFlow[i] = k * (2 - film);
    work.slopeTransfer[i] = -k;
    return;
  }
  const n = dx / lag;
  const a = work.relaxed[i] as number;
  const p = work.exchange[i] as number;
  const scale = flux * cf * dx;
  const da = a < 1 ? (1 - a) * n : 0;
  const disperse = tables.mixing * flux * tables.bed.particle_diameter_m * cf;
  work.slopeFlow[i] =
    disperse - numericalConductivity(scale, n, a, p) - scale * ownSlope(n, a, p, da, film - 1, 1);
  work.slopeTransfer[i] = -scale * ownSlope(n, a, p, da, 1, 0);
}

/** How the bracket of `numericalConductivity` moves as ln n and ln G do by `lnN` and `lnG`. */
function ownSlope(n: number, a: number, p: number, da: number, lnN: number, lnG: number): number {
  const by = da * lnN;
  const dp = p * (by / a + lnG);
  return -by / (a * a) + lnN / n + (2 * p * dp - (p * p * by) / a) / (12 * a);
}
