import type { CommandCause } from './leg.js';
import { writtenIn } from './localTime.js';
import type { OffersAsk } from './offerAsk.js';
import type { OfferAt, OfferBlock } from './offerFigures.js';
import type { Offer } from './offers.js';

/** An offer as it is handed out: times in ISO 8601 with offset. */
export interface WrittenOffer
  extends Omit<Offer, 'start_s' | 'begins_s' | 'limited' | 'blocks' | 'at'> {
  readonly start: string;
  readonly begins: string;
  readonly limited: {
    readonly cause: CommandCause;
    readonly from: string;
    readonly to: string;
    readonly missing_MW_el: number;
  }[];
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
  return {
    block_s: ask.block_s,
    certainties: [...ask.certainties],
    time_zone: zone,
    offers: offers.map(({ start_s, begins_s, limited, blocks, at: figures, ...offer }) => ({
      ...offer,
      start: at(start_s),
      begins: at(begins_s),
      limited: limited.map(({ from_s, to_s, ...part }) => ({
        ...{ ...part, from: at(from_s), to: at(to_s) },
      })),
      at: [...figures],
      blocks: blocks.map(({ from_s, to_s, at: own, ...block }) => ({
        ...{ ...block, from: at(from_s), to: at(to_s) },
        at: [...own],
      })),
    })),
  };
}
