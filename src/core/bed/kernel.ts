import { oneLessDecay, timesMeanDecay } from './decay.js';
import { type BedTables, fluidEnthalpyAt, fluidTemperatureAt } from './tables.js';

/**
 * One time step of a packed bed (or of one stream tube of it), per area of bed.
 *
 *   G cf dTf/dx = hv (Ts - Tf)                     gas, quasi-steady
 *   dH/dt       = hv (Tf - Ts) + d/dx(kax dTs/dx) - losses
 *
 * Within a cell and a step both sides are relaxed exactly: the gas along x against a uniform solid,
 * the solid in time against the step's mean gas inflow. With NTU n = hv dx/(G cf), a = 1 - exp(-n),
 * p = a G cf dt/(C dx), q = 1 - exp(-p), b = a q/p:
 *
 *   e_out = e_in - b (e_in - e(Ts)),    H' = H + (G dt/dx) b (e_in - e(Ts))
 *
 * The scheme is monotone and stable for every step, closes enthalpy to round-off, moves fronts with
 * the exact mean speed, and its own dispersion is known in closed form (see `numericalConductivity`)
 * and taken out of kax. Error: second order in dx and in dt.
 *
 * Cells are numbered from the charge inlet; a positive mass flux flows from cell 0 upwards.
 */
export interface BedStep {
  /** Mass flux [kg/m2s], + = charge direction, 0 = standing. */
  readonly massFlux_kg_m2s: number;
  /** Temperature of the gas that enters now [K]; not read while standing. */
  readonly inlet_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
  /** Heat-transfer factor phi_h [-]. */
  readonly heatTransferFactor: number;
  /** Wall loss of this tube per bed volume [W/m3K]; see `wallLossPerVolume`. */
  readonly wallLoss_W_m3K: number;
}

/** Arrays of a step, reused; after `bedSubstep` they describe the step just made. */
export interface BedWork {
  readonly cells: number;
  /** Solid temperature before the step [K] and dH/dT there [J/m3K]. */
  readonly temperature: Float64Array;
  readonly heatCapacity: Float64Array;
  /** Fluid enthalpy in equilibrium with the solid before the step [J/kg]. */
  readonly equilibrium: Float64Array;
  /** Gas pickup b [-], c_f [J/kgK], axial conductivity net of the scheme's own [W/mK]. */
  readonly pickup: Float64Array;
  readonly fluidHeatCapacity: Float64Array;
  readonly conductivity: Float64Array;
  /** Gas-to-rock lag G cf/hv [m] (unsigned), 0 while standing. */
  readonly gasLag_m: Float64Array;
  /** a = 1 - exp(-n), p, and d ln hv/d ln G; 1 where the conductivity stands at its least. */
  readonly relaxed: Float64Array;
  readonly exchange: Float64Array;
  readonly filmSlope: Float64Array;
  readonly sharpest: Uint8Array;
  /** Scratch of `parameterColumns`. */
  readonly slopeFlow: Float64Array;
  readonly slopeTransfer: Float64Array;
  /** Mean temperature of the gas leaving the tube during the step [K]; NaN while standing. */
  outlet_K: number;
  /** Enthalpy leaving and entering per area [J/m2], and losses [J/m2]. */
  gasIn_J_m2: number;
  gasOut_J_m2: number;
  loss_J_m2: number;
}

export function createBedWork(cells: number): BedWork {
  return {
    cells,
    temperature: new Float64Array(cells),
    heatCapacity: new Float64Array(cells),
    equilibrium: new Float64Array(cells),
    pickup: new Float64Array(cells),
    fluidHeatCapacity: new Float64Array(cells),
    conductivity: new Float64Array(cells),
    gasLag_m: new Float64Array(cells),
    relaxed: new Float64Array(cells),
    exchange: new Float64Array(cells),
    filmSlope: new Float64Array(cells),
    sharpest: new Uint8Array(cells),
    slopeFlow: new Float64Array(cells),
    slopeTransfer: new Float64Array(cells),
    outlet_K: Number.NaN,
    gasIn_J_m2: 0,
    gasOut_J_m2: 0,
    loss_J_m2: 0,
  };
}

