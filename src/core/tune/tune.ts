import type { UnitModel } from '../unitModel.js';
import { bedLaws, combine } from './combine.js';
import { describe } from './describe.js';
import { evidenceOf } from './evidence.js';
import { fitStore } from './fitStore.js';
import type { StoreFit } from './fitTypes.js';
import { machineWork } from './machineWork.js';
import { tunePriors } from './priors.js';
import type { TuneRecord } from './record.js';
import type { TuneRefusal, TuneResult } from './result.js';

/** Least that a recording must hold: hours in all, hours of flow. */
export const LEAST_HOURS = 3;
export const LEAST_FLOW_HOURS = 1;
/** Told between rounds of the fit, for a progress line: share of the work done. */
export type OnProgress = (store: string, round: number) => void;

/**
 * Tunes a unit's factors to a thinned recording: each store by itself (`fitStore`), the machine's work
 * per metered kilogram (`machineWork`), then all together with what is known before (`combine`), and
 * says of each value whether the recording determines it.
 *
 * @returns the result, or a reason why there is none
 */
export function tuneUnit(
  model: UnitModel,
  record: TuneRecord,
  onProgress: OnProgress = () => undefined,
): { readonly result: TuneResult } | { readonly refusal: TuneRefusal } {
  const { unit } = model;
  const refusal = refuse(model, record);
  if (refusal !== null) return { refusal };
  const priors = tunePriors(unit.estimator);
  const fits: StoreFit[] = [];
  for (const [s, store] of model.stores.entries()) {
    const fit = fitOrNull(() =>
      fitStore(store, unit.estimator, priors, record.bins, s, (round) =>
        onProgress(store.store.id, round),
      ),
    );
    if (fit === null || !fit.values.every(Number.isFinite)) return { refusal: 'cannot_follow' };
    fits.push(fit);
  }
  const running = record.bins.filter((bin) => bin.flow_kg_s !== 0);
  const meanFlow = running.reduce((sum, bin) => sum + Math.abs(bin.flow_kg_s), 0) / running.length;
  const laws = model.stores.map((store) => bedLaws(store, meanFlow));
  const work = {
    charge: machineWork(unit, model.machine, record, 'charge'),
    discharge: machineWork(unit, model.machine, record, 'discharge'),
  };
  const combined = combine(model.stores, fits, laws, work, priors);
  const evidence = model.stores.map((store, s) => evidenceOf(store, record, s));
  return { result: describe(model, record, fits, work, combined, priors, evidence) };
}

/** A system that is not positive definite comes of readings that no bed gives: null. */
function fitOrNull(attempt: () => StoreFit): StoreFit | null {
  try {
    return attempt();
  } catch (error) {
    if (error instanceof RangeError) return null;
    throw error;
  }
}

function refuse(model: UnitModel, record: TuneRecord): TuneRefusal | null {
  const { bins } = record;
  if (bins.length === 0) return 'no_rows';
  const hours = (of: (flow: number) => boolean) =>
    bins.reduce((sum, bin) => sum + (of(bin.flow_kg_s) ? bin.dt_s : 0), 0) / 3600;
  if (hours(() => true) < LEAST_HOURS) return 'too_short';
  if (hours((flow) => flow !== 0) < LEAST_FLOW_HOURS) return 'no_flow';
  const seen = model.stores.every((store, s) => {
    let n = 0;
    return store.store.strings.every((string) => {
      const first = n;
      n += string.thermocouples.length;
      return string.thermocouples.some((_, j) =>
        bins.slice(0, 3).some((bin) => Number.isFinite(bin.readings[s]?.[first + j] as number)),
      );
    });
  });
  return seen ? null : 'no_thermocouples';
}
