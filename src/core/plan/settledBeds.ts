import { temperatureAt } from '../bed/tables.js';
import { settledCycle } from '../cycle/settledCycle.js';
import type { AheadModel, BedsAhead } from './bedsAhead.js';

/** Steps of the cycle that is settled [s]: its shape does not change with shorter ones. */
const STEP_S = 120;

/**
 * Beds as they are when charged in a settled cycle of the unit (see settledCycle): all streams of a
 * store alike, steel and lids as warm as the rock beside them. For where the present beds can neither
 * be charged nor discharged, one store being full and the other empty.
 *
 * @returns null where such a cycle gives nothing either
 */
export function settledFull(model: AheadModel): BedsAhead | null {
  const { unit, machine, stores } = model;
  const cells = stores[0]?.tubes[0]?.enthalpy.length as number;
  let before: 'charge' | 'discharge' | 'stand' = 'stand';
  let full: Float64Array[] = [];
  settledCycle(unit, machine, {
    cells,
    step_s: STEP_S,
    each: ({ mode, enthalpy }) => {
      if (mode === 'discharge' && before !== 'discharge') full = enthalpy.map((own) => own.slice());
      before = mode;
    },
  });
  if (full.length === 0) return null;
  const temperatures = stores.map((store, s) =>
    (full[s] as Float64Array).map((h) => temperatureAt(store.tables, h)),
  );
  const end = (s: number, i: number): number => temperatures[s]?.at(i) as number;
  return {
    beds: stores.map((store, s) => store.tubes.map(() => (full[s] as Float64Array).slice())),
    steels: stores.map((store, s) =>
      store.tubes.map((tube) =>
        tube.wall === undefined ? null : (temperatures[s] as Float64Array).slice(),
      ),
    ),
    ends_K: stores.map((_, s) => ({ charge_inlet: end(s, 0), discharge_inlet: end(s, -1) })),
    left_K: stores.map((_, s) => end(s, 0)),
  };
}
