import type { PlantChange } from '../../../test/plant/faults.js';
import { RandomStream } from '../../../test/plant/random.js';
import { scheduleFor } from '../../../test/plant/schedules.js';
import { base, H, row } from '../base.js';
import { type Figure, figure, ownValues, rms, worst } from '../figure.js';
import type { Scenario } from '../scenario.js';
import type { Series } from '../series.js';
import type { RowResult } from '../tally.js';
import { plain } from './plain.js';

/** Of the rated flow. */
const SHARE = 0.005;
/** The rest after the first charge [h]. */
const REST_H = [5, 41] as const;

/** Store and direction by lot: the gas drives the charge out, or on towards the discharge inlet. */
function leakOf(seed: number): { store: 'hot' | 'cold'; share: number } {
  const random = new RandomStream(seed, 'score leak');
  const store = random.uniform() < 0.5 ? 'hot' : 'cold';
  return { store, share: random.uniform() < 0.5 ? -SHARE : SHARE };
}

/** A valve leaks through one store from the start of the rest on. */
const leak = (seed: number): PlantChange[] => [
  { kind: 'leak', at_s: REST_H[0] * H, ...leakOf(seed) },
];

/** Errors during the rest and at its end, of the store that leaks and of the one that does not. */
function leakOwn(series: Series, seed: number): RowResult['own'] {
  const own: Record<string, number> = {};
  const last = REST_H[1] * 60 - 1;
  for (const [id, store] of Object.entries(series.stores)) {
    const which = id === leakOf(seed).store ? 'leaking' : 'tight';
    const error = (n: number) => store.soc[n]! - series.recording.truth(`${id}.soc`, n);
    let most = 0;
    for (let n = REST_H[0] * 60; n <= last; n++) {
      most = Math.max(most, Math.abs(error(n) / store.soc_sigma[n]!));
    }
    own[`error ${which}`] = 100 * error(last);
    own[`sigmas ${which}`] = most;
    own[`moved ${which}`] =
      100 *
      (series.recording.truth(`${id}.soc`, last) -
        series.recording.truth(`${id}.soc`, REST_H[0] * 60 - 1));
  }
  return own;
}

function leakFigures(results: readonly RowResult[]): Figure[] {
  const of = (name: string) => ownValues(results, name);
  return ['leaking', 'tight'].flatMap((which) => [
    figure(`${which} store: change over the rest, rms`, rms(of(`moved ${which}`)), '%'),
    figure('  state of charge at its end, rms', rms(of(`error ${which}`)), '%'),
    figure('  the same, worst', worst(of(`error ${which}`)), '%'),
    figure('  error over sigma within it, greatest', worst(of(`sigmas ${which}`)), ''),
  ]);
}

export const LEAK: Scenario = {
  ...base,
  id: 'leak',
  code: 'leak',
  words: 'charged, then 36 h standing with a leak of 0.5 % of the rated flow',
  truth: {
    id: 'leak',
    machine: 'random',
    segments: (g) => scheduleFor('standing', g, 44 * H),
    changes: leak,
    hours_every_min: null,
  },
  every: 2,
  rows: [row('all', 'class'), row('five', 'class')],
  run: plain(false, leakOwn),
  figures: (_, results) => leakFigures(results),
  hours: false,
  goals: 'none',
};
