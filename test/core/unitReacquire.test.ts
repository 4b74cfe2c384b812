import { describe, expect, it } from 'vitest';
import type { Mode, Segment } from '../plant/truth.js';
import { chargeErrors, H, verdictsOf, WatchedPlant } from '../support/truthRun.js';

function segment(mode: Mode, hours: number): Segment {
  const power_W = mode === 'charge' ? 2.4e6 : 1.6e6;
  return { mode, duration_s: hours * H, ...(mode === 'stand' ? {} : { power_W }) };
}

describe('after a gap in which the mode changed unseen', () => {
  it.each<[Mode, Mode, number, number]>([
    ['charge', 'discharge', 1.5, 1],
    ['discharge', 'charge', 1.5, 2],
    ['stand', 'discharge', 2, 3],
    ['stand', 'charge', 0.4, 5],
  ])(
    'the charge is known again within ten scans: %s, then %s for %d h',
    (seen, hidden, hours, seed) => {
      const plant = new WatchedPlant({ seed });
      plant.watch([segment(seen, 0.7)]);
      plant.hide([segment(hidden, hours)]);
      const steps = plant.watch([segment(hidden, 0.4)]);
      for (const { store, error, sigma, scan } of chargeErrors(steps)) {
        if (scan < 9) continue;
        expect(Math.abs(error), `${store}, scan ${scan}`).toBeLessThan(0.01);
        // Errors that stand for a while: two sigma would fail one seed in twenty, three one in 400.
        expect(Math.abs(error) / sigma, `${store}, scan ${scan}`).toBeLessThan(3);
      }
      // No sensor pays for the estimate that was lost.
      expect([...verdictsOf(steps)]).toEqual([]);
      expect(steps.at(-1)?.estimate.quality).toBe('good');
    },
  );

  it('sigma has covered meanwhile where the front may be, and the estimate is called blind', () => {
    const plant = new WatchedPlant({ seed: 6 });
    plant.watch([segment('charge', 1)]);
    const hidden = plant.hide([segment('discharge', 1)]);
    for (const { store, error, sigma, scan } of chargeErrors(hidden)) {
      // The flow is held for two scans; from then on it may be any of either direction.
      if (scan >= 5) expect(Math.abs(error) / sigma, `${store}, scan ${scan}`).toBeLessThan(3);
    }
    for (const { estimate } of hidden.slice(3)) {
      expect(['blind', 'stale']).toContain(estimate.quality);
    }
  });
});