/** Wall loss per bed volume [W/m3K] = U 4/D f, for a tube that carries `share` of the mantle's loss. */
export function wallLossPerVolume(tables: BedTables, share = 1): number {
  const bed = tables.bed;
  return ((bed.wall_loss_W_m2K * bed.loss_factor * 4) / bed.diameter_m) * share;
}

/** Largest exchange number p and diffusion number of one substep; second-order accuracy needs both below one. */
const MAX_EXCHANGE = 0.75;
const MAX_DIFFUSION = 0.3;

/**
 * The net conductivity may be negative (the scheme disperses more than the bed conducts), down to
 * this share of the transfer's own dispersion G^2 cf^2/hv. Beyond, cells coarser than the front
 * would ripple; there the front comes out too wide instead, by less than one cell.
 */
const SHARPEN = 0.2;

/** Number of substeps that keeps a step accurate and its explicit conduction stable. */
export function planSubsteps(tables: BedTables, cells: number, step: BedStep): number {
  const dx = tables.bed.length_m / cells;
  const flux = Math.abs(step.massFlux_kg_m2s);
  const cf = tables.fluidHeatCapacity[tables.segments >> 1] as number;
  let smallest = Infinity;
  for (const c of [0, tables.segments >> 1, tables.segments - 1]) {
    smallest = Math.min(smallest, tables.heatCapacity[c] as number);
  }
  const exchange = (flux * cf * step.dt_s) / (smallest * dx);
  const k =
    (tables.stagnant[tables.segments - 1] as number) +
    tables.mixing * flux * tables.bed.particle_diameter_m * cf;
  const diffusion = (k * step.dt_s) / (smallest * dx * dx);
  return Math.max(1, Math.ceil(exchange / MAX_EXCHANGE), Math.ceil(diffusion / MAX_DIFFUSION));
}

/**
 * Advances `enthalpy` [J/m3 of bed, one per cell] in place by step.dt_s, in as many substeps as
 * accuracy asks. Returns the number of substeps; `work` describes the last one, but its gasIn,
 * gasOut, loss and outlet_K are those of the whole step.
 */
export function stepBed(
  tables: BedTables,
  enthalpy: Float64Array,
  step: BedStep,
  work: BedWork,
): number {
  const substeps = planSubsteps(tables, work.cells, step);
  const part = substeps === 1 ? step : { ...step, dt_s: step.dt_s / substeps };
  let gasIn = 0;
  let gasOut = 0;
  let loss = 0;
  for (let i = 0; i < substeps; i++) {
    bedSubstep(tables, enthalpy, part, work);
    gasIn += work.gasIn_J_m2;
    gasOut += work.gasOut_J_m2;
    loss += work.loss_J_m2;
  }
  work.gasIn_J_m2 = gasIn;
  work.gasOut_J_m2 = gasOut;
  work.loss_J_m2 = loss;
  const passed = Math.abs(step.massFlux_kg_m2s) * step.dt_s;
  work.outlet_K = passed > 0 ? fluidTemperatureAt(tables, gasOut / passed) : Number.NaN;
  return substeps;
}

/** One substep, see the head of this file. `enthalpy` is changed in place. */
export function bedSubstep(
  tables: BedTables,
  enthalpy: Float64Array,
  step: BedStep,
  work: BedWork,
): void {
  prepare(tables, enthalpy, step, work);
  conduct(tables, enthalpy, step, work);
  convect(tables, enthalpy, step, work);
}

