import { createBedWork } from '../../../src/core/bed/kernel.js';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import type { Gaussian } from '../../../src/core/dispatch/gaussian.js';
import type { HoursInput } from '../../../src/core/dispatch/hours.js';
import { machineSpread, partLoadFactor } from '../../../src/core/dispatch/machineSpread.js';
import { refined } from '../../../src/core/dispatch/refine.js';
import { type RolloutStore, rollOut } from '../../../src/core/dispatch/rollout.js';
import type { StoreState } from '../../../src/core/track/storeTracker.js';
import type { TubeState } from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';

/** Lower Cholesky factor of a tube's covariance; a pivot lost to round-off gives a zero column. */
export function factorOf(p: Float64Array, size: number): Float64Array {
  const l = new Float64Array(size * size);
  for (let j = 0; j < size; j++) {
    for (let i = j; i < size; i++) {
      let sum = p[i * size + j] as number;
      for (let k = 0; k < j; k++) sum -= (l[i * size + k] as number) * (l[j * size + k] as number);
      if (i === j) l[j * size + j] = Math.sqrt(Math.max(0, sum));
      else {
        const pivot = l[j * size + j] as number;
        l[i * size + j] = pivot > 1e-9 ? sum / pivot : 0;
      }
    }
  }
  return l;
}

/** Hours of `count` plants drawn from the same covariances, each rolled out by itself. */
export function sampledHours(input: HoursInput, power_W: number, count: number): number[] {
  const random = mulberry(99);
  const normal = (): number =>
    Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
  const factors = input.models.map((model, s) =>
    model.tubes.map((tube, k) =>
      factorOf(
        ((input.states[s] as StoreState).tubes[k] as TubeState).covariance,
        tube.layout.size,
      ),
    ),
  );
  const works = input.models.map((m) => m.tubes.map((t) => createBedWork(2 * t.layout.cells)));
  const calibration = input.calibration as Gaussian;
  const n = calibration.mean.length;
  const joint = factorOf(
    Float64Array.from(calibration.covariance.flatMap((row) => Array.from(row))),
    n,
  );
  const spread = machineSpread(input.unit);
  return Array.from({ length: count }, () => {
    const w = Float64Array.from({ length: n }, normal);
    const drawn = Array.from(calibration.mean, (value, i) => {
      let sum = value;
      for (let j = 0; j <= i; j++) sum += (joint[i * n + j] as number) * (w[j] as number);
      return Math.exp(sum);
    });
    const stores = input.models.map((model, s): RolloutStore => {
      const state = input.states[s] as StoreState;
      return {
        store: model.store,
        tables: model.tables,
        plenum_K: input.plenum_K[s] as number,
        tubes: model.tubes.map((tube, k) => {
          const { cells, size, transfer } = tube.layout;
          const own = state.tubes[k] as TubeState;
          const z = Float64Array.from({ length: size }, normal);
          const l = factors[s]?.[k] as Float64Array;
          const error = (i: number): number => {
            let sum = 0;
            for (let j = 0; j <= i; j++) sum += (l[i * size + j] as number) * (z[j] as number);
            return sum;
          };
          return {
            area_share: tube.string.area_share,
            enthalpy: own.enthalpy.map((h, i) =>
              enthalpyAt(model.tables, temperatureAt(model.tables, h) + error(i)),
            ),
            // At rest the filter ties nothing to the flow, which is what the calibration says.
            flowFactor: drawn[s] as number,
            heatTransferFactor: Math.exp(
              (own.further[transfer - cells] as number) + error(transfer),
            ),
            wallLoss_W_m3K: tube.wallLoss_W_m3K,
          };
        }),
      };
    });
    const { end_s } = rollOut(
      {
        unit: input.unit,
        machine: input.machine,
        stores: stores.map(refined),
        power_W,
        workFactor: drawn[n - 1] as number,
        partLoad: (flow_kg_s) => partLoadFactor(spread, 'discharge', flow_kg_s),
        ambient_K: input.ambient_K,
        step_s: 300,
        most_s: 48 * 3600,
      },
      works,
    );
    // What the rollout itself does not know: 0.2 % of the time.
    return (end_s * (1 + 0.002 * normal())) / 3600;
  }).sort((a, b) => a - b);
}
