import type { UnitDefinition } from '../../core/definitions.js';
import type { Machine } from '../../core/machine/machine.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import { referenceOutlets } from './referenceOutlets.js';
import { lossConductance_W_K } from './storeFacts.js';

/** A channel that the unit does not have. */
export interface MissingChannel {
  readonly channel: string;
  readonly stands_in: string;
  readonly costs: string;
}

const percent = (share: number) => `${(100 * share).toFixed(1)} %`;

/** Every channel that could be there and is not: what stands in for it, and what that costs. */
export function missingChannels(unit: UnitDefinition, machine: Machine): MissingChannel[] {
  const roles = unit.channels.map((c) => c.role);
  const has = (kind: string) => roles.some((role) => role.kind === kind);
  const list: MissingChannel[] = [];
  const add = (channel: string, stands_in: string, costs: string) =>
    list.push({ channel, stands_in, costs });
  const e = unit.estimator;

  if (!has('flow')) {
    add(
      'flow',
      'power through the model of the machine',
      `every error of that model moves the fronts; allowed for are ${percent(e.machine_factor_sigma)} and the flow factors (${percent(e.flow_factor_sigma)})`,
    );
  }
  if (!has('power')) {
    add(
      'power',
      'the model of the machine',
      `power per kilogram is not learned: hours carry the model's own ${percent(e.machine_factor_sigma)}`,
    );
  }
  if (!has('mode') && !has('valve')) {
    add(
      'mode',
      has('flow') && roles.some((r) => r.kind === 'flow' && r.sense !== 'unsigned')
        ? 'the direction of the flow'
        : 'the sign of power',
      'a change of mode is known two scans late, and leakage while standing reads as slow running',
    );
  }
  for (const store of unit.stores) {
    const measured = (kind: string) =>
      roles.some((role) => role.kind === kind && 'store' in role && role.store === store.id);
    for (const end of ['charge_inlet', 'discharge_inlet'] as const) {
      const there = roles.some(
        (role) => role.kind === 'gas_temperature' && role.store === store.id && role.end === end,
      );
      if (there) continue;
      const direction = end === 'charge_inlet' ? 'charge' : 'discharge';
      add(
        `gas temperature, ${store.id}, ${end}`,
        `the machine's model at the inlet while ${direction === 'charge' ? 'charging' : 'discharging'}, the bed's last cells at the outlet`,
        'an inlet that differs from the model is learned from the first thermocouples only; the outlet limit is watched on the estimate',
      );
    }
    if (!measured('pressure') && store.bed.fluid.phase === 'gas') {
      add(
        `pressure, ${store.id}`,
        `${(store.bed.pressure_Pa / 1e5).toFixed(2)} bar of the configuration`,
        'lost gas inventory is not seen, and the expected pressure drop goes with 1/pressure',
      );
    }
    if (!measured('pressure_drop')) {
      add(
        `pressure drop, ${store.id}`,
        'the Ergun equation',
        'dust, fines or frost show only once they spread the front',
      );
    }
    if (!measured('shell_temperature')) {
      const kW = (lossConductance_W_K(store) * spanToAmbient_K(unit, store.id)) / 1e3;
      add(
        `shell temperature, ${store.id}`,
        `loss coefficients of the configuration (${kW.toFixed(1)} kW when full)`,
        'a failing insulation shows only in the standing loss over days',
      );
    }
  }
  if (!has('ambient_temperature')) add('ambient temperature', ...ambient(unit, machine));
  if (!has('auxiliary_power')) {
    add(
      'auxiliary power',
      `${(machine.auxiliary_running_W / 1e3).toFixed(0)} kW running, ${(machine.auxiliary_standing_W / 1e3).toFixed(0)} kW standing, of the configuration`,
      `each 10 kW amiss changes the hours by ${percent(1e4 / unit.rated_power_W)} at rated power`,
    );
  }
  return list;
}

function spanToAmbient_K(unit: UnitDefinition, storeId: string): number {
  const store = unit.stores.find((s) => s.id === storeId)!;
  const charged = store.kind === 'hot' ? store.reference_hot_K : store.reference_cold_K;
  return Math.abs(charged - unit.ambient_K);
}

/** What 10 K of wrong ambient temperature do to the work of the machine and to the losses. */
function ambient(unit: UnitDefinition, machine: Machine): [standsIn: string, costs: string] {
  const outlets = referenceOutlets(unit, 'discharge');
  const work = (t: number) => machine.operate('discharge', outlets, t).specificWork_J_kg;
  const base = work(unit.ambient_K);
  const change = Math.abs(work(unit.ambient_K + 10) / base - 1);
  const loss_kW =
    unit.stores.reduce((sum, store) => sum + lossConductance_W_K(store) * 10, 0) / 1e3;
  return [
    `${(unit.ambient_K - ZERO_CELSIUS_K).toFixed(0)} degC of the configuration`,
    `10 K amiss changes the work per kilogram by ${percent(change)} and the standing loss by ${loss_kW.toFixed(1)} kW`,
  ];
}