/** Reads temperatures and coefficients from the tables. */
function prepare(tables: BedTables, enthalpy: Float64Array, step: BedStep, work: BedWork): void {
  if (step.massFlux_kg_m2s === 0) {
    prepareStanding(tables, enthalpy, work);
    return;
  }
  // Everything that the loop reads stands in a variable: looked up once, not at each cell.
  const { cells, temperature, heatCapacity, equilibrium, pickup, fluidHeatCapacity } = work;
  const { conductivity, gasLag_m, relaxed, exchange, filmSlope, sharpest } = work;
  const { inverse_dH, dH, stagnant, temperature_K: nodes, fluidEnthalpy } = tables;
  const { filmFlow, filmStill, particleResistance: resistance } = tables;
  const { heatCapacity: heat, fluidHeatCapacity: fluidHeat } = tables;
  const dx = tables.bed.length_m / cells;
  const flux = Math.abs(step.massFlux_kg_m2s);
  const flux06 = flux ** 0.6;
  const surface = step.heatTransferFactor * tables.surface_m2_m3 * tables.bed.heat_transfer_factor;
  const perSurface = flux / surface;
  const disperse = tables.mixing * flux * tables.bed.particle_diameter_m;
  const passed = (flux * step.dt_s) / dx;
  const last = tables.segments - 1;
  for (let i = 0; i < cells; i++) {
    const scaled = (enthalpy[i] as number) * inverse_dH;
    let s = Math.floor(scaled);
    if (s < 0) s = 0;
    else if (s > last) s = last;
    const c = heat[s] as number;
    const cf = fluidHeat[s] as number;
    const within = ((scaled - s) * dH) / c;
    temperature[i] = (nodes[s] as number) + within;
    heatCapacity[i] = c;
    equilibrium[i] = (fluidEnthalpy[s] as number) + within * cf;
    const moving = (filmFlow[s] as number) * flux06;
    const film = (filmStill[s] as number) + moving;
    const inside = 1 + film * (resistance[s] as number);
    const shared = 1 / (film * inside);
    const lag = perSurface * cf * (inside * inside * shared);
    relaxed[i] = dx / lag;
    fluidHeatCapacity[i] = cf;
    gasLag_m[i] = lag;
    filmSlope[i] = 0.6 * moving * shared;
    conductivity[i] = (stagnant[s] as number) + disperse * cf;
  }
  oneLessDecay(relaxed);
  for (let i = 0; i < cells; i++) {
    const a = relaxed[i] as number;
    const cf = fluidHeatCapacity[i] as number;
    pickup[i] = a;
    exchange[i] = (a * passed * cf) / (heatCapacity[i] as number);
  }
  timesMeanDecay(exchange, pickup);
  const fluxDx = flux * dx;
  const inverse = 1 / dx;
  for (let i = 0; i < cells; i++) {
    const cf = fluidHeatCapacity[i] as number;
    const lag = gasLag_m[i] as number;
    const a = relaxed[i] as number;
    const p = exchange[i] as number;
    // As `numericalConductivity`, which a call for each cell would make dear.
    const own = fluxDx * cf * ((2 - a + (p * p) / 6) / (2 * a) - lag * inverse);
    const net = (conductivity[i] as number) - own;
    const least = -SHARPEN * flux * cf * lag;
    sharpest[i] = net < least ? 1 : 0;
    conductivity[i] = Math.max(net, least);
  }
}

function prepareStanding(tables: BedTables, enthalpy: Float64Array, work: BedWork): void {
  const { cells, temperature, heatCapacity, conductivity } = work;
  const { inverse_dH, dH, stagnant, temperature_K: nodes, heatCapacity: heat } = tables;
  const last = tables.segments - 1;
  work.pickup.fill(0);
  work.gasLag_m.fill(0);
  for (let i = 0; i < cells; i++) {
    const scaled = (enthalpy[i] as number) * inverse_dH;
    let s = Math.floor(scaled);
    if (s < 0) s = 0;
    else if (s > last) s = last;
    const c = heat[s] as number;
    temperature[i] = (nodes[s] as number) + ((scaled - s) * dH) / c;
    heatCapacity[i] = c;
    conductivity[i] = stagnant[s] as number;
  }
}

