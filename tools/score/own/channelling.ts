import type { PlantChange } from '../../../test/plant/faults.js';
import { base, cycle, row } from '../base.js';
import { type Figure, figure, ownValues, rms, worst } from '../figure.js';
import type { Scenario } from '../scenario.js';
import type { Series } from '../series.js';
import type { RowResult } from '../tally.js';
import { meanFlow } from './meanFlow.js';
import { plain } from './plain.js';

const STRINGS = ['axis', 'middle', 'rim'] as const;

/** One string of each store takes more than its share from the start, another one per seed and store. */
function channel(share: number): (seed: number) => PlantChange[] {
  return (seed) =>
    (['hot', 'cold'] as const).map((store, s) => ({
      kind: 'channelling',
      at_s: 0,
      store,
      string: STRINGS[(seed + s) % 3]!,
      factor: 1 + share,
    }));
}

/**
 * Flow factors of the tubes against the truth once the first charge has carried the fronts along.
 * What a tube gets is compared with the mean of its store, since a meter's error or a wrong heat
 * capacity moves all tubes alike and cannot be told from the fronts.
 */
function channellingOwn(series: Series): RowResult['own'] {
  const own: Record<string, number> = {};
  for (const store of series.unit.stores) {
    const errors: number[] = [];
    for (let n = SETTLED_H * 60; n < series.to; n++) {
      const mean = meanFlow(series, store.id, n);
      store.strings.forEach((string, k) => {
        const truth = series.recording.truth(`${store.id}.flow_${string.id}`, n);
        errors.push(series.stores[store.id]!.flow[k]![n]! / mean - truth);
      });
    }
    own[`flow worst ${store.id}`] = worst(errors) ?? Number.NaN;
    own[`flow rms ${store.id}`] = rms(errors) ?? Number.NaN;
  }
  return own;
}

/** End of the first charge [h]. */
const SETTLED_H = 5;

function channellingFigures(results: readonly RowResult[]): Figure[] {
  const all = (name: string) =>
    ['hot', 'cold'].flatMap((id) => ownValues(results, `${name} ${id}`));
  return [
    figure('flow factors after the first charge, worst', worst(all('flow worst')), '', {
      most: 0.03,
      each: true,
    }),
    figure('  the same, rms', rms(all('flow rms')), ''),
  ];
}

export const CHANNELLING: readonly Scenario[] = [5, 10, 22].map((percent) => ({
  ...base,
  id: `channel-${percent}`,
  code: 'channelling',
  words: `channelling of ${percent} %`,
  truth: {
    id: `channel-${percent}`,
    machine: 'random',
    segments: cycle,
    changes: channel(percent / 100),
    hours_every_min: null,
  },
  rows: [row('all', 'independent')],
  run: plain(false, channellingOwn),
  figures: (_, results) => channellingFigures(results),
  hours: false,
  goals: { soc_rms: 0.2 },
}));
