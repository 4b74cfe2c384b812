import type { Schedule } from '../../core/plan/schedule.js';
import { csvValue } from '../../core/plan/scheduleCsv.js';
import { STAND_COLUMNS, type Stand, standOf, toCsv } from './csv.js';

const COLUMNS = [
  'from',
  'to',
  'mode',
  'power_MW_el',
  'planned_MWh_el',
  'expected_MWh_el',
  'certain_MWh_el',
  'expected_shortfall_MWh_el',
  'unmet_MWh_el',
  'ramp_MWh_el',
  'net_MWh_el',
  'met_probability',
] as const;

/**
 * A schedule check as rows, one per block, with the states of charge at its end (empty where there
 * are more edges than the answer holds) and what the whole answer stands on; numbers to 9 digits.
 */
export function scheduleTable(head: Stand, schedule: Schedule): string {
  const stores = Object.keys(schedule.charge[0]?.stores ?? {});
  const points = new Map(schedule.charge.map((point) => [point.time, point]));
  const columns = [
    ...STAND_COLUMNS,
    ...COLUMNS,
    'state_of_charge_at_end',
    'state_of_charge_at_end_sigma',
    ...stores.flatMap((id) => [`${id}_soc_at_end`, `${id}_soc_at_end_sigma`]),
    ...['schedule_probability', 'certainty'],
  ];
  const rows = schedule.blocks.map((block) => {
    const at = points.get(block.to);
    const charges = stores.map((id) => [
      [`${id}_soc_at_end`, at?.stores[id]?.soc ?? null],
      [`${id}_soc_at_end_sigma`, at?.stores[id]?.soc_sigma ?? null],
    ]);
    const row = {
      ...block,
      state_of_charge_at_end: at?.state_of_charge ?? null,
      state_of_charge_at_end_sigma: at?.state_of_charge_sigma ?? null,
      ...Object.fromEntries(charges.flat()),
      schedule_probability: schedule.probability,
      certainty: schedule.certainty,
    };
    const rounded = Object.entries(row).map(([name, value]) => [name, csvValue(value)]);
    return { ...(Object.fromEntries(rounded) as typeof row), ...standOf(head), time: head.time };
  });
  return toCsv(columns, rows);
}
