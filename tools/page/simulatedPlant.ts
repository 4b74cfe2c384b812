import { DrivenPlant } from '../../test/support/drivenPlant.js';

/** The thermocouple that is cut off in the first unit, and the one that reads too low in the second. */
const CUT = 'hot_axis_03';
const LOW = 'cold_rim_06';
const LIVE_SPEED = 5;

/** Plants to look at. */
export const PLANTS = ['troubled', 'healthy', 'empty'] as const;

/**
 * A plant that runs on by itself: two units in trouble, one without any, or one before its first scan.
 *
 * @param hours plant time that goes by first; none for `empty`
 * @param progress plant time that has gone by [h]
 */
export async function simulatedPlant(
  kind: (typeof PLANTS)[number],
  hours: number,
  progress: (done: number) => void,
): Promise<DrivenPlant> {
  if (kind === 'troubled') return troubled(hours, progress);
  const plant = await DrivenPlant.start({
    ...{ hours: kind === 'empty' ? 0 : hours, cells: 40, incidents: false },
    units: ['Vellmoor, unit 1'],
  });
  if (kind === 'empty') return plant;
  await plant.run(hours, progress);
  plant.live(LIVE_SPEED);
  return plant;
}

/**
 * Two units with so many hours behind them and what a plant has of troubles: a thermocouple that is
 * cut off and acknowledged, one that reads 60 K low, an offer table that was kept.
 */
async function troubled(hours: number, progress: (done: number) => void): Promise<DrivenPlant> {
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
