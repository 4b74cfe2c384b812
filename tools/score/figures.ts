import { type Figure, figure, type Goal, rms } from './figure.js';
import type { RowPlan, Scenario } from './scenario.js';
import { bestShiftedPinball, binomialInterval, pinball } from './statistics.js';
import {
  type HoursSample,
  mergeSum,
  type RowResult,
  rmsOf,
  type Sum,
  sumOf,
  worstOf,
} from './tally.js';
import { unsoundFigures } from './unsound.js';

/** Truth over sigma as rms. */
const RATIO: Goal = { least: 0.8, most: 1.25 };

/** Sums of all runs of a row together. */
export function pooled(results: readonly RowResult[]): Record<string, Sum> {
  const sums: Record<string, Sum> = {};
  for (const result of results) {
    for (const [name, sum] of Object.entries(result.sums)) {
      mergeSum(sumOf(sums, name), sum);
    }
  }
  return sums;
}

/**
 * Figures that every row has: errors, sigmas and hours in full where the goals for the sensor set
 * hold, and the errors of the state of charge for scenarios with goals of their own.
 */
export function commonFigures(
  scenario: Scenario,
  row: RowPlan,
  results: readonly RowResult[],
  about: { readonly rated_h: number; readonly fresh: readonly number[] },
): Figure[] {
  const sums = pooled(results);
  const goals = goalsOf(scenario, row);
  const fresh = pooled(results.filter((r) => about.fresh.includes(r.seed)));
  const out = [...chargeFigures(scenario, row, sums, fresh)];
  const ratios: [name: string, words: string, goal: Goal | null][] = [
    ['soc', 'state of charge', goals && RATIO],
  ];
  if (scenario.goals === 'sensors') {
    out.push(
      figure('stored heat, rms', rmsOf(sums.stored), 'MWh_th', null, sums.stored?.at),
      figure('front position, rms', rmsOf(sums.position), 'm', goals && { most: goals.position }),
      figure('front width, rms', rmsOf(sums.width), 'm'),
      figure(
        'fronts counted differently',
        share(results.map((r) => ({ hits: r.fronts.unmatched, cases: r.fronts.all }))),
        '%',
      ),
    );
    ratios.push(['stored', 'stored heat', goals && RATIO], ['position', 'front position', null]);
  }
  for (const [name, words, goal] of ratios) {
    const sum = sums[`${name}/sigma`];
    out.push(figure(`truth over sigma, ${words}, rms`, rmsOf(sum), '', goal, sum?.at));
    for (const store of STORES) {
      const own = sums[`${name}/sigma ${store}`];
      out.push(figure(`  ${store} alone`, rmsOf(own), '', null, own?.at));
    }
  }
  if (scenario.hours) out.push(...hoursFigures(scenario, row, results, sums, about.rated_h));
  if (scenario.healthy) {
    const named = results.reduce((sum, r) => sum + r.rejections.length, 0);
    const days = results.reduce((sum, r) => sum + r.scored_h, 0) / 24;
    out.push(figure('sensors wrongly named', named, '', ZERO, `in ${days.toFixed(1)} unit-days`));
  }
  const broken = results.reduce((sum, r) => sum + r.not_finite, 0);
  if (broken > 0) out.push(figure('estimates that are not finite', broken, '', ZERO));
  // Their goals stand with all runs together; here, which row they come from.
  for (const f of unsoundFigures(results)) {
    if (f.value !== 0) out.push(figure(f.name, f.value, f.unit, null, f.note));
  }
  return out;
}

const ZERO: Goal = { most: 0, each: true };
const STORES = ['hot', 'cold'] as const;

function chargeFigures(
  scenario: Scenario,
  row: RowPlan,
  sums: Record<string, Sum>,
  fresh: Record<string, Sum>,
): Figure[] {
  const goals = goalsOf(scenario, row);
  const only = typeof scenario.goals === 'object' ? { most: scenario.goals.soc_rms } : null;
  const worstFigure = (name: string, words: string, goal: Goal | null) => {
    const sum = sums[name];
    return figure(words, worstOf(sum), '%', goal, sum?.at);
  };
  const note = (name: string) => {
    const value = rmsOf(fresh[name]);
    return value === null ? '' : `fresh seeds alone ${value.toFixed(3)}`;
  };
  const apart = row.errors === 'class' && scenario.goals === 'sensors';
  const own = apart
    ? STORES.map((store) =>
        figure(
          `state of charge, ${store}, rms`,
          rmsOf(sums[`soc ${store}`]),
          '%',
          goals && { most: goals.class[store] },
          note(`soc ${store}`),
        ),
      )
    : [
        figure(
          'state of charge, rms',
          rmsOf(sums.soc),
          '%',
          goals ? { most: goals.soc[0] } : only,
          note('soc'),
        ),
      ];
  return [
    ...own,
    worstFigure(
      'soc',
      'state of charge, worst',
      goals && !apart ? { most: goals.soc[1], each: true } : null,
    ),
    figure('  straight lines, rms', rmsOf(sums['line soc']), '%'),
    worstFigure('line soc', '  straight lines, worst', null),
    // What the estimate is wrong by, apart from what its strings do not see.
    figure('  estimate against the rock at the strings, rms', rmsOf(sums['soc/seen']), '%'),
    figure('  rock at the strings against the store, rms', rmsOf(sums['seen soc']), '%'),
  ];
}

