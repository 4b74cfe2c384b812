import { MODEL_SIGMA } from '../dispatch/hours.js';
import { addProfile } from '../dispatch/profileCovariance.js';
import { BUMP_K, BUMPS } from '../dispatch/roller.js';
import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreState } from '../track/storeTracker.js';
import { unseenSigma } from '../track/unseenFlow.js';
import type { UnitModel } from '../unitModel.js';
import type { Change, Outlook } from './outlook.js';
import { AMBIENT_SIGMA_K, PROBE_AMBIENT_K, PROBE_LOG } from './spread.js';
import type { WatchedMarches } from './watchedMarches.js';

/** One sigma of the states of charge at one time [-]. */
export interface ChargeSigma {
  readonly stores: readonly number[];
  readonly unit: number;
}

/**
 * Sigmas at the present: see storeEnergy; of the unit as at the marks.
 *
 * @param unit the unit's state of charge
 */
export function sigmaNow(outlook: Outlook, perCharge: number, unit: number): ChargeSigma {
  const { model, state, calibration } = outlook;
  const energies = model.stores.map((store, s) =>
    storeEnergy(store, state.stores[s] as StoreState),
  );
  const [least] = [...energies].sort((a, b) => a.soc - b.soc);
  const work = calibration.covariance[energies.length]?.[energies.length] ?? 0;
  return {
    stores: energies.map(({ soc_sigma }) => soc_sigma),
    unit: Math.hypot(
      perCharge * (least?.soc_sigma ?? 0),
      unit * Math.sqrt(work + MODEL_SIGMA ** 2),
    ),
  };
}

/**
 * Sigmas of the states of charge at the marks of a plan: the gradient of each with respect to all
 * that is uncertain in the rules' times (see spreadOf), by the same marches. The unit's is taken as
 * that of the store that holds less times `perCharge`, what its heat is worth moving with the
 * machine's work.
 *
 * @param perCharge unit's state of charge over that of a store, both full
 * @param units the unit's state of charge at the marks
 */
export function sigmasAtMarks(
  outlook: Outlook,
  watched: WatchedMarches,
  perCharge: number,
  units: readonly number[],
): ChargeSigma[] {
  const { model, state, calibration } = outlook;
  const count = model.stores.length;
  const base = watched.at('march', {});
  // By mark: each store, then the unit by the store that holds less.
  const all = base.flatMap((socs, m) => {
    const stores = socs.map((_, s) => ({ m, s, scale: 1, unit: 0 }));
    const s = socs.indexOf(Math.min(...socs));
    return [...stores, { m, s, scale: perCharge, unit: units[m] as number }];
  });
  const slope = (kind: 'march' | 'marchFine', change: Change, delta: number): number[] => {
    const own = watched.at(kind, change);
    const from = watched.at(kind, {});
    return all.map(({ m, s, scale }) => {
      const step = (own[m]?.[s] as number) - (from[m]?.[s] as number);
      return Number.isFinite(step) ? (scale * step) / delta : 0;
    });
  };
  const covariance = all.map(() => new Float64Array(all.length));
  const factors = model.stores.map((store, s) => {
    const response = {
      bumps: Array.from({ length: BUMPS }, (_, bump) => slope('march', { store: s, bump }, BUMP_K)),
      flow: slope('march', { store: s, flow: PROBE_LOG }, PROBE_LOG),
      transfer: slope('marchFine', { store: s, transfer: PROBE_LOG }, PROBE_LOG),
    };
    return addProfile(store, state.stores[s] as StoreState, response, covariance);
  });
  const discharge = slope('march', { discharge: PROBE_LOG }, PROBE_LOG);
  factors.push(
    // The same heat is worth more electricity, whether any is given on the way or not.
    discharge.map((value, i) => value + (all[i]?.unit as number)),
    slope('march', { charge: PROBE_LOG }, PROBE_LOG),
  );
  const ambient = slope('march', { ambient_K: PROBE_AMBIENT_K }, PROBE_AMBIENT_K);
  const sigma = all.map(({ s, scale, unit }, i) => {
    let variance = covariance[i]?.[i] as number;
    variance += ((ambient[i] as number) * AMBIENT_SIGMA_K) ** 2;
    calibration.covariance.forEach((row, k) => {
      row.forEach((value, l) => {
        variance += (factors[k]?.[i] as number) * (factors[l]?.[i] as number) * value;
      });
    });
    const store = model.stores[s] as UnitModel['stores'][number];
    variance += (scale * unseenSigma(store, state.stores[s] as StoreState)) ** 2;
    variance += (unit * MODEL_SIGMA) ** 2;
    return Math.sqrt(Math.max(0, variance));
  });
  return base.map((_, m) => {
    const at = m * (count + 1);
    return { stores: sigma.slice(at, at + count), unit: sigma[at + count] as number };
  });
}
