import { calibrate } from '../dispatch/calibration.js';
import type { Gaussian } from '../dispatch/gaussian.js';
import { machineSpread, partLoadFactor } from '../dispatch/machineSpread.js';
import { refined } from '../dispatch/refine.js';
import { type Perturbation, perturb, rolloutStore, tubesAlone } from '../dispatch/roller.js';
import type { RolloutStore } from '../dispatch/rollout.js';
import { streamsOf } from '../track/streams.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { type AheadModel, aheadWorks } from './bedsAhead.js';
import type { Command } from './command.js';
import { type Course, marchCourse } from './course.js';
import type { MarchOptions } from './episode.js';

/** What may differ from the estimate in a march: of one store, or of the machine or the weather. */
export interface Change extends Omit<Perturbation, 'work'> {
  /** ln of the work per metered kilogram. */
  readonly discharge?: number;
  readonly charge?: number;
  readonly ambient_K?: number;
}

/** Marches of one unit's present state; see `createOutlook`. */
export interface Outlook {
  readonly model: UnitModel;
  readonly state: UnitState;
  /** ln(mean flow factor) of each store, ln(work factor) discharging, charging; joint. */
  readonly calibration: Gaussian;
  /** For gradients: on the estimate's own cells, without layers at the wall. */
  march(command: Command, change?: Change, options?: Partial<MarchOptions>): Course;
  /** The same on half cells, where the transfer shows. */
  marchFine(command: Command, change?: Change, options?: Partial<MarchOptions>): Course;
  /** The best there is, with the layers at the wall on half cells. */
  best(command: Command, options?: Partial<MarchOptions>): Course;
  /** The beds and arrays of `best`, for marches that go on from where others ended. */
  beds(): { readonly ahead: AheadModel; readonly options: MarchOptions };
  /** Those of `march`. */
  bare(): { readonly ahead: AheadModel; readonly options: MarchOptions };
}

/** Steps of the marches for gradients and of the best, at rated power [s]. */
export const STEP_S = 300;
/** On half cells: a little shorter, so that the bed takes most steps in two pieces, not in three. */
export const FINE_STEP_S = 240;
/** How far past its end a run is followed: a reserve beyond is as good as certain [s]. */
export const BEYOND_S = 2 * 3600;

/**
 * What plans are marched from: beds, factors and machine as they are now.
 *
 * @param load power asked for over rated power [-], about which meter and machine are calibrated
 * @throws RangeError where a store has not started: there is nothing to march from
 */
export function createOutlook(model: UnitModel, state: UnitState, load = 1): Outlook {
  model.stores.forEach((store, s) => {
    if (state.stores[s]?.started !== true) {
      throw new RangeError(`store ${store.store.id} has no estimate yet: expected readings first`);
    }
  });
  const { unit } = model;
  const spread = machineSpread(unit);
  const calibration = calibrate(model, state, load, load).joint;
  const n = model.stores.length;
  const storesOf = (streams: typeof streamsOf): RolloutStore[] =>
    model.stores.map((own, s) =>
      rolloutStore(
        own,
        streams(own, state.stores[s] as UnitState['stores'][number]),
        state.plenum_K[s] as number,
        calibration.mean[s] as number,
      ),
    );
  const aheadOf = (stores: readonly RolloutStore[], change: Change): AheadModel => ({
    unit,
    machine: model.machine,
    stores,
    workFactor: {
      discharge: Math.exp((calibration.mean[n] as number) + (change.discharge ?? 0)),
      charge: Math.exp((calibration.mean[n + 1] as number) + (change.charge ?? 0)),
    },
    partLoad: (direction, flow) => partLoadFactor(spread, direction, flow),
    ambient_K: state.ambient_K + (change.ambient_K ?? 0),
  });
  const changed = (stores: readonly RolloutStore[], change: Change): RolloutStore[] =>
    stores.map((store, s) =>
      s === change.store
        ? perturb(model.stores[s] as UnitModel['stores'][number], store, change)
        : store,
    );
  const bare = storesOf(tubesAlone);
  const whole = storesOf(streamsOf);
  const go = (
    ahead: AheadModel,
    command: Command,
    step_s: number,
    works: MarchOptions['works'],
    options: Partial<MarchOptions> = {},
  ): Course => marchCourse(ahead, command, { step_s, beyond_s: BEYOND_S, works, ...options });
  const first = aheadOf(bare, {});
  const works = aheadWorks(first);
  let fine: MarchOptions['works'] | null = null;
  const fineWorks = (): MarchOptions['works'] => {
    fine ??= aheadWorks(aheadOf(whole.map(refined), {}));
    return fine;
  };
  return {
    model,
    state,
    calibration,
    march: (command, change = {}, options = {}) =>
      go(aheadOf(changed(bare, change), change), command, STEP_S, works, options),
    marchFine: (command, change = {}, options = {}) =>
      go(
        aheadOf(changed(bare, change).map(refined), change),
        command,
        FINE_STEP_S,
        fineWorks(),
        options,
      ),
    best: (command, options = {}) =>
      go(aheadOf(whole.map(refined), {}), command, FINE_STEP_S, fineWorks(), options),
    beds: () => ({
      ahead: aheadOf(whole.map(refined), {}),
      options: { step_s: FINE_STEP_S, beyond_s: 0, works: fineWorks() },
    }),
    bare: () => ({ ahead: first, options: { step_s: STEP_S, beyond_s: 0, works } }),
  };
}
