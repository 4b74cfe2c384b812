import type { BedsAhead } from './bedsAhead.js';
import type { LimitRun } from './limitToLimit.js';
import { type RunFigures, runFigures, toEmpty, type Usual, usualCharge } from './usual.js';

/** What energy costs, in any currency. */
export interface Prices {
  /** Of energy given, per MWh_el. */
  readonly price_per_MWh_el: number;
  /** Of energy taken, any sign: below 0 who takes is paid; absent: the same. */
  readonly charging_price_per_MWh_el?: number;
}

export const FLUSH_WAYS = ['full_charge', 'full_discharge'] as const;
export type FlushWay = (typeof FLUSH_WAYS)[number];

/** A flush against going on as usual; see `flushOf`. */
export interface Flush {
  readonly way: FlushWay;
  /** Why it is no flush; null: it is one. */
  readonly reason: string | null;
  readonly runs: RunFigures[];
  /** Against as usual, until both are empty for the first time; below 0 = less. */
  readonly takes_MWh_el: number;
  readonly gives_MWh_el: number;
  readonly takes_hours: number;
  /** What the energy taken would have given in a usual cycle, less what it gave. */
  readonly cost_MWh_el: number;
  /** More given by each following cycle from the same usual charge; below 0 = less. */
  readonly gains_MWh_el: number[];
  /**
   * After how many following cycles the gains have made up for the cost, for good: in money, lost time
   * included, where there are prices, else in MWh_el; null: not in those marched.
   */
  readonly pays_after_cycles: number | null;
  readonly money: FlushMoney | null;
}

export interface FlushMoney {
  /** Energy bought less energy sold, against as usual. */
  readonly energy_cost: number;
  /** What usual cycles would have earned in the hours it takes more; 0 where they earn nothing. */
  readonly lost_time_cost: number;
  /** More sold, and less bought, by each following cycle. */
  readonly gains: number[];
}

export interface FlushAnswer {
  readonly as_usual: {
    readonly runs: RunFigures[];
    /** Given by each following cycle. */
    readonly following_MWh_el: number[];
    readonly round_trip: number;
  };
  readonly ways: Flush[];
}

/** Cycles followed after a flush. */
const FOLLOWING = 3;
const J_PER_MWH = 3.6e9;

interface Programme {
  readonly first: readonly LimitRun[];
  readonly following: readonly { readonly charge: LimitRun; readonly discharge: LimitRun }[];
}

/**
 * What a full charge or a full discharge first would win back by sharpening the fronts.
 *
 * Three programmes are marched from the present beds. As usual: charged as
 * far as is usual, then a discharge to its rule. Full charge: on to the rule that ends it, then the same discharge. Full discharge: at once
 * to the rule that ends it. All three are then empty by the same rules, and three usual cycles
 * follow in each: what these give more, from the same energy, is what sharper fronts are worth. The
 * cost is counted up to when each is empty for the first time: with eta the round trip of a usual
 * cycle, C energy taken and D given,
 *
 *   cost = (D_usual - eta C_usual) - (D - eta C)
 *
 * @param prices for money; null: MWh_el alone
 */
export function flushOf(usual: Usual, prices: Prices | null): FlushAnswer {
  const first = usualCharge(usual, usual.now, usual.firstCharge_J);
  const base = programme(usual, [first, toEmpty(usual, first.end)]);
  const round_trip = roundTripOf(usual, base);
  return {
    as_usual: {
      runs: base.first.map(runFigures),
      following_MWh_el: base.following.map(({ discharge }) => discharge.energy_J / J_PER_MWH),
      round_trip,
    },
    ways: [
      weighed(
        'full_charge',
        round_trip,
        base,
        programme(usual, [usual.toFull, usual.toEmpty]),
        prices,
      ),
      weighed('full_discharge', round_trip, base, programme(usual, [usual.nowEmpty]), prices),
    ],
  };
}

