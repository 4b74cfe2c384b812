import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { Capability } from '../../../src/core/plan/capability.js';
import { writtenIn } from '../../../src/core/plan/localTime.js';
import { type OfferReport, UNTESTED, wilson } from '../../../src/core/plan/offerReport.js';
import type { Schedule, ShortfallView } from '../../../src/core/plan/schedule.js';
import type { Block, ScheduleAsk } from '../../../src/core/plan/scheduleAsk.js';

/** What lies ahead of a unit that holds 16 MWh_el, lets out what it has evenly, and gives back half. */

const FULL_MWH = 16;
const BACK = 0.55;
/** Standard deviation of what it holds, over what it holds. */
const SIGMA = 0.04;
const GREATEST_W = 3e6;
const HOUR_MS = 3_600_000;

/** Normal distribution, logistic approximation: off by 0.01 at most. */
const normal = (x: number): number => 1 / (1 + Math.exp(-1.702 * x));
/** Its inverse. */
const quantile = (p: number): number => Math.log(p / (1 - p)) / 1.702;

const energyOf = ({ power_W, from_ms, to_ms }: Block): number =>
  ((Math.min(power_W, GREATEST_W) / 1e6) * (to_ms - from_ms)) / HOUR_MS;

/** Where a charge in MWh_el goes along the blocks, and when it is used up. */
function march(blocks: readonly Block[], begin_MWh: number) {
  let held = begin_MWh;
  let short: { at_ms: number; MWh_el: number } | null = null;
  const after = blocks.map((block) => {
    const energy = energyOf(block);
    if (block.mode === 'charge') held = Math.min(1.2 * FULL_MWH, held + BACK * energy);
    if (block.mode !== 'discharge') return held;
    const missing = energy - held;
    if (missing > 1e-9 && short === null) {
      const share = Math.max(0, held / energy);
      const at_ms = block.from_ms + share * (block.to_ms - block.from_ms);
      short = { at_ms: Math.round(at_ms / 60_000) * 60_000, MWh_el: missing };
    }
    held = Math.max(0, held - energy);
    return held;
  });
  return { after, short: short as { at_ms: number; MWh_el: number } | null };
}

