import type { CommandCause } from './leg.js';
import { writtenIn } from './localTime.js';
import type { OffersAsk } from './offerAsk.js';
import type { OfferAt, OfferBlock } from './offerFigures.js';
import type { Limited } from './offerRoute.js';
import type { Offer } from './offers.js';

/** Part of what was asked that is left undone. */
interface WrittenLimited {
  readonly cause: CommandCause;
  readonly from: string;
  readonly to: string;
  readonly missing_MW_el: number;
}

/** An offer as it is handed out: times in ISO 8601 with offset. */
export interface WrittenOffer
  extends Omit<Offer, 'start_s' | 'begins_s' | 'limited' | 'plan_limited' | 'blocks' | 'at'> {
  readonly start: string;
  readonly begins: string;
  readonly limited: WrittenLimited[];
  readonly plan_limited: (WrittenLimited & { readonly leg: number })[];
  readonly at: OfferAt[];
  readonly blocks: WrittenBlock[];
}

export interface WrittenBlock extends Omit<OfferBlock, 'from_s' | 'to_s' | 'at'> {
  readonly from: string;
  readonly to: string;
  readonly at: OfferBlock['at'][number][];
}

export interface OfferTable {
  readonly block_s: number;
  readonly certainties: number[];
  /** Zone of the grid of blocks; null = UTC. */
  readonly time_zone: string | null;
  readonly offers: WrittenOffer[];
}

/** An offer table as it was answered, with its head. */
export type AnsweredOffers = OfferTable & Readonly<Record<string, unknown>>;

/** Digits of a figure as it is handed out: none of them is noise of the arithmetic. */
const DIGITS = 9;

function rounded<T>(value: T): T {
  if (typeof value === 'number') return Number(value.toPrecision(DIGITS)) as T;
  if (Array.isArray(value)) return value.map(rounded) as T;
  if (typeof value !== 'object' || value === null) return value;
  return Object.fromEntries(Object.entries(value).map(([key, one]) => [key, rounded(one)])) as T;
}

/**
 * @param now_ms time of the estimate, from which the offers' seconds count
 * @param zone IANA name in which times are written; null = UTC
 */
export function offerTable(
  offers: readonly Offer[],
  ask: OffersAsk,
  now_ms: number,
  zone: string | null,
): OfferTable {
  const at = (s: number): string => writtenIn(zone, Math.round(now_ms + s * 1000));
  const written = <T extends Limited>({ from_s, to_s, ...part }: T) => ({
    ...{ ...part, from: at(from_s), to: at(to_s) },
  });
  return {
    block_s: ask.block_s,
    certainties: [...ask.certainties],
    time_zone: zone,
    offers: offers.map(({ start_s, begins_s, blocks, at: figures, ...offer }) => ({
      ...rounded(offer),
      start: at(start_s),
      begins: at(begins_s),
      limited: rounded(offer.limited.map(written)),
      plan_limited: rounded(offer.plan_limited.map(written)),
      at: rounded([...figures]),
      blocks: blocks.map(({ from_s, to_s, at: own, ...block }) => ({
        ...{ ...rounded(block), from: at(from_s), to: at(to_s) },
        at: rounded([...own]),
      })),
    })),
  };
}
