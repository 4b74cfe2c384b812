import { type Ends, meanCharge } from './ends.js';

/** Points of the way that the state of charge went, and what had been drawn and given until then. */
export interface Moments {
  readonly time_ms: number[];
  /** Mean of the stores' states of charge [-]. */
  readonly charge: number[];
  /** Counted from the first moment on [MWh_el]. */
  readonly drawn_MWh: number[];
  readonly delivered_MWh: number[];
  /** States of charge by store, one after another. */
  readonly socs: number[];
}

/** A round trip: from a moment of some state of charge to the next of the same. */
export interface RoundTrip {
  readonly from_ms: number;
  readonly drawn_MWh_el: number;
  readonly delivered_MWh_el: number;
  /** State of charge at the end less that at the beginning, by store. */
  readonly soc_left: readonly number[];
  /** Delivered over drawn, the latter by what makes up for the difference left of the mean. */
  readonly efficiency: number;
}

/** A new point where the state of charge has moved by so much. */
const STEP = 0.025;
/** Longest memory: four full cycles. */
const MOST = 320;
/** A trip tells something from this change of the state of charge on: its ends are known to some 0.3 %. */
const LEAST = 0.1;
/** As empty as before, where no moment was just as empty. */
const AS_EMPTY = 0.05;
/** Beyond this difference of one store the two moments are not the same state. */
const SAME = 0.05;

export function startMoments(): Moments {
  return { time_ms: [], charge: [], drawn_MWh: [], delivered_MWh: [], socs: [] };
}

/** Adds a moment; with `always` one that has not moved a step as well. */
export function addMoment(
  moments: Moments,
  ends: Ends,
  drawn_MWh: number,
  delivered_MWh: number,
  always: boolean,
): void {
  const charge = meanCharge(ends);
  const last = moments.charge[moments.charge.length - 1];
  if (!always && last !== undefined && Math.abs(charge - last) < STEP) return;
  moments.time_ms.push(ends.time_ms);
  moments.charge.push(charge);
  moments.drawn_MWh.push(drawn_MWh);
  moments.delivered_MWh.push(delivered_MWh);
  moments.socs.push(...ends.stores.map(({ soc }) => soc));
  if (moments.time_ms.length <= MOST) return;
  for (const list of [moments.time_ms, moments.charge, moments.drawn_MWh, moments.delivered_MWh])
    list.shift();
  moments.socs.splice(0, ends.stores.length);
}

/** Puts a moment of the past, the edge of a run, in the place of all points since. */
export function setEdge(
  moments: Moments,
  ends: Ends,
  drawn_MWh: number,
  delivered_MWh: number,
): void {
  while (
    (moments.time_ms[moments.time_ms.length - 1] ?? Number.NEGATIVE_INFINITY) >= ends.time_ms
  ) {
    for (const list of [moments.time_ms, moments.charge, moments.drawn_MWh, moments.delivered_MWh])
      list.pop();
    moments.socs.length -= ends.stores.length;
  }
  addMoment(moments, ends, drawn_MWh, delivered_MWh, true);
}

/**
 * Round trip that ends with the last moment, the end of a discharge that began at `discharge_ms`. It begins with the newest earlier
 * moment at which the mean of the stores' states of charge was the same, which lies in a charge: between
 * two points linearly. So nothing has to be said of the heat that stays in the stores, however full or
 * empty they were left, and of the losses of stands between the two moments all count. The stores' mean,
 * since one gas stream fills and empties both. Where no moment was as empty (a discharge that went
 * lower than ever), the emptiest one within `AS_EMPTY` is taken and what was drawn is extended in
 * proportion: drawn dz/(sum of all rises) more for dz below.
 *
 * @returns null where nothing is comparable: no such moment, less than `LEAST` in between, or a store
 *   that differs by more than `SAME`
 */
export function roundTrip(moments: Moments, discharge_ms: number): RoundTrip | null {
  const { charge, time_ms } = moments;
  const end = charge.length - 1;
  let before = end - 1;
  while (before >= 0 && (time_ms[before] as number) > discharge_ms) before--;
  if (before < 0) return null;
  const z = charge[end] as number;
  let most = before;
  while (before >= 0 && (charge[before] as number) > z) {
    if ((charge[before] as number) > (charge[most] as number)) most = before;
    before--;
  }
  const top = charge[most] as number;
  if (top - z < LEAST) return null;
  if (before >= 0) {
    const next = charge[before + 1] as number;
    const at = (z - (charge[before] as number)) / (next - (charge[before] as number));
    return between(moments, before, at, end, 1);
  }
  let emptiest = most;
  for (let i = most; i >= 0; i--) {
    if ((charge[i] as number) < (charge[emptiest] as number)) emptiest = i;
  }
  const low = charge[emptiest] as number;
  if (low - z > AS_EMPTY || top - low < LEAST) return null;
  let rise = 0;
  for (let i = emptiest + 1; i <= end; i++) {
    rise += Math.max(0, (charge[i] as number) - (charge[i - 1] as number));
  }
  return between(moments, emptiest, 0, end, 1 + (low - z) / rise);
}

/** From a moment, `at` of the way from point `i` to the next, until the point `end`. */
function between(
  moments: Moments,
  i: number,
  at: number,
  end: number,
  extended: number,
): RoundTrip | null {
  const stores = moments.socs.length / moments.charge.length;
  const part = (list: readonly number[], stride = 1, k = 0): number => {
    const a = list[i * stride + k] as number;
    const b = at === 0 ? a : (list[(i + 1) * stride + k] as number);
    return a + at * (b - a);
  };
  const soc_left = Array.from(
    { length: stores },
    (_, k) => (moments.socs[end * stores + k] as number) - part(moments.socs, stores, k),
  );
  const drawn = (moments.drawn_MWh[end] as number) - part(moments.drawn_MWh);
  const delivered = (moments.delivered_MWh[end] as number) - part(moments.delivered_MWh);
  if (!(drawn > 0) || soc_left.some((left) => Math.abs(left) > SAME)) return null;
  return {
    from_ms: Math.round(part(moments.time_ms)),
    drawn_MWh_el: drawn,
    delivered_MWh_el: delivered,
    soc_left,
    efficiency: delivered / (drawn * extended),
  };
}
