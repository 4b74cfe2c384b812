import type { PlantChange } from '../../../test/plant/faults.js';
import { base, cycle, row } from '../base.js';
import { type Figure, figure, median, ownValues, rms, worst } from '../figure.js';
import type { Scenario } from '../scenario.js';
import type { Series } from '../series.js';
import type { RowResult } from '../tally.js';
import { plain } from './plain.js';

/** Heat transfer of both stores is this share of what was drawn, from the start. */
function poorTransfer(factor: number): () => PlantChange[] {
  return () =>
    (['hot', 'cold'] as const).map((store) => ({ kind: 'heat_transfer', at_s: 0, store, factor }));
}

/** Heat-transfer factors at the end against the truth. */
function heatTransferOwn(series: Series): RowResult['own'] {
  const own: Record<string, number> = {};
  const n = series.to - 1;
  for (const [id, store] of Object.entries(series.stores)) {
    const truth = series.recording.truth(`${id}.heat_transfer_factor`, n);
    const [value, sigma] = [store.transfer[n]!, store.transfer_sigma[n]!];
    own[`sigmas ${id}`] = (value - truth) / sigma;
    own[`relative ${id}`] = 100 * (value / truth - 1);
    own[`sigma share ${id}`] = (100 * sigma) / value;
  }
  return own;
}

function heatTransferFigures(results: readonly RowResult[]): Figure[] {
  const all = (name: string) =>
    ['hot', 'cold'].flatMap((id) => ownValues(results, `${name} ${id}`));
  const sigmas = all('sigmas');
  const inside = sigmas.filter((s) => Math.abs(s) <= 2).length;
  return [
    // Of normal errors 4.6 % lie beyond two sigma.
    figure(
      'factor within two of its sigmas',
      sigmas.length === 0 ? null : (100 * inside) / sigmas.length,
      '%',
      { least: 95 },
      `${inside} of ${sigmas.length}, worst ${(worst(sigmas) ?? Number.NaN).toFixed(1)} sigma`,
    ),
    figure('  truth over sigma, rms', rms(sigmas), ''),
    figure('  error, rms', rms(all('relative')), '%'),
    figure('sigma of the factor over its value, worst', worst(all('sigma share')), '%', {
      most: 35,
      each: true,
    }),
    figure('  the same, median', median(all('sigma share')), '%'),
  ];
}

export const HEAT_TRANSFER: readonly Scenario[] = [70, 50, 16].map((percent) => ({
  ...base,
  id: `transfer-${percent}`,
  code: 'heatTransfer',
  words: `heat transfer at ${percent} %`,
  truth: {
    id: `transfer-${percent}`,
    machine: 'random',
    segments: cycle,
    changes: poorTransfer(percent / 100),
    hours_every_min: null,
  },
  rows: [row('all', 'independent')],
  run: plain(false, heatTransferOwn),
  figures: (_, results) => heatTransferFigures(results),
  hours: false,
  goals: 'none',
}));
