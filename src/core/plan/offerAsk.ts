import type { Mode, UnitDefinition } from '../definitions.js';
import { offsetOf, writtenIn } from './localTime.js';
import type { BidPrices } from './newsvendor.js';

/** Lengths of a block [s]: a quarter of an hour, half an hour, an hour. */
export const BLOCKS_S = [900, 1800, 3600] as const;
export type BlockSeconds = (typeof BLOCKS_S)[number];

/** A stretch of what the unit is meant to do until it is offered. */
export interface PlannedLeg {
  readonly mode: Mode;
  /** Net power at the connection point, at least 0 [W]. */
  readonly power_W: number;
  readonly from_ms: number;
  readonly to_ms: number;
}

/** Starts counted from the closing of the market: the first block from then on, and so many in all. */
export interface GateAsk {
  /** From now until delivery may begin at the earliest [s]. */
  readonly closes_before_s: number;
  readonly count: number;
  /** From one start to the next, a multiple of the block [s]. */
  readonly every_s: number;
}

/** What is asked of an offer table. */
export interface OffersAsk {
  /** Discharging, net at the connection point [W]. */
  readonly powers_W: readonly number[];
  /** When each offered discharge begins [ms since 1970], on the grid of blocks; or `gate`. */
  readonly starts_ms?: readonly number[];
  readonly gate?: GateAsk;
  readonly block_s: BlockSeconds;
  /** Probabilities with which a figure is at least reached, 0.50 to 0.99. */
  readonly certainties: readonly number[];
  /** What the unit does until the start; where nothing is planned it stands. Cut at each start. */
  readonly legs?: readonly PlannedLeg[];
  /** Longest discharge that is offered [s], a multiple of the block. */
  readonly horizon_s?: number;
  readonly prices?: BidPrices;
  /** Clock of who asks [ms since 1970]; a start before it is past. Absent: time of the estimate. */
  readonly asked_ms?: number;
}

/** Most powers times starts of one question: each is marched, through the plan too. */
export const MOST_OFFERS = 48;
export const MOST_LEGS = 48;
/** Most blocks of one offer, and most figures of a table: offers times blocks times certainties. */
export const MOST_BLOCKS = 200;
export const MOST_FIGURES = 24_000;
/** Longest discharge that is looked at, over the rated hours at rated power. */
const MOST_RATED = 4;
export const MOST_CERTAINTIES = 12;
const DAYS_MS = 7 * 86_400_000;
const LEAST_CERTAINTY = 0.5;
const GREATEST_CERTAINTY = 0.99;

/** A question that is wrong in one field. */
export class WrongQuestion extends RangeError {
  constructor(
    readonly field: string,
    readonly value: unknown,
    readonly expected: string,
  ) {
    super(`${field} = ${JSON.stringify(value)}: expected ${expected}`);
  }
}

/**
 * Starts that an offer table is asked for [ms since 1970], the question held against what can be
 * answered.
 *
 * @param now_ms time of the estimate
 * @throws WrongQuestion for a power that is not above 0, a block of another length, a certainty
 *   outside 0.50 to 0.99, a start that is past, more than 7 days off or not on the grid of blocks of
 *   the connection's time zone, legs that overlap or begin in the past, prices that say nothing, or more than can be answered
 *   in one go
 */
export function requireOffers(unit: UnitDefinition, now_ms: number, ask: OffersAsk): number[] {
  ask.powers_W.forEach((power, i) => {
    need(power > 0 && Number.isFinite(power), `powers_W[${i}]`, power, 'a finite number above 0');
  });
  need(ask.powers_W.length > 0, 'powers_W', [], 'at least one power');
  need(BLOCKS_S.includes(ask.block_s), 'block_s', ask.block_s, `one of ${BLOCKS_S.join(', ')}`);
  const { certainties } = ask;
  const within = `${LEAST_CERTAINTY} to ${GREATEST_CERTAINTY}`;
  certainties.forEach((c, i) => {
    const sound = c >= LEAST_CERTAINTY && c <= GREATEST_CERTAINTY;
    need(sound, `certainties[${i}]`, c, within);
  });
  const some = certainties.length > 0 && certainties.length <= MOST_CERTAINTIES;
  need(some, 'certainties', certainties, `1 to ${MOST_CERTAINTIES} numbers of ${within}`);
  requireWhole('horizon_s', ask.horizon_s, ask.block_s);
  const longest_s = MOST_BLOCKS * ask.block_s;
  const short = ask.horizon_s === undefined || ask.horizon_s <= longest_s;
  need(short, 'horizon_s', ask.horizon_s, `at most ${longest_s} s: ${MOST_BLOCKS} blocks`);
  requirePrices(ask.prices);
  const asked_ms = Math.max(now_ms, ask.asked_ms ?? now_ms);
  requirePlan(ask.legs ?? [], asked_ms);
  const starts = startsOf(unit, asked_ms, ask);
  const powers_W = [...new Set(ask.powers_W)];
  const count = powers_W.length * starts.length;
  need(count <= MOST_OFFERS, 'powers_W x starts_ms', count, `at most ${MOST_OFFERS} together`);
  const blocks = powers_W.reduce((sum, power) => {
    return sum + Math.ceil(longestOffer(unit, ask, power) / ask.block_s);
  }, 0);
  const figures = blocks * starts.length * new Set(certainties).size;
  const fewer = 'fewer of them, longer blocks or a shorter horizon';
  const product = 'powers_W x starts_ms x blocks x certainties';
  need(figures <= MOST_FIGURES, product, figures, `at most ${MOST_FIGURES} together: ${fewer}`);
  return starts;
}

