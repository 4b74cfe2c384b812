import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { RestReading } from './standingFit.js';
import {
  CONDUCTIVITY_STEP,
  copyBeds,
  rockAt,
  type StandingBeds,
  standOn,
  VARIANTS,
  type Variant,
} from './standingModel.js';

/** The standing models are marched this often; readings are averaged over so long [s]. */
const STEP_S = 1800;
export const MEAN_S = 3600;

type Rock = ReturnType<typeof rockAt>;

/** Readings of an hour of rest, and the standing models in its middle. Plain. */
interface Hour {
  /** By tube and sensor [K]; NaN where it was not believed throughout. */
  readonly mean_K: Float64Array;
  readonly rock: Readonly<Record<Variant, Rock>>;
}

/** One rest of one store, followed by readings and by models that start from one estimate. Plain. */
export interface Rest {
  readonly beds: Readonly<Record<Variant, StandingBeds>>;
  march_s: number;
  /** Of the hour that runs: time, sums of readings and their count by sensor, models in its middle. */
  hour_s: number;
  readonly sum_K: Float64Array;
  readonly count: Float64Array;
  middle: Readonly<Record<Variant, Rock>> | null;
  first: Hour | null;
}

/** A rest that begins with the beds as they are estimated now. */
export function startRest(model: StoreModel, state: StoreState): Rest {
  const sensors = model.channels.flat().length;
  const beds = VARIANTS.map((variant) => [variant, copyBeds(model, state)]);
  return {
    beds: Object.fromEntries(beds),
    march_s: 0,
    hour_s: 0,
    sum_K: new Float64Array(sensors),
    count: new Float64Array(sensors),
    middle: null,
    first: null,
  };
}

/**
 * Takes one scan of a rest.
 *
 * @param rest changed in place
 * @returns every hour from the second on, what the readings have moved by since the first, against the
 *   models; else null
 */
export function stepRest(
  rest: Rest,
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  ambient_K: number,
  dt_s: number,
): RestReading[] | null {
  rest.march_s += dt_s;
  rest.hour_s += dt_s;
  let at = 0;
  model.channels.forEach((row, k) => {
    row.forEach((channel, s) => {
      const value = values[channel] as number;
      const memory = state.sensors[k]?.[s];
      // A step of its card is no movement of the rock; with a verdict it tells nothing.
      if (memory?.verdict !== null || memory.shift_K !== 0) rest.sum_K[at] = Number.NaN;
      else if (Number.isFinite(value)) {
        rest.sum_K[at] = (rest.sum_K[at] as number) + value;
        rest.count[at] = (rest.count[at] as number) + 1;
      }
      at++;
    });
  });
  if (rest.march_s >= STEP_S) {
    for (const variant of VARIANTS)
      standOn(model, variant, rest.beds[variant], ambient_K, rest.march_s);
    rest.march_s = 0;
    if (rest.middle === null && rest.hour_s >= MEAN_S / 2) {
      rest.middle = Object.fromEntries(
        VARIANTS.map((variant) => [variant, rockAt(model, rest.beds[variant])]),
      ) as Record<Variant, Rock>;
    }
  }
  if (rest.hour_s < MEAN_S || rest.middle === null) return null;
  const mean_K = rest.sum_K.map((sum, i) => sum / (rest.count[i] as number));
  const hour: Hour = { mean_K, rock: rest.middle };
  rest.sum_K.fill(0);
  rest.count.fill(0);
  rest.hour_s = 0;
  rest.middle = null;
  if (rest.first === null) {
    rest.first = hour;
    return null;
  }
  return changes(model, rest.first, hour);
}

function changes(model: StoreModel, first: Hour, now: Hour): RestReading[] {
  const readings: RestReading[] = [];
  let at = -1;
  model.tubes.forEach(({ string }, k) => {
    for (const { group } of string.thermocouples) {
      at++;
      const i = at;
      const moved = (variant: Variant): number =>
        (now.rock[variant].temperature_K[i] as number) -
        (first.rock[variant].temperature_K[i] as number);
      const own = moved('as_configured');
      const off_K = (now.mean_K[i] as number) - (first.mean_K[i] as number) - own;
      if (!Number.isFinite(off_K)) continue;
      readings.push({
        off_K,
        mantle_K: moved('mantle') - own,
        ends_K: moved('ends') - own,
        conductivity_K: (moved('conductivity') - own) / Math.log(CONDUCTIVITY_STEP),
        slope_K_m: first.rock.as_configured.slope_K_m[i] as number,
        bent_K_m:
          (now.rock.as_configured.slope_K_m[i] as number) -
          (first.rock.as_configured.slope_K_m[i] as number),
        moved_K: own,
        string: k,
        group,
      });
    }
  });
  return readings;
}
