/**
 * Whether what no string sees follows from the rings' flow: the rock along the strings less the store,
 * in the finer plant alone, against the drawn flow of the rings at the strings times how far the
 * fronts have run apart, with and without the exchange of heat between rings.
 *
 *   npx tsx tools/rings.ts 1 13
 *
 * first and last seed of the nominal day. What all seeds have in common at an hour, the wall, is taken
 * out first.
 */
import type { StoreModel } from '../src/core/track/storeTracker.js';
import { unitModel } from '../src/core/unitModel.js';
import { drawPlant, type StoreDraw } from '../test/plant/draws.js';
import type { StoreGeometry } from '../test/plant/geometry.js';
import { helpIfAsked } from './help.js';
import { truthHash } from './score/codeHash.js';
import { SCENARIOS } from './score/scenarios.js';
import { unitWith } from './score/sensorSets.js';
import { truthOf } from './score/truthOf.js';
import { truthGeometry } from './score/truthPlant.js';

helpIfAsked(import.meta.url);

const [first = 1, last = 8] = process.argv.slice(2).map(Number);
const seeds = Array.from({ length: last - first + 1 }, (_, i) => first + i);
const plan = SCENARIOS.find((s) => s.id === 'nominal')!.truth;
const geometry = truthGeometry();
const hash = await truthHash();

/** Flow at the strings, weighed by area, less the store's mean, as a share of it. */
function apart(store: StoreGeometry, { layout, ring_flow }: StoreDraw, ids: readonly string[]) {
  const radius_m = store.diameter_m / 2;
  let inside = 0;
  const middles = layout.shares.map((share) => {
    inside += share;
    return radius_m * Math.sqrt(inside - share / 2);
  });
  const at = (r: number): number => {
    let k = 0;
    while (k < middles.length - 2 && r > middles[k + 1]!) k++;
    const u = Math.min(1, Math.max(0, (r - middles[k]!) / (middles[k + 1]! - middles[k]!)));
    return ring_flow[k]! * (1 - u) + ring_flow[k + 1]! * u;
  };
  const strings = store.strings.filter((s) => ids.includes(s.id));
  const whole = strings.reduce((sum, s) => sum + s.area_share, 0);
  const weight = (s: { area_share: number }) => (whole > 0 ? s.area_share / whole : 1);
  return strings.reduce((sum, s) => sum + weight(s) * at(s.radius_m), 0) - 1;
}

for (const set of ['all', 'five'] as const) {
  const model = unitModel(unitWith(set, 'independent'));
  const column = set === 'all' ? 'seen_all' : 'seen_one';
  for (const store of model.stores) {
    const { id } = store.store;
    const own = geometry.stores.find((s) => s.id === id)!;
    const ids = store.store.strings.map((s) => s.id);
    const rows = { off: [] as number[][], with: [] as number[][], without: [] as number[][] };
    let tau_h = 0;
    for (const seed of seeds) {
      const recording = truthOf(plan, seed, hash);
      const { scans, period_s } = recording.header;
      const draw = drawPlant(geometry, seed, {
        physics: 'random',
        machine: plan.machine,
        sensors: 'class',
        meter: 'random',
      }).stores[id]!;
      const flow = apart(own, draw, ids);
      const soc = (n: number) => recording.truth(`${id}.soc`, n);
      const found = { off: [] as number[], with: [] as number[], without: [] as number[] };
      let even = soc(0);
      for (let n = 0; n < scans; n++) {
        const flux = recording.truth('flow_kg_s', n) / store.store.bed.area_m2;
        const tau_s = eveningTime(store, flux);
        tau_h += tau_s / 3600 / scans / seeds.length;
        even = soc(n) + (even - soc(n)) * Math.exp(-period_s / tau_s);
        if ((n + 1) % (3600 / period_s) !== 0) continue;
        found.off.push(recording.truth(`${id}.${column}`, n) - soc(n));
        found.with.push(flow * (soc(n) - even));
        found.without.push(flow * (soc(n) - soc(0)));
      }
      rows.off.push(found.off);
      rows.with.push(found.with);
      rows.without.push(found.without);
    }
    const off = withoutCommon(rows.off);
    const words = (['with', 'without'] as const).map((how) => {
      const x = withoutCommon(rows[how]);
      const slope = dot(x, off) / dot(x, x);
      const r = dot(x, off) / Math.sqrt(dot(x, x) * dot(off, off));
      return `${how} exchange r ${r.toFixed(3)}, slope ${slope.toFixed(2)}`;
    });
    const rms = 100 * Math.sqrt(dot(off, off) / off.length);
    console.log(
      `${set} ${id}: off ${rms.toFixed(3)} % rms, tau ${tau_h.toFixed(0)} h; ${words.join('; ')}`,
    );
  }
}

/**
 * Time in which fronts even out sideways over the width W for which a string stands, as a wave of
 * that length does: tau = (W/2 pi)^2 C/(k + 0.1 G cf d), W = radius over number of strings [s].
 */
function eveningTime({ store, tables }: StoreModel, flux_kg_m2s: number): number {
  const { bed, strings } = store;
  const middle = tables.segments >> 1;
  const gas = Math.abs(flux_kg_m2s) * tables.fluidHeatCapacity[middle]!;
  const conductivity = tables.stagnant[middle]! + 0.1 * gas * bed.particle_diameter_m;
  const width_m = bed.diameter_m / 2 / strings.length;
  return ((width_m / (2 * Math.PI)) ** 2 * tables.heatCapacity[middle]!) / conductivity;
}

/** All rows in one, less the mean over the rows at each place. */
function withoutCommon(rows: readonly (readonly number[])[]): number[] {
  const mean = rows[0]!.map((_, i) => rows.reduce((sum, r) => sum + r[i]!, 0) / rows.length);
  return rows.flatMap((r) => r.map((v, i) => v - mean[i]!));
}

function dot(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, v, i) => sum + v * b[i]!, 0);
}
