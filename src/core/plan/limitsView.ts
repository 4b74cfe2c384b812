import type { Direction, StartUpDefinition, UnitDefinition } from '../definitions.js';
import { type ConnectionNow, limitsAhead } from './limitsAhead.js';

const MW = (power_W: number) => power_W / 1e6;
const iso = (time_ms: number) => new Date(time_ms).toISOString();

/**
 * What binds what a unit can sell, in the units of the edge.
 *
 * @param now_ms time that the connection and the outages are told for: that of the estimate
 */
export function limitsView(unit: UnitDefinition, now_ms: number) {
  const { limits, machine } = unit;
  const { operation } = limits;
  const ahead = limitsAhead(limits, now_ms);
  const direction = (own: Direction) => {
    const { power_min_W, power_max_W, flow_min_kg_s, flow_max_kg_s } = limits[own];
    const rate = operation?.ramp_W_s[own] ?? null;
    return {
      power_min_MW_el: MW(power_min_W),
      power_max_MW_el: MW(power_max_W),
      flow_min_kg_s,
      flow_max_kg_s,
      ramp_MW_per_min: rate === null ? null : (rate * 60) / 1e6,
    };
  };
  return {
    charge: direction('charge'),
    discharge: direction('discharge'),
    start: operation === undefined ? null : startView(operation.start),
    change_over_min: (operation?.change_over_s ?? 0) / 60,
    connection:
      ahead.connection === null || limits.connection === undefined
        ? null
        : {
            time_zone: limits.connection.time_zone,
            now: throughView(ahead.connection.now),
            next_change:
              ahead.connection.next === null
                ? null
                : {
                    time: iso(ahead.connection.next.time_ms),
                    ...throughView(ahead.connection.next),
                  },
          },
    outages: ahead.outages.map((outage) => ({
      from: iso(outage.from_ms),
      to: iso(outage.to_ms),
      discharge_max_MW_el: MW(outage.discharge_max_W),
      charge_max_MW_el: MW(outage.charge_max_W),
      reason: outage.reason,
    })),
    auxiliaries_running_MW_el: MW(machine.auxiliary_running_W),
    auxiliaries_standing_MW_el: MW(machine.auxiliary_standing_W),
    availability: limits.availability ?? null,
  };
}

function throughView({ export_max_W, import_max_W }: ConnectionNow) {
  return { export_max_MW_el: MW(export_max_W), import_max_MW_el: MW(import_max_W) };
}

function startView(start: {
  readonly warm: StartUpDefinition;
  readonly cold: StartUpDefinition;
  readonly cold_after_s: number;
}) {
  const one = ({ time_s, energy_J }: StartUpDefinition) => ({
    time_min: time_s / 60,
    energy_kWh_el: energy_J / 3.6e6,
  });
  const { warm, cold, cold_after_s } = start;
  const after = Number.isFinite(cold_after_s) ? cold_after_s / 3600 : null;
  return { warm: one(warm), cold: one(cold), cold_after_h: after };
}