/** A schedule check that follows from the charge, as the core's does, with one sigma for all. */
export function marchedSchedule(ask: ScheduleAsk, now_ms: number, charged: number): Schedule {
  const { blocks, certainty, zone } = ask;
  const at = (ms: number): string => writtenIn(zone, ms);
  const held = charged * FULL_MWH;
  const firm = held * (1 - quantile(certainty) * SIGMA);
  const likely = march(blocks, held);
  const sure = march(blocks, firm);
  const given = blocks.filter(({ mode }) => mode === 'discharge');
  const needed = given.reduce((sum, block) => sum + energyOf(block), 0);
  const taken = blocks.filter(({ mode }) => mode === 'charge').reduce((s, b) => s + energyOf(b), 0);
  // Charging before counts for what comes after it only roughly: enough for a script.
  const carried = normal((held + BACK * taken - needed) / (SIGMA * held));
  const unmet = blocks.flatMap((block, i) => {
    const missing_MW_el = (block.power_W - GREATEST_W) / 1e6;
    if (missing_MW_el <= 0) return [];
    const { from_ms, to_ms } = block;
    return [
      {
        ...{ block: i, cause: 'above_greatest_power' as const, from: at(from_ms), to: at(to_ms) },
        ...{ missing_MW_el, MWh_el: (missing_MW_el * (to_ms - from_ms)) / HOUR_MS },
      },
    ];
  });
  const view = (found: { at_ms: number; MWh_el: number } | null): ShortfallView | null =>
    found === null
      ? null
      : { time: at(found.at_ms), MWh_el: found.MWh_el, cause: 'cold_outlet' as const };
  const shortfall = { p50: view(likely.short), certain: view(sure.short) };
  const probability = unmet.length > 0 ? 0 : carried;
  const factor = Math.min(1, Math.floor((1000 * firm) / Math.max(needed, 1e-9)) / 1000);
  const views = blocks.map(({ mode, power_W, from_ms, to_ms }) => ({
    ...{ mode, power_MW_el: power_W / 1e6, from: at(from_ms), to: at(to_ms) },
  }));
  const net = needed - taken;
  return {
    ...{ certainty, probability, stores_probability: carried, ramp_MWh_el: 0.02 },
    ...{ planned_net_MWh_el: net, expected_net_MWh_el: net - 0.04, net_MWh_el: net - 0.03 },
    ...{ between_MWh_el: 0.03, ramps_between_MWh_el: 0 },
    unmet,
    first_shortfall: shortfall,
    first_stores_shortfall: shortfall,
    blocks: blocks.map((block, i) => {
      const planned_MWh_el = (block.power_W / 1e6) * ((block.to_ms - block.from_ms) / HOUR_MS);
      const lacks = (run: typeof sure): number => {
        if (run.short === null || run.short.at_ms >= block.to_ms) return 0;
        const whole = block.to_ms - block.from_ms;
        return energyOf(block) * Math.min(1, (block.to_ms - run.short.at_ms) / whole);
      };
      const lost = block.mode === 'discharge' ? lacks(sure) : 0;
      const met_probability = lost > 0 ? carried : Math.max(carried, 0.985);
      return {
        ...views[i]!,
        ...{ planned_MWh_el, expected_MWh_el: planned_MWh_el - lost / 4 },
        ...{ certain_MWh_el: planned_MWh_el - lost, expected_shortfall_MWh_el: lost / 4 },
        ...{ unmet_MWh_el: 0, ramp_MWh_el: 0, met_probability },
        net_MWh_el: block.mode === 'charge' ? -planned_MWh_el : planned_MWh_el,
      };
    }),
    runs: runsOf(blocks).map((run) => {
      const of = run[0]!;
      const spare = (level: number) =>
        of.mode === 'charge'
          ? null
          : (held * (1 - quantile(level) * SIGMA) - needed) / (of.power_W / 1e6);
      return {
        ...{ mode: of.mode, from: at(of.from_ms), to: at(run.at(-1)!.to_ms) },
        probability: of.mode === 'charge' ? 0.999 : carried,
        reserve_hours: { p90: spare(0.9), p50: spare(0.5), p10: spare(0.1) },
        ends_by: of.mode === 'charge' ? null : ('cold_outlet' as const),
        stops: of.mode !== 'charge' && likely.short !== null ? at(likely.short.at_ms) : null,
      };
    }),
    reserve_looked_hours: 6,
    charge: [
      { ms: now_ms, MWh: held },
      { ms: blocks[0]!.from_ms, MWh: held },
      ...blocks.map(({ to_ms }, i) => ({ ms: to_ms, MWh: likely.after[i]! })),
    ].map(({ ms, MWh }, i) => ({
      time: at(ms),
      state_of_charge: MWh / FULL_MWH,
      state_of_charge_sigma: 0.01 + 0.006 * i,
      stores: { hot: { soc: MWh / FULL_MWH, soc_sigma: 0.01 } },
    })),
    charge_left_out: 0,
    nearest:
      factor > 0.25
        ? {
            blocks: views.map((block) => ({
              ...block,
              power_MW_el:
                block.mode === 'discharge'
                  ? Math.min(block.power_MW_el, GREATEST_W / 1e6) * factor
                  : block.power_MW_el,
            })),
            ...{ factor_discharge: factor, factor_charge: 1, drawn_in: [] },
            ...{ taken_out: unmet.length > 0, probability: certainty + 0.01 },
          }
        : null,
    nearest_reason: factor > 0.25 ? null : 'nothing_holds',
  };
}

/** Blocks in one direction that follow each other. */
function runsOf(blocks: readonly Block[]): Block[][] {
  const runs: Block[][] = [];
  for (const block of blocks.filter(({ mode }) => mode !== 'stand')) {
    const before = runs.at(-1)?.at(-1);
    const follows = before?.mode === block.mode && before.to_ms === block.from_ms;
    if (follows) runs.at(-1)!.push(block);
    else runs.push([block]);
  }
  return runs;
}

