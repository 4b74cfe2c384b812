import { DrivenPlant } from '../../test/support/drivenPlant.js';

/** The thermocouple that is cut off in the first unit, and the one that reads too low in the second. */
const CUT = 'hot_axis_03';
const LOW = 'cold_rim_06';
const LIVE_SPEED = 5;

/**
 * Two units with so many hours behind them and what a plant has of troubles: a thermocouple that is
 * cut off and acknowledged, one that reads 60 K low, an offer table that was kept.
 *
 * @param progress plant time that has gone by [h]
 */
export async function troubledPlant(
  hours: number,
  progress: (done: number) => void,
): Promise<DrivenPlant> {
  const plant = await DrivenPlant.start({
    ...{ hours, cells: 40, hours_at_MW_el: [1.8, 1.2] },
    units: ['Vellmoor, unit 1', 'Vellmoor, unit 2'],
  });
  plant.spoil = (unit, values) => {
    if (unit === plant.site.units[0]!.id) return { ...values, [CUT]: null };
    const low = values[LOW];
    return typeof low === 'number' ? { ...values, [LOW]: low - 60 } : values;
  };
  await plant.run(hours / 2, progress);
  const [unit] = plant.site.units;
  const post = (path: string, body: object) =>
    fetch(`${plant.url}api/${path}`, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
    });
  const powers_MW_el = [1.8, 1.2];
  await post(`units/${unit!.id}/offers`, {
    ...{ powers_MW_el, gate: { closes_before_min: 30, every_min: 60, count: 3 } },
    ...{ block_min: 60, keep: true, stale: 'mark' },
  });
  await post('alarms/acknowledge', {
    id: `${unit!.id}/sensor_rejected/${CUT}`,
    who: 'night shift',
  });
  await plant.run(hours / 2, (done) => progress(hours / 2 + done));
  plant.live(LIVE_SPEED);
  return plant;
}
