import type { Direction, MachineDefinition } from '../definitions.js';
import { requirePositive } from '../misuse.js';
import { createEfficiencyTable } from './efficiencyTable.js';
import { createGasCycle } from './gasCycle.js';

/** Gas temperatures leaving the stores in the direction asked for [K]; `cold_K` null: one hot store. */
export interface StoreTemperatures {
  readonly hot_K: number;
  readonly cold_K: number | null;
}

/** Gas temperatures in the machine [K]; null where this machine has no such place. */
export interface LoopTemperatures {
  readonly compressor_in_K: number | null;
  readonly compressor_out_K: number | null;
  readonly expander_in_K: number | null;
  readonly expander_out_K: number | null;
}

export interface OperatingPoint {
  /**
   * Electricity at the connection point per kilogram of loop gas, before auxiliaries [J/kg]:
   * taken in while charging, given out while discharging, positive both ways. Below 0 the machine
   * works against its direction (stores all but empty, or full).
   */
  readonly specificWork_J_kg: number;
  /** The same at the shaft, or before the conversion to electricity [J/kg]. */
  readonly shaftWork_J_kg: number;
  /** Gas temperatures entering the stores [K]. */
  readonly inlets: StoreTemperatures;
  readonly loop: LoopTemperatures;
  /** Heat given to the surroundings by coolers or conversion [J/kg]. */
  readonly heatRejected_J_kg: number;
  /** True where a table was asked beyond its ends and its end value was taken. */
  readonly clamped: boolean;
}

/** Why no flow gives a power: the temperatures yield no work, or the power is less than the auxiliaries take. */
export const FLOW_REASONS = ['no_work', 'power_below_auxiliaries'] as const;
export type FlowReason = (typeof FLOW_REASONS)[number];
export type FlowAnswer = { readonly flow_kg_s: number } | { readonly reason: FlowReason };

export interface Machine {
  readonly kind: MachineDefinition['kind'];
  readonly auxiliary_running_W: number;
  readonly auxiliary_standing_W: number;
  operate(direction: Direction, outlets: StoreTemperatures, ambient_K: number): OperatingPoint;
  /**
   * Net power at the connection point [W]: m w - auxiliaries while discharging (below 0: taken
   * from the grid), m w + auxiliaries while charging.
   */
  powerForFlow(
    direction: Direction,
    flow_kg_s: number,
    outlets: StoreTemperatures,
    ambient_K: number,
    workFactor?: number,
  ): number;
  /**
   * Flow that gives (discharging) or takes (charging) a net power [W] >= 0; the inverse of
   * `powerForFlow`. The limits of flow are the caller's.
   */
  flowForPower(
    direction: Direction,
    power_W: number,
    outlets: StoreTemperatures,
    ambient_K: number,
    workFactor?: number,
  ): FlowAnswer;
}

/**
 * Machine of a unit. `workFactor` of its methods is the learned ratio of the plant's own power per
 * metered kilogram to that of this model (default 1).
 *
 * @throws RangeError where the definition is impossible; its methods throw RangeError for a flow or
 *   power below 0, a temperature not above 0 or a store's outlet that is missing
 */
export function createMachine(definition: MachineDefinition): Machine {
  const model =
    definition.kind === 'gas_cycle'
      ? createGasCycle(definition)
      : createEfficiencyTable(definition);
  const factors = definition.work_factor ?? { charge: 1, discharge: 1 };
  requirePositive('work_factor.charge', factors.charge);
  requirePositive('work_factor.discharge', factors.discharge);
  // Tuned work is electricity alone: shaft and temperatures stay the model's.
  const operate: typeof model = (direction, outlets, ambient_K) => {
    const point = model(direction, outlets, ambient_K);
    return { ...point, specificWork_J_kg: point.specificWork_J_kg * factors[direction] };
  };
  const running = definition.auxiliary_running_W;
  const standing = definition.auxiliary_standing_W;
  if (!(running >= 0 && standing >= 0)) {
    throw new RangeError(
      `auxiliary_running_W and auxiliary_standing_W must be at least 0, got ${running} and ${standing}`,
    );
  }
  return Object.freeze({
    kind: definition.kind,
    auxiliary_running_W: running,
    auxiliary_standing_W: standing,
    operate,
    powerForFlow(
      direction: Direction,
      flow_kg_s: number,
      outlets: StoreTemperatures,
      ambient_K: number,
      workFactor = 1,
    ) {
      if (!(flow_kg_s >= 0)) throw new RangeError(`flow_kg_s must be at least 0, got ${flow_kg_s}`);
      const work = workFactor * operate(direction, outlets, ambient_K).specificWork_J_kg;
      return direction === 'charge' ? flow_kg_s * work + running : flow_kg_s * work - running;
    },
    flowForPower(
      direction: Direction,
      power_W: number,
      outlets: StoreTemperatures,
      ambient_K: number,
      workFactor = 1,
    ): FlowAnswer {
      if (!(power_W >= 0)) throw new RangeError(`power_W must be at least 0, got ${power_W}`);
      const work = workFactor * operate(direction, outlets, ambient_K).specificWork_J_kg;
      const gross = direction === 'charge' ? power_W - running : power_W + running;
      if (gross < 0) return { reason: 'power_below_auxiliaries' };
      if (!(work > 0)) return { reason: 'no_work' };
      return { flow_kg_s: gross / work };
    },
  });
}
