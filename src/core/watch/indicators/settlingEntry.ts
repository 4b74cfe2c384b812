import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { TubeState } from '../../track/tube.js';
import { depthOf, type Place, rockAt, seenAt, stepEntering } from './settlingBed.js';

/** Gas that enters is followed so long; a run that ends before the lesser one tells nothing [s]. */
const TO_S = 1800;
const LEAST_S = 600;
/** Readings before the gas enters fade with this time [s]. */
const FADE_S = 300;
/** Thermowells lag by 30 to 180 s, evenly drawn: mean and one sigma [s]. */
const LAG_S = 105;
const LAG_SIGMA_S = 43;
/** A junction sees any share of the gas, 0.5 +/- 0.29. */
const GAS_SHARE = 0.5;
const GAS_SHARE_SIGMA = 0.29;
/** White noise of a scan, and of the means before the gas enters with what drifts since [K]. */
const SCAN_K = 0.2;
const BEFORE_K = 0.3;
/**
 * One sigma of gas less rock as the gas begins to enter: of the channel of the gas, which all places
 * share, and of the rock at a place [K].
 */
const GAS_K = 0.7;
const ROCK_K = 0.7;
/** Of a thermocouple's place [m], and of flow and heat capacity, as a share. */
const PLACE_M = 0.01;
const RATE_SHARE = 0.05;
/** Of what the model makes wrong else: the lid's steel takes of the leap first. */
const MODEL_SHARE = 0.1;
/** The share of what moves is not told less surely than this, or it has no value at all. */
const USELESS = 0.5;

/** As modelled, with gas 1 K warmer, and with a tenth more flow. */
const FASTER = 1.1;
const VARIANTS = [
  { warmer_K: 0, flow: 1 },
  { warmer_K: 1, flow: 1 },
  { warmer_K: 0, flow: FASTER },
] as const;

/** Signals at a place behind a thermowell [K]: what a junction shows, and how that hangs on what is uncertain. */
interface Signals {
  /** In gas, and in gas with a thermowell one sigma slower. */
  bare: number;
  slower: number;
  /** In rock; per kelvin of the gas; per unit of ln flow; gas less rock. */
  covered: number;
  warmer: number;
  faster: number;
  parted: number;
}

/** Sums over scans, x = bare less covered, y = reading less covered. */
interface Sums {
  xx: number;
  xy: number;
  x: number;
  slower: number;
  warmer: number;
  faster: number;
  parted: number;
}

/** Gas that enters at the top, from its first scan on. Plain. */
export interface Entry {
  /** Means before it entered [K]; NaN before the first reading. */
  gas_K: number;
  readonly read_K: number[];
  /** Time since it entered [s]; 0 while it does not. */
  since_s: number;
  /** Its value has been handed out. */
  told: boolean;
  /** Tubes moved on by the model alone since then, by variant, and their rock at the places at first [K]. */
  beds: Float64Array[][] | null;
  rock_K: number[];
  signals: Signals[];
  sums: Sums[];
}

export function startEntry(places: readonly Place[]): Entry {
  return { gas_K: Number.NaN, read_K: places.map(() => Number.NaN), ...calmed() };
}

const calmed = (): Omit<Entry, 'gas_K' | 'read_K'> => ({
  since_s: 0,
  told: false,
  beds: null,
  rock_K: [],
  signals: [],
  sums: [],
});

export interface EntryScan {
  /** Gas above the bed, and readings at the places [K]; NaN = none. */
  readonly gas_K: number;
  readonly read_K: readonly number[];
  /** Metered, + = charge [kg/m2s], where it enters at the top; 0 where it does not. */
  readonly massFlux_kg_m2s: number;
  readonly ambient_K: number;
  readonly dt_s: number;
}

/** Share of gas in what a place shows, 0 in rock and 1 in gas. */
export interface Leap {
  readonly value: number;
  /** One sigma: what is of this place alone, and what all places of the store share. */
  readonly own: number;
  readonly shared: number;
}

/**
 * How readings follow gas that begins to enter at the top at another temperature than the rock's. Over
 * half an hour, y = reading less what the bed model alone has it show in rock is regressed on x = what
 * it would show in gas less the same, all as changes since before the gas entered:
 *
 *   s = sum x y / sum x^2       0 in rock, 1 in gas
 *
 * A junction in gas is there within its thermowell's lag; rock a decimetre down takes its heat capacity
 * over that of the gas, a quarter of an hour. Whatever else errs by e(t) moves s by sum x e / sum x^2:
 * noise, level of gas and rock at first, place and flow, share of gas and lag of the junction, which
 * are summed alongside. Hence sigma follows from the contrast that there was; a few kelvins tell.
 *
 * @param entry changed in place
 * @returns once the gas has entered for half an hour, or has ceased after ten minutes or more, a value
 *   for each place; null for one of which nothing can be told; else an empty list
 */