/** Curves as of a machine whose flow runs out near empty. */
export function scriptedCapability(unit: UnitDefinition, charged: number): Capability {
  const rated = unit.rated_power_W / 1e6;
  const { power_max_W } = unit.limits.discharge;
  const most = power_max_W / 1e6;
  const point = (
    state_of_charge: number,
    power_MW_el: number,
    limited_by: 'flow' | 'power',
    energy_MWh_el: number,
  ) => ({
    ...{ state_of_charge, power_MW_el, limited_by, energy_MWh_el },
    stored_MWh_th: { hot: 42 * state_of_charge, cold: 21 * state_of_charge },
  });
  const common = {
    ...{ marched_at_MW_el: rated, after_cycles: 0, largest_error_MW_el: 0.012 },
    ...{ tolerance_MW_el: 0.02, steps: 120, beyond_MWh_el: 0, refused: null },
  };
  return {
    ...{ state_of_charge: charged, full_from_now: 1.18 },
    ...{ rated_power_MW_el: rated, rated_hours: unit.rated_hours },
    discharge: {
      ...common,
      direction: 'discharge',
      ends_by: 'cold_outlet',
      points: [
        point(0, 0.7 * most, 'flow', 0),
        point(0.12, 0.93 * most, 'flow', 0.12 * FULL_MWH),
        point(0.2, most, 'power', 0.2 * FULL_MWH),
        point(1.18, most, 'power', 1.18 * FULL_MWH),
      ],
    },
    charge: {
      ...common,
      direction: 'charge',
      ends_by: 'hot_outlet',
      points: [
        point(0, most, 'power', 1.18 * FULL_MWH * 1.8),
        point(0.95, most, 'power', 0.23 * FULL_MWH * 1.8),
        point(1.18, 0.82 * most, 'flow', 0),
      ],
    },
    cycle: {
      ...{ cycles: 2, settled: true, full_state_of_charge: 1.18 },
      ...{ charge_MWh_el: 33.2, discharge_MWh_el: 18.3, round_trip: BACK },
      charge_MWh_el_per_MWh_th: { hot: 0.7, cold: 1.4 },
      discharge_MWh_el_per_MWh_th: { hot: 0.4, cold: 0.8 },
    },
  };
}

/** Discharges, one a day, that gave what a table of random errors says: two of 18 short of firm. */
export function scriptedReport(now_ms: number): OfferReport {
  const ERRORS = [
    ...[0.3, -0.6, 1.1, 0.2, -1.0, 0.7, -1.5, 0.1, 0.9],
    ...[-0.4, 1.6, -0.2, 0.5, -1.1, 0.4, 0, -1.9, 0.8],
  ];
  const tested = ERRORS.map((error, i) => {
    const p50 = 13.2 + 1.6 * Math.sin(i);
    const sigma = 0.035 * p50;
    const delivered_MWh_el = p50 + error * sigma;
    const p90 = p50 - 1.2816 * sigma;
    const begins_ms = now_ms - (ERRORS.length - i) * 24 * HOUR_MS;
    return {
      ...{ no: i + 1, asked_ms: begins_ms - 3 * HOUR_MS, begins_ms, power_MW_el: i % 3 ? 2 : 1.2 },
      energy_MWh_el: { p90, p50, p10: p50 + 1.2816 * sigma },
      delivered_MWh_el,
      ended_by: i % 5 === 4 ? ('flow' as const) : ('cold_outlet' as const),
      kept: { p90: delivered_MWh_el >= p90, p50: delivered_MWh_el >= p50 },
    };
  });
  const kept = (level: 'p90' | 'p50', meant: number) => {
    const count = tested.filter((one) => one.kept[level]).length;
    const of = tested.length;
    return { kept: count, of, meant, share: count / of, interval: wilson(count, of) };
  };
  const untested = Object.fromEntries(UNTESTED.map((why) => [why, 0])) as OfferReport['untested'];
  return {
    ...{ tables: 26, older_left_out: false, p90: kept('p90', 0.9), p50: kept('p50', 0.5), tested },
    untested: { ...untested, not_yet: 12, other_power: 58, superseded: 9 },
  };
}
