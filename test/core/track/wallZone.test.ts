import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../../src/config/load.js';
import type { StoreDefinition } from '../../../src/core/definitions.js';
import { startStore, storeModel } from '../../../src/core/track/storeTracker.js';
import { streamsOf } from '../../../src/core/track/streams.js';
import { exchangeAtWall } from '../../../src/core/track/wallExchange.js';

const unit = loadSite(new URL('../../../config/demo.yaml', import.meta.url).pathname).units[0]!;

/** A store of the demonstration with strings at drawn radii, several of them at the outermost one. */
function drawn(index: number, radii: readonly number[], outermost: number, many: number) {
  const store = unit.stores[index]!;
  const radius = store.bed.diameter_m / 2;
  const places = [...radii.filter((r) => r < outermost - 0.05), ...Array(many).fill(outermost)];
  const strings = places.map((r, i) => ({
    ...store.strings[0]!,
    id: `s${i}`,
    radius_m: r * radius,
    area_share: 1 / places.length,
  }));
  const definition: StoreDefinition = { ...store, strings };
  const channels = strings.map((s) => s.thermocouples.map(() => 0));
  return storeModel(definition, unit.estimator, channels, channels);
}

const STORE = [
  fc.nat(unit.stores.length - 1),
  fc.array(fc.double({ min: 0.05, max: 0.9, noNaN: true }), { maxLength: 3 }),
  fc.double({ min: 0.2, max: 0.99, noNaN: true }),
  fc.integer({ min: 1, max: 6 }),
] as const;

describe('layers at the wall', () => {
  it('leave every stream a share above zero, and all shares add up to the bed', () => {
    fc.assert(
      fc.property(...STORE, (index, radii, outermost, many) => {
        const model = drawn(index, radii, outermost, many);
        const streams = streamsOf(model, startStore(model));
        for (const { share } of streams) expect(share).toBeGreaterThan(0);
        expect(streams.reduce((sum, { share }) => sum + share, 0)).toBeCloseTo(1, 9);
        for (const layer of model.wall!.layers) expect(layer.volumeRatio).toBeGreaterThan(0);
      }),
      { numRuns: 25 },
    );
  }, 30_000);

  it('pass on all heat but what the steel takes and loses', () => {
    fc.assert(
      fc.property(
        ...STORE,
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.double({ min: 5, max: 300, noNaN: true }),
        (index, radii, outermost, _many, hot, dt_s) => {
          const model = drawn(index, radii, outermost, 1);
          const wall = model.wall!;
          const last = wall.layers.length - 1;
          const top = model.tables.dH * model.tables.segments;
          const layers = wall.layers.map((_, l) =>
            Float64Array.of((0.2 + 0.1 * l + 0.2 * hot) * top),
          );
          const steel = Float64Array.of(290);
          const tube = Float64Array.of((0.3 + 0.5 * hot) * top);
          const own = wall.ringShare - wall.share;
          const heat = (): number =>
            own * tube[0]! +
            wall.layers.reduce((sum, { share }, l) => sum + share * layers[l]![0]!, 0) +
            wall.layers[last]!.share * wall.steel_J_m3K * steel[0]!;
          const before = heat();
          exchangeAtWall({ ...wall, loss_W_m3K: 0 }, model.tables, layers, steel, tube, {
            massFlux_kg_m2s: 0.3,
            ambient_K: 288,
            dt_s,
          });
          expect(Math.abs(heat() / before - 1)).toBeLessThan(1e-12);
        },
      ),
      { numRuns: 25 },
    );
  }, 30_000);
});