/** Longest discharge that is offered at a power [s]: the horizon, or what is surely enough. */
export function longestOffer(unit: UnitDefinition, ask: OffersAsk, power_W: number): number {
  const rated_s = MOST_RATED * unit.rated_hours * 3600;
  const most_s = rated_s * Math.max(1, unit.rated_power_W / power_W);
  return Math.min(most_s, ask.horizon_s ?? MOST_BLOCKS * ask.block_s);
}

/** The same question with every power, start and certainty once, in the order they are first asked. */
export function distinct(ask: OffersAsk): OffersAsk {
  return {
    ...ask,
    powers_W: [...new Set(ask.powers_W)],
    certainties: [...new Set(ask.certainties)],
    ...(ask.starts_ms === undefined ? {} : { starts_ms: [...new Set(ask.starts_ms)] }),
  };
}

/** Whether a question that may be asked takes many seconds, so that hours should not wait for it. */
export function takesLong(ask: OffersAsk): boolean {
  const starts = ask.gate?.count ?? new Set(ask.starts_ms).size;
  return new Set(ask.powers_W).size * starts > MOST_OFFERS / 2 || (ask.legs ?? []).length > 8;
}

/** The grid of blocks: clock times of the connection's zone, in UTC without one. */
export function nextOnGrid(unit: UnitDefinition, from_ms: number, block_s: number): number {
  const step = block_s * 1000;
  const shift = offsetOf(unit.limits.connection?.time_zone ?? null, from_ms);
  return Math.ceil((from_ms + shift) / step) * step - shift;
}

function startsOf(unit: UnitDefinition, asked_ms: number, ask: OffersAsk): number[] {
  const { gate, block_s } = ask;
  const zone = unit.limits.connection?.time_zone ?? null;
  if (gate !== undefined) {
    need(ask.starts_ms === undefined, 'starts_ms', ask.starts_ms, 'none beside a gate');
    const { closes_before_s, count, every_s } = gate;
    const sound = closes_before_s >= 0 && closes_before_s * 1000 <= DAYS_MS;
    need(sound, 'gate.closes_before_s', closes_before_s, '0 s to 7 days');
    const many = Number.isInteger(count) && count > 0;
    need(many, 'gate.count', count, 'a whole number above 0');
    requireWhole('gate.every_s', every_s, block_s);
    const first = nextOnGrid(unit, asked_ms + closes_before_s * 1000, block_s);
    const last = first + (count - 1) * every_s * 1000;
    need(last - asked_ms <= DAYS_MS, 'gate.count', count, 'starts within 7 days');
    return Array.from({ length: count }, (_, i) => first + i * every_s * 1000);
  }
  const starts = ask.starts_ms ?? [];
  need(starts.length > 0, 'starts_ms', starts, 'at least one start, or a gate');
  starts.forEach((start, i) => {
    const name = `starts_ms[${i}]`;
    need(Number.isFinite(start), name, start, 'ms since 1970');
    const earliest = writtenIn(zone, nextOnGrid(unit, asked_ms, block_s));
    const written = writtenIn(zone, start);
    need(start >= asked_ms, name, written, `${earliest} or later: that time is past`);
    need(start - asked_ms <= DAYS_MS, name, written, 'a start within 7 days');
    const next = nextOnGrid(unit, start, block_s);
    const before = writtenIn(zone, next - block_s * 1000);
    need(
      next === start,
      name,
      written,
      `the beginning of a block of ${block_s / 60} min, such as ${before} or ${writtenIn(zone, next)}`,
    );
  });
  return [...new Set(starts)];
}

function requirePlan(legs: readonly PlannedLeg[], asked_ms: number): void {
  let last = Number.NEGATIVE_INFINITY;
  need(legs.length <= MOST_LEGS, 'legs', legs.length, `at most ${MOST_LEGS} legs`);
  legs.forEach((leg, i) => {
    const name = `legs[${i}]`;
    const sound = leg.power_W >= 0 && Number.isFinite(leg.power_W);
    need(sound, `${name}.power_W`, leg.power_W, 'a finite number, 0 or more');
    const at = (ms: number): string => (Number.isFinite(ms) ? writtenIn(null, ms) : String(ms));
    need(leg.to_ms > leg.from_ms, `${name}.to_ms`, at(leg.to_ms), `later than ${at(leg.from_ms)}`);
    const begins = leg.from_ms >= asked_ms;
    const earliest = `${at(asked_ms)} or later: that time is past`;
    need(begins, `${name}.from_ms`, at(leg.from_ms), earliest);
    const ordered = leg.from_ms >= last;
    need(ordered, `${name}.from_ms`, at(leg.from_ms), `${at(last)} or later: legs in order`);
    last = leg.to_ms;
  });
}

function requirePrices(prices: BidPrices | undefined): void {
  if (prices === undefined) return;
  const { shortfall_per_MWh_el: short, surplus_per_MWh_el: surplus } = prices;
  const sound = short > 0 && Number.isFinite(short);
  need(sound, 'prices.shortfall_per_MWh_el', short, 'a finite number above 0');
  const also = surplus > 0 && Number.isFinite(surplus);
  need(also, 'prices.surplus_per_MWh_el', surplus, 'a finite number above 0');
}

function requireWhole(field: string, value: number | undefined, block_s: number): void {
  if (value === undefined) return;
  const sound = value > 0 && value % block_s === 0 && value * 1000 <= DAYS_MS;
  need(sound, field, value, `a multiple of the block of ${block_s} s, at most 7 days`);
}

function need(sound: boolean, field: string, value: unknown, expected: string): void {
  if (!sound) throw new WrongQuestion(field, value, expected);
}