export function followEntry(
  entry: Entry,
  model: StoreModel,
  state: StoreState,
  places: readonly Place[],
  scan: EntryScan,
): (Leap | null)[] {
  if (scan.massFlux_kg_m2s === 0) {
    const leaps = entry.since_s >= LEAST_S ? tell(entry, model, places) : [];
    calm(entry, scan);
    return leaps;
  }
  if (entry.told) return [];
  entry.beds ??= VARIANTS.map(() => state.tubes.map(({ enthalpy }) => enthalpy.slice()));
  if (entry.since_s === 0) begin(entry, model, places);
  entry.since_s += scan.dt_s;
  if (Number.isFinite(scan.gas_K) && scan.dt_s > 0) march(entry, model, state, places, scan);
  return entry.since_s >= TO_S ? tell(entry, model, places) : [];
}

function calm(entry: Entry, { gas_K, read_K, dt_s }: EntryScan): void {
  const keep = Math.exp(-dt_s / FADE_S);
  const towards = (was: number, now: number): number =>
    Number.isNaN(was) ? now : Number.isFinite(now) ? now + (was - now) * keep : was;
  entry.gas_K = towards(entry.gas_K, gas_K);
  read_K.forEach((now, i) => {
    entry.read_K[i] = towards(entry.read_K[i] as number, now);
  });
  if (entry.beds !== null) Object.assign(entry, calmed());
}

function begin(entry: Entry, model: StoreModel, places: readonly Place[]): void {
  const beds = entry.beds?.[0] as Float64Array[];
  entry.rock_K = places.map((place) =>
    rockAt(model, beds[place.tube] as Float64Array, depthOf(model, place)),
  );
  entry.signals = places.map(() => ({
    ...{ bare: 0, slower: 0, covered: 0, warmer: 0, faster: 0, parted: 0 },
  }));
  entry.sums = places.map(() => ({
    ...{ xx: 0, xy: 0, x: 0, slower: 0, warmer: 0, faster: 0, parted: 0 },
  }));
}

/** Moves the tubes on by the model, the signals behind it, and adds the readings. */
function march(
  entry: Entry,
  model: StoreModel,
  state: StoreState,
  places: readonly Place[],
  scan: EntryScan,
): void {
  const { gas_K, read_K, dt_s } = scan;
  const seen = VARIANTS.map((variant, v) =>
    model.tubes.flatMap((tube, k) => {
      const bed = entry.beds?.[v]?.[k] as Float64Array;
      const inlet_K = gas_K + variant.warmer_K;
      const massFlux_kg_m2s = variant.flow * scan.massFlux_kg_m2s;
      const entering = { ...scan, massFlux_kg_m2s, inlet_K };
      const lag_m = stepEntering(model, tube, state.tubes[k] as TubeState, bed, entering);
      return places.flatMap((place, i) =>
        place.tube === k
          ? [{ i, ...seenAt(model, bed, lag_m, depthOf(model, place), inlet_K) }]
          : [],
      );
    }),
  );
  const mixed = ({ gas, rock }: { gas: number; rock: number }): number =>
    GAS_SHARE * gas + (1 - GAS_SHARE) * rock;
  const keep = Math.exp(-dt_s / LAG_S);
  const keepSlower = Math.exp(-dt_s / (LAG_S + LAG_SIGMA_S));
  seen[0]?.forEach((own, n) => {
    const { i } = own;
    const now = entry.signals[i] as Signals;
    const level = mixed(own);
    const leap = gas_K - entry.gas_K;
    const other = (v: number): number => mixed(seen[v]?.[n] as typeof own) - level;
    const lagged = (was: number, is: number, share = keep): number => is + (was - is) * share;
    now.bare = lagged(now.bare, leap);
    now.slower = lagged(now.slower, leap, keepSlower);
    now.covered = lagged(now.covered, level - (entry.rock_K[i] as number));
    now.warmer = lagged(now.warmer, other(1));
    now.faster = lagged(now.faster, other(2) / Math.log(FASTER));
    now.parted = lagged(now.parted, own.gas - own.rock);
    const y = (read_K[i] as number) - (entry.read_K[i] as number) - now.covered;
    const x = now.bare - now.covered;
    if (!Number.isFinite(y) || !Number.isFinite(x)) return;
    const sums = entry.sums[i] as Sums;
    sums.xx += x * x;
    sums.xy += x * y;
    sums.x += x;
    sums.slower += x * (now.bare - now.slower);
    sums.warmer += x * now.warmer;
    sums.faster += x * now.faster;
    sums.parted += x * now.parted;
  });
}

function tell(entry: Entry, model: StoreModel, places: readonly Place[]): (Leap | null)[] {
  if (entry.told) return [];
  entry.told = true;
  return places.map((place, i) => {
    const { xx, xy, x, slower, warmer, faster, parted } = entry.sums[i] as Sums;
    if (!(xx > 0)) return null;
    const own = Math.hypot(
      SCAN_K / Math.sqrt(xx),
      (BEFORE_K * x) / xx,
      (ROCK_K * warmer) / xx,
      ((PLACE_M / depthOf(model, place)) * faster) / xx,
      (GAS_SHARE_SIGMA * parted) / xx,
      slower / xx,
    );
    const shared = Math.hypot((GAS_K * warmer) / xx, (RATE_SHARE * faster) / xx, MODEL_SHARE);
    return Math.hypot(own, shared) > USELESS ? null : { value: xy / xx, own, shared };
  });
}
