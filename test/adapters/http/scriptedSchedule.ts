import { writtenIn } from '../../../src/core/plan/localTime.js';
import type { BlockView, Schedule } from '../../../src/core/plan/schedule.js';
import type { ScheduleAsk } from '../../../src/core/plan/scheduleAsk.js';

/** A schedule check by a script: everything is done, but the last block lacks a tenth. */
export function scriptedSchedule(ask: ScheduleAsk, now_ms: number): Schedule {
  const at = (ms: number): string => writtenIn(ask.zone, ms);
  const views = ask.blocks.map(
    ({ mode, power_W, from_ms, to_ms }): BlockView => ({
      ...{ mode, power_MW_el: power_W / 1e6, from: at(from_ms), to: at(to_ms) },
    }),
  );
  const last = views.length - 1;
  const short = { time: views[last]!.from, MWh_el: 0.1, cause: 'hot_outlet' } as const;
  return {
    certainty: ask.certainty,
    ...{ probability: 0.75, stores_probability: 0.8, ramp_MWh_el: 0.01 },
    ...{ planned_net_MWh_el: 1.5, expected_net_MWh_el: 1.3, net_MWh_el: 1.4 },
    ...{ between_MWh_el: 0.03, ramps_between_MWh_el: 0.02 },
    unmet: [
      {
        ...{ block: 0, cause: 'start_up', from: views[0]!.from, to: views[0]!.to },
        ...{ missing_MW_el: 1, MWh_el: 0.05 },
      },
    ],
    first_shortfall: { p50: null, certain: short },
    first_stores_shortfall: { p50: null, certain: short },
    blocks: views.map((view, i) => {
      const { from_ms, to_ms } = ask.blocks[i]!;
      const planned_MWh_el = (view.power_MW_el * (to_ms - from_ms)) / 3.6e6;
      const lacks = i === last ? 0.1 : 0;
      return {
        ...view,
        planned_MWh_el,
        expected_MWh_el: planned_MWh_el - lacks,
        certain_MWh_el: planned_MWh_el - 2 * lacks,
        expected_shortfall_MWh_el: lacks,
        ...{ unmet_MWh_el: 0, ramp_MWh_el: 0 },
        net_MWh_el: view.mode === 'charge' ? -planned_MWh_el : planned_MWh_el,
        met_probability: i === last ? 0.8 : 1,
      };
    }),
    runs: [
      {
        ...{ mode: views[0]!.mode, from: views[0]!.from, to: views[0]!.to, probability: 0.8 },
        reserve_hours: { p90: -0.2, p50: 0.4, p10: null },
        ...{ ends_by: 'hot_outlet', stops: null },
      },
    ],
    reserve_looked_hours: 1,
    charge: [now_ms, ...ask.blocks.map(({ to_ms }) => to_ms)].map((ms, i) => ({
      time: at(ms),
      state_of_charge: 0.6 - 0.1 * i,
      state_of_charge_sigma: 0.02,
      stores: { hot: { soc: 0.7, soc_sigma: 0.01 }, cold: { soc: 0.65, soc_sigma: 0.012 } },
    })),
    charge_left_out: 0,
    nearest: {
      blocks: views,
      ...{ factor_discharge: 0.9, factor_charge: 1, drawn_in: [], taken_out: true },
      probability: 0.91,
    },
    nearest_reason: null,
  };
}