/** What is to be reached with each sensor set; state of charge and hours as rms (and worst). */
const GOALS = {
  all: {
    soc: [0.1, 0.3],
    class: { hot: 0.4, cold: 0.8 },
    hours_h: 0.03,
    hours_rated: 1.5,
    position: 0.03,
  },
  five: {
    soc: [0.25, 0.7],
    class: { hot: 0.4, cold: 0.8 },
    hours_h: 0.08,
    hours_rated: 2.5,
    position: 0.06,
  },
} as const;

function goalsOf(scenario: Scenario, row: RowPlan) {
  if (scenario.goals !== 'sensors' || row.plain || row.set === 'three') return null;
  return GOALS[row.set];
}

function share(groups: readonly { hits: number; cases: number }[]): number | null {
  const cases = groups.reduce((sum, g) => sum + g.cases, 0);
  return cases === 0 ? null : (100 * groups.reduce((sum, g) => sum + g.hits, 0)) / cases;
}

function hoursFigures(
  scenario: Scenario,
  row: RowPlan,
  results: readonly RowResult[],
  sums: Record<string, Sum>,
  ratedHours: number,
): Figure[] {
  const goals = goalsOf(scenario, row);
  const counted = (r: RowResult) => r.hours.filter((h) => h.truth > 0);
  const all = results.flatMap(counted);
  const late = all.filter((h) => h.at_h >= scenario.cycle_h);
  const known = scenario.truth.machine === 'known';
  const off = (samples: readonly HoursSample[], of: (h: HoursSample) => number) =>
    rms(samples.map((h) => of(h) - h.truth));
  const lateRms = off(late, (h) => h.p50);
  const out: Figure[] = [
    figure(
      'hours at 60 % power, rms',
      off(all, (h) => h.p50),
      'h',
      goals && known ? { most: goals.hours_h } : null,
      sums.hours ? `worst ${sums.hours.worst.toFixed(3)} h, ${sums.hours.at}` : '',
    ),
    ...(late.length === 0
      ? []
      : [
          figure(
            '  after one cycle, rms',
            lateRms === null ? null : (100 * lateRms) / ratedHours,
            '% of rated',
            goals && !known ? { most: goals.hours_rated } : null,
          ),
        ]),
    figure(
      '  heat over heat rate, rms',
      off(all, (h) => h.line),
      'h',
    ),
    figure(
      'truth over sigma, hours, rms',
      rmsOf(sums['hours/sigma']),
      '',
      goals && RATIO,
      sums['hours/sigma']?.at ?? '',
    ),
  ];
  // Where no hours were left to be had, nothing told is right but no hit; something told is a miss.
  const told = (r: RowResult) => r.hours.filter((h) => h.truth > 0 || h.p90 > 0);
  const within = (name: string, p: number, hit: (h: HoursSample) => boolean) => {
    const groups = results.map((r) => {
      const cases = told(r);
      return { hits: cases.filter(hit).length, cases: cases.length };
    });
    const b = binomialInterval(p, groups);
    const target = {
      least: Number((100 * b.low).toFixed(1)),
      most: Number((100 * b.high).toFixed(1)),
    };
    const note = `${b.cases} cases that count as ${b.effective.toFixed(0)}`;
    return figure(name, b.cases === 0 ? null : 100 * b.share, '%', goals && target, note);
  };
  out.push(
    within('truth below p90', 0.1, (h) => h.truth < h.p90),
    within('truth inside p90..p10', 0.8, (h) => h.truth >= h.p90 && h.truth <= h.p10),
  );
  const none = results.flatMap((r) => r.hours.filter((h) => h.truth === 0));
  const firm = none.filter((h) => h.p90 > 0).length;
  if (none.length > 0) {
    out.push(figure('  p90 above zero where truth is zero', firm, '', null, `of ${none.length}`));
  }
  for (const [name, tau] of [
    ['p90', 0.1],
    ['p50', 0.5],
  ] as const) {
    if (all.length === 0) continue;
    const own = pinball(
      tau,
      all.map((h) => ({ truth: h.truth, quantile: h[name] })),
    );
    const line = bestShiftedPinball(
      tau,
      all.map((h) => ({ truth: h.truth, forecast: h.line })),
    );
    out.push(
      figure(
        `pinball loss of ${name}`,
        own,
        'h',
        goals && { most: Number(line.loss.toPrecision(4)) },
        `straight lines at their best, ${line.shift.toFixed(2)} h added`,
      ),
    );
  }
  return out;
}
