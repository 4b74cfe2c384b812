/**
 * Headroom told after two hours' watch of the finer plant, everything drawn, against what that plant
 * then takes until its store breaks through: `npx tsx tools/headroom.ts 1 12`, first and last seed.
 */

import { planContext } from '../src/core/plan/context.js';
import { headroomOf } from '../src/core/plan/headroom.js';
import { unitModel } from '../src/core/unitModel.js';
import { H, WatchedPlant } from '../test/support/truthRun.js';

const POWER_W = 3e6;
/** From the mean to the quantile of 90 % of a normal distribution, in sigmas. */
const P90 = 1.2816;
const [first = 1, last = 3] = process.argv.slice(2).map(Number);

const off: number[] = [];
const sigmas: number[] = [];
for (let seed = first; seed <= last; seed++) {
  const watched = new WatchedPlant({ seed });
  watched.watch([
    { mode: 'charge', power_W: 2.4e6, duration_s: 1.2 * H },
    { mode: 'discharge', power_W: 1.6e6, duration_s: 0.7 * H },
    { mode: 'charge', power_W: POWER_W, duration_s: 0.3 * H },
  ]);
  const context = planContext(unitModel(watched.unit), watched.state);
  const [told] = headroomOf(context, { powers_W: [POWER_W] });
  if (told === undefined) throw new Error('an answer per power was expected');
  const { p90, p50, p10 } = told.hours;
  let scans = 0;
  let stopped = Number.NaN;
  const duration_s = (p10 + 1) * H;
  watched.plant.run([{ mode: 'charge', power_W: POWER_W, duration_s }], (_, truth) => {
    scans++;
    if (truth.mode === 'stand' && Number.isNaN(stopped)) stopped = scans;
  });
  // Found at the end of a minute in which it stopped.
  const hours = (stopped - 0.5) / 60;
  const sigma = (p50 - p90) / P90;
  off.push(hours - p50);
  sigmas.push((hours - p50) / sigma);
  const figures = [p90, p50, p10, hours].map((x) => x.toFixed(3)).join(' ');
  const end = `${told.ends_by}, off ${(hours - p50).toFixed(3)} h`;
  console.log(
    `seed ${seed}: p90 p50 p10 true ${figures}, ${end}, over sigma ${sigmas.at(-1)?.toFixed(2)}`,
  );
}
const mean = (values: readonly number[]) => values.reduce((a, b) => a + b, 0) / values.length;
const rms = (values: readonly number[]) => Math.sqrt(mean(values.map((x) => x * x)));
const below = sigmas.filter((x) => x < -P90).length;
console.log(
  `mean ${mean(off).toFixed(3)} h, rms ${rms(off).toFixed(3)} h, over sigma rms ${rms(sigmas).toFixed(2)}, below p90 ${below} of ${off.length}`,
);
