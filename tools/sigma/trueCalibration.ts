import { machineSpread, partLoadFactor } from '../../src/core/dispatch/machineSpread.js';
import type { UnitModel } from '../../src/core/unitModel.js';
import { cycleOf, flowForPower } from '../../test/plant/cycle.js';
import type { PlantDraw } from '../../test/plant/draws.js';
import type { PlantGeometry } from '../../test/plant/geometry.js';

/**
 * What `calibrate` would say of a plant that is known, for a discharge at a power: per store
 * ln(travel per metered kilogram over the model's), then ln(work per metered kilogram), with full
 * stores and the true meter taken out of both, as it drops out of hours.
 */
export function trueCalibration(
  model: UnitModel,
  geometry: PlantGeometry,
  draw: PlantDraw,
  power_W: number,
  ambient_K: number,
): number[] {
  const hot = geometry.stores.find((s) => s.kind === 'hot')!;
  const cold = geometry.stores.find((s) => s.kind === 'cold')!;
  const outlets = { hot_K: hot.reference_hot_K, cold_K: cold.reference_cold_K };
  const cycle = cycleOf(geometry, draw.machine, () => Number.NaN);
  const { hot_K, cold_K } = outlets;
  const m = flowForPower(cycle, false, -power_W, hot_K, cold_K, ambient_K, 10);
  const gross = power_W + model.machine.auxiliary_running_W;
  const told = model.machine.operate('discharge', outlets, ambient_K).specificWork_J_kg;
  const part = partLoadFactor(machineSpread(model.unit), 'discharge', m);
  return [
    ...geometry.stores.map((s) => -lnCapacity(geometry, draw, s.id)),
    Math.log(gross / (m * told * part)),
  ];
}

/** ln of a store's true heat capacity over the configured one. */
export function lnCapacity(geometry: PlantGeometry, draw: PlantDraw, id: string): number {
  const own = draw.stores[id]!;
  const nominal = geometry.stores.find((s) => s.id === id)!.void_fraction;
  return Math.log((own.heat_capacity_factor * (1 - own.void_fraction)) / (1 - nominal));
}
