import type {
  DirectionLimits,
  EstimatorDefinition,
  LimitsDefinition,
  MachineDefinition,
  WatchDefinition,
} from '../core/definitions.js';
import { ZERO_CELSIUS_K } from '../core/units.js';
import { resolveFluid } from './resolveStore.js';
import { resolveTrade } from './resolveTrade.js';
import type { MachineBlock } from './schema/machine.js';
import type { LimitsBlock } from './schema/operation.js';
import type { UnitBlock } from './schema/site.js';

const kelvin = (t: number): number => t + ZERO_CELSIUS_K;
const kelvinOrNull = (t: number | undefined): number | null => (t === undefined ? null : kelvin(t));

export function resolveMachine(block: MachineBlock): MachineDefinition {
  const common = {
    auxiliary_running_W: block.auxiliary_running_kW * 1e3,
    auxiliary_standing_W: block.auxiliary_standing_kW * 1e3,
    work_factor: {
      charge: block.work_factor_charge,
      discharge: block.work_factor_discharge,
    },
  };
  if (block.kind === 'gas_cycle') {
    return {
      kind: 'gas_cycle',
      gas: resolveFluid(block.gas),
      high_pressure_Pa: block.high_pressure_bar * 1e5,
      low_pressure_Pa: block.low_pressure_bar * 1e5,
      compressor_polytropic_efficiency: block.compressor_polytropic_efficiency,
      expander_polytropic_efficiency: block.expander_polytropic_efficiency,
      loop_pressure_loss: block.loop_pressure_loss,
      ...(block.loss_follows_flow === undefined
        ? {}
        : { loss_follows_flow: block.loss_follows_flow }),
      cooler_approach_K: block.cooler_approach_K,
      motor_efficiency: block.motor_efficiency,
      generator_efficiency: block.generator_efficiency,
      ...common,
    };
  }
  return {
    kind: 'efficiency_table',
    fluid: resolveFluid(block.fluid),
    outlet_K: block.outlet_degC.map(kelvin),
    efficiency: block.efficiency,
    return_K: kelvin(block.return_degC),
    charge_inlet_K: kelvin(block.charge_inlet_degC),
    charge_efficiency: block.charge_efficiency,
    ...common,
  };
}

export function resolveLimits(block: LimitsBlock, standing_W: number): LimitsDefinition {
  const direction = (d: LimitsBlock['charge']): DirectionLimits => ({
    power_min_W: d.power_min_MW_el * 1e6,
    power_max_W: d.power_max_MW_el * 1e6,
    flow_min_kg_s: d.flow_min_kg_s,
    flow_max_kg_s: d.flow_max_kg_s,
  });
  const drop = block.pressure_drop_max_kPa;
  return {
    charge: direction(block.charge),
    discharge: direction(block.discharge),
    ...resolveTrade(block, standing_W),
    hot_outlet_min_K: kelvinOrNull(block.hot_outlet_min_degC),
    cold_outlet_max_K: kelvinOrNull(block.cold_outlet_max_degC),
    charge_hot_outlet_max_K: kelvinOrNull(block.charge_hot_outlet_max_degC),
    charge_cold_outlet_min_K: kelvinOrNull(block.charge_cold_outlet_min_degC),
    pressure_drop_max_Pa: drop === undefined ? null : drop * 1e3,
  };
}

/** Default below which the unit stands, as a share of the greatest flow. */
const STAND_SHARE = 0.02;

export function resolveEstimator(unit: UnitBlock): EstimatorDefinition {
  const { offset_time_h, position_sigma_mm, stand_flow_kg_s, leak_sigma, ...same } = unit.estimator;
  return {
    ...same,
    offset_time_s: offset_time_h * 3600,
    position_sigma_m: position_sigma_mm * 1e-3,
    leak_sigma_kg_s: leak_sigma * unit.limits.discharge.flow_max_kg_s,
    stand_flow_kg_s: stand_flow_kg_s ?? STAND_SHARE * unit.limits.discharge.flow_max_kg_s,
  };
}

/** Default age of the newest reading, in scan periods. */
const STALE_PERIODS = 5;

export function resolveWatch(unit: UnitBlock): WatchDefinition {
  const { data_age_s, indicators, ...same } = unit.watch;
  const { in_control_days, baseline_from, ...rules } = indicators;
  return {
    ...same,
    data_age_s: { ...data_age_s, limit: data_age_s.limit ?? STALE_PERIODS * unit.scan_period_s },
    indicators: {
      in_control_d: in_control_days,
      baseline_from_ms: baseline_from === undefined ? null : Date.parse(baseline_from),
      // The width of the front has its own block: it is older than the others.
      rules: { ...rules, spread_ratio: same.spread_ratio },
    },
  };
}