/** After how many cycles the gains have made up for the cost, for good; null: not after all of them. */
function paysAfter(cost: number, gains: readonly number[]): number | null {
  let net = -cost;
  let since: number | null = net >= 0 ? 0 : null;
  gains.forEach((gain, n) => {
    net += gain;
    if (net < 0) since = null;
    else since ??= n + 1;
  });
  return since;
}

function programme(usual: Usual, first: readonly LimitRun[]): Programme {
  const following: { charge: LimitRun; discharge: LimitRun }[] = [];
  let beds: BedsAhead = (first.at(-1) as LimitRun).end;
  for (let n = 0; n < FOLLOWING; n++) {
    const charge = usualCharge(usual, beds);
    const discharge = toEmpty(usual, charge.end);
    following.push({ charge, discharge });
    beds = discharge.end;
  }
  return { first, following };
}

/** Of the last cycle marched; where beds cannot be moved, that of the usual cycle. */
function roundTripOf(usual: Usual, { following }: Programme): number {
  const { charge, discharge } = following.at(-1) as Programme['following'][number];
  return usual.locked ? usual.round_trip : discharge.energy_J / charge.energy_J;
}

function weighed(
  way: FlushWay,
  eta: number,
  base: Programme,
  own: Programme,
  prices: Prices | null,
): Flush {
  const sum = (runs: readonly LimitRun[], direction: LimitRun['direction']): number =>
    runs.reduce((all, run) => all + (run.direction === direction ? run.energy_J : 0), 0) /
    J_PER_MWH;
  const hours = (runs: readonly LimitRun[]): number =>
    runs.reduce((all, run) => all + run.hours, 0);
  const takes_MWh_el = sum(own.first, 'charge') - sum(base.first, 'charge');
  const gives_MWh_el = sum(own.first, 'discharge') - sum(base.first, 'discharge');
  const takes_hours = hours(own.first) - hours(base.first);
  const cost_MWh_el = eta * takes_MWh_el - gives_MWh_el;
  const gains_MWh_el = own.following.map(({ charge, discharge }, n) => {
    const usual = base.following[n] as Programme['following'][number];
    // A charge that its rule ends takes less; what it did not take is not lost.
    const less = usual.charge.energy_J - charge.energy_J;
    return (discharge.energy_J - usual.discharge.energy_J + eta * less) / J_PER_MWH;
  });
  const money = prices === null ? null : moneyOf(prices);
  const inAll: [number, readonly number[]] =
    money === null
      ? [cost_MWh_el, gains_MWh_el]
      : [money.energy_cost + money.lost_time_cost, money.gains];
  // As usual charged as far as the rules allow, or not at all: the very same runs.
  const same = takes_MWh_el === 0 && gives_MWh_el === 0;
  return {
    way,
    reason: same ? 'this is what is usual' : null,
    runs: own.first.map(runFigures),
    takes_MWh_el,
    gives_MWh_el,
    takes_hours,
    cost_MWh_el,
    gains_MWh_el,
    pays_after_cycles: same ? null : paysAfter(...inAll),
    money,
  };

  function moneyOf({ price_per_MWh_el: sold, charging_price_per_MWh_el: bought = sold }: Prices) {
    const { charge, discharge } = base.following.at(-1) as Programme['following'][number];
    const earns = (discharge.energy_J * sold - charge.energy_J * bought) / J_PER_MWH;
    const hoursOf = charge.hours + discharge.hours;
    const perHour = hoursOf > 0 ? Math.max(0, earns) / hoursOf : 0;
    return {
      energy_cost: takes_MWh_el * bought - gives_MWh_el * sold,
      lost_time_cost: Math.max(0, takes_hours) * perHour,
      gains: own.following.map((cycle, n) => {
        const usual = base.following[n] as Programme['following'][number];
        const more = cycle.discharge.energy_J - usual.discharge.energy_J;
        const less = usual.charge.energy_J - cycle.charge.energy_J;
        return (more * sold + less * bought) / J_PER_MWH;
      }),
    };
  }
}