/**
 * The scheme's own dispersion as a conductivity [W/mK], in excess of the physical G^2 cf^2/hv:
 *
 *   k_num = G cf dx [ (2 - a)/(2 a) - 1/n + p^2/(12 a) ]
 *
 * from the variance of the random walk that the scheme is: a parcel of heat leaves a cell q times
 * a step on average p, is taken up by each next cell with probability a. (2-a)/(2a) = coth(n/2)/2,
 * so the space part is n/12 for small n: second order.
 *
 * @param fluxHeatDx G cf dx [W/mK]
 */
export function numericalConductivity(fluxHeatDx: number, n: number, a: number, p: number): number {
  return fluxHeatDx * ((2 - a + (p * p) / 6) / (2 * a) - 1 / n);
}

/** Axial conduction and losses, explicit, in flux form; changes `enthalpy`. */
function conduct(tables: BedTables, enthalpy: Float64Array, step: BedStep, work: BedWork): void {
  const { cells, temperature, conductivity } = work;
  const bed = tables.bed;
  const { ambient_K } = step;
  const dx = bed.length_m / cells;
  const factor = (0.5 * step.dt_s) / (dx * dx);
  const wall = step.wallLoss_W_m3K * step.dt_s;
  const perEnd = (bed.loss_factor * step.dt_s) / dx;
  const last = cells - 1;
  let before = 0;
  let loss = 0;
  let t = temperature[0] as number;
  let k = conductivity[0] as number;
  for (let i = 0; i < last; i++) {
    const tNext = temperature[i + 1] as number;
    const kNext = conductivity[i + 1] as number;
    const after = factor * (k + kNext) * (tNext - t);
    const lost = wall * (t - ambient_K);
    enthalpy[i] = (enthalpy[i] as number) + after - before - lost;
    loss += lost;
    before = after;
    t = tNext;
    k = kNext;
  }
  const lostLast = wall * (t - ambient_K);
  const atFirst =
    bed.end_loss_W_m2K.charge_inlet * perEnd * ((temperature[0] as number) - ambient_K);
  const atLast = bed.end_loss_W_m2K.discharge_inlet * perEnd * (t - ambient_K);
  enthalpy[last] = (enthalpy[last] as number) - before - lostLast - atLast;
  enthalpy[0] = (enthalpy[0] as number) - atFirst;
  work.loss_J_m2 = (loss + lostLast + atFirst + atLast) * dx;
}

/** Gas along the flow; changes `enthalpy` and sets the outlet. */
function convect(tables: BedTables, enthalpy: Float64Array, step: BedStep, work: BedWork): void {
  const flux = Math.abs(step.massFlux_kg_m2s);
  work.gasIn_J_m2 = 0;
  work.gasOut_J_m2 = 0;
  work.outlet_K = Number.NaN;
  if (flux === 0) return;
  const { cells, pickup, equilibrium } = work;
  const dx = tables.bed.length_m / cells;
  const transfer = (flux * step.dt_s) / dx;
  const along = step.massFlux_kg_m2s > 0 ? 1 : -1;
  const eIn = fluidEnthalpyAt(tables, step.inlet_K);
  let e = eIn;
  for (let k = 0, i = along > 0 ? 0 : cells - 1; k < cells; k++, i += along) {
    // The equilibrium belongs to the temperature before the step: conduction reads the same.
    const taken = (pickup[i] as number) * (e - (equilibrium[i] as number));
    e -= taken;
    enthalpy[i] = (enthalpy[i] as number) + transfer * taken;
  }
  work.gasIn_J_m2 = flux * step.dt_s * eIn;
  work.gasOut_J_m2 = flux * step.dt_s * e;
  work.outlet_K = fluidTemperatureAt(tables, e);
}
