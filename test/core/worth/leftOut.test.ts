import { describe, expect, it } from 'vitest';
import { unitWith } from '../../../tools/score/sensorSets.js';
import { modelOf } from '../track/plants.js';
import { courseThrough, frontAt, weighed } from './courses.js';
import { drivesOf, SCAN_S, watchStore } from './leftOut.js';

const SEEDS = [1, 2, 3, 4, 5, 6, 7, 8, 9, 10];
/** Student's t for a two-sided 99 % and nine degrees of freedom. */
const T_99 = 3.25;
/** The estimate takes the loss in for this long before its errors count. */
const SETTLING_S = 3600;

const mean = (x: readonly number[]): number => x.reduce((a, b) => a + b, 0) / x.length;
const meanSquare = (x: readonly number[]): number => mean(x.map((v) => v * v));

describe('against the finer plant, with five thermocouples on one string of the hot store', () => {
  // The middle three share a card; it is lost after a cycle, and the errors of the next cycle count.
  const unit = unitWith('five', 'class');
  const [known] = unit.stores;
  const store = {
    ...known!,
    strings: known!.strings.map((string) => ({
      ...string,
      thermocouples: string.thermocouples.map((t, i) => ({
        ...t,
        group: i > 0 && i < 4 ? 'card' : null,
      })),
    })),
  };
  const lost = new Set(store.strings[0]!.thermocouples.slice(1, 4).map((t) => t.id));
  const from = SETTLING_S / SCAN_S;
  const runs = SEEDS.map((seed) => watchStore(store, unit.estimator, seed, [new Set(), lost]));

  const squares = (kind: 'error' | 'sigma', which: 0 | 1): number[] =>
    runs.map((run) => meanSquare(run[which]![kind].slice(from)));
  const logRatio = (with_: readonly number[], without: readonly number[]): number =>
    0.5 * Math.log(mean(without) / mean(with_));

  const model = modelOf(store, unit.estimator);
  const drives = drivesOf(store);
  const course = courseThrough(frontAt(model, 0.18, 0.08), drives, {
    loss_at: drives.length / 2,
    weigh_from: drives.length / 2 + from,
  });
  const told = weighed(model, course);
  const [card] = told.groups;
  const all = told.strings[0]!.all.soc_sigma_rms;
  const toldRatio = Math.log(card!.string!.soc_sigma_rms / all);

  it('the sigmas told are those of an estimator that runs with and without them', () => {
    // Drawn beds flow and transfer otherwise than the model of the course: a tenth of sigma.
    expect(Math.sqrt(mean(squares('sigma', 0))) / all).toBeGreaterThan(0.9);
    expect(Math.sqrt(mean(squares('sigma', 0))) / all).toBeLessThan(1.1);
    const ratio = logRatio(squares('sigma', 0), squares('sigma', 1));
    expect(Math.abs(ratio - toldRatio)).toBeLessThan(0.1);
  });

  it('true errors rise as told, within the 99 % interval of ten seeds, which excludes no rise at all', () => {
    const errors = [squares('error', 0), squares('error', 1)] as const;
    const ratio = logRatio(...errors);
    // Standard error of the log ratio by the jackknife over seeds.
    const left = SEEDS.map((_, k) =>
      logRatio(
        errors[0].filter((_, i) => i !== k),
        errors[1].filter((_, i) => i !== k),
      ),
    );
    const spread = meanSquare(left.map((r) => r - mean(left))) * SEEDS.length;
    const half = T_99 * Math.sqrt(((SEEDS.length - 1) / SEEDS.length) * spread);
    expect(Math.abs(ratio - toldRatio)).toBeLessThan(half);
    expect(ratio - half).toBeGreaterThan(0);
  });
});
