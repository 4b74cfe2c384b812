import type { OfferTable, WrittenOffer } from '../../core/plan/offerTable.js';
import { firstMinutesText } from '../firstMinutesText.js';
import { table } from '../table.js';

const percent = (share: number): string => `${Math.round(share * 100)} %`;
const two = (value: number): string => value.toFixed(2);
const three = (value: number): string => value.toFixed(3);

/** An offer table for people, block by block where asked. */
export function offersText(answer: OfferTable, blocks: boolean): string[] {
  const { certainties, offers } = answer;
  const header = [
    ...['start', 'MW_el', 'h p90', 'h p50'],
    ...certainties.map((c) => `MWh_el ${percent(c)}`),
    ...certainties.map((c) => `blocks ${percent(c)}`),
    'ends by',
  ];
  const rows = offers.map((offer) => [
    ...[offer.start, offer.power_MW_el, two(offer.hours.p90), two(offer.hours.p50)],
    ...offer.at.map((at) => three(at.energy_MWh_el)),
    ...offer.at.map((at) => at.whole_blocks.jointly),
    offer.refused ?? endsBy(offer),
  ]);
  return [
    table(header, rows),
    ...offers.flatMap(remarks),
    ...(blocks ? offers.flatMap((offer) => blockText(offer, certainties)) : []),
    `Blocks of ${answer.block_s / 60} min, whole with the plan and all before them; times in ${answer.time_zone ?? 'UTC'}.`,
    'MWh_el at the connection point, at least reached with the certainty that heads the column.',
  ];
}

function endsBy(offer: WrittenOffer): string {
  return Object.entries(offer.ends_by)
    .sort(([, a], [, b]) => b - a)
    .filter(([, share]) => share >= 0.005)
    .map(([cause, share]) => `${cause} ${percent(share)}`)
    .join(', ');
}

/** What a person must know beside the table. */
function remarks(offer: WrittenOffer): string[] {
  const name = `${offer.power_MW_el} MW_el from ${offer.start}`;
  const said: string[] = [];
  const drawn = offer.blocks.reduce((sum, block) => sum + block.drawn_MWh_el, 0);
  if (offer.begins !== offer.start && offer.refused === null) {
    said.push(`first power at ${offer.begins}, ${three(drawn)} MWh_el drawn before it`);
  }
  for (const { cause, from, to, missing_MW_el } of offer.refused === null ? offer.limited : []) {
    said.push(`${cause} leaves ${three(missing_MW_el)} MW_el undone from ${from} to ${to}`);
  }
  for (const { leg, cause, from, to, missing_MW_el } of offer.plan_limited) {
    const what = `${three(missing_MW_el)} MW_el of the plan's leg ${leg + 1} undone`;
    said.push(`${cause} leaves ${what} from ${from} to ${to}`);
  }
  if (offer.plan_stores_hold !== null && offer.plan_stores_hold < 0.995) {
    said.push(`the stores carry the plan until then with ${percent(offer.plan_stores_hold)}`);
  }
  if (offer.first_minutes !== undefined && offer.refused === null) {
    said.push(firstMinutesText(offer.first_minutes, 'given'));
  }
  if (offer.bid !== null) {
    const { certainty, energy_MWh_el } = offer.bid;
    said.push(`worth bidding ${three(energy_MWh_el)} MWh_el, at ${(certainty * 100).toFixed(1)} %`);
  }
  return said.length === 0 ? [] : [`${name}: ${said.join('; ')}.`];
}

function blockText(offer: WrittenOffer, certainties: readonly number[]): string[] {
  if (offer.blocks.length === 0) return [];
  const header = [
    'from',
    ...certainties.map((c) => `MWh_el ${percent(c)}`),
    ...['mean MWh_el', 'whole alone', 'whole jointly'],
    ...(offer.bid === null ? [] : ['bid MWh_el']),
  ];
  const rows = offer.blocks.map((block) => [
    block.from,
    ...block.at.map((at) => three(at.energy_MWh_el)),
    ...[three(block.mean_MWh_el), percent(block.whole.alone), percent(block.whole.jointly)],
    ...(offer.bid === null ? [] : [three(block.bid_MWh_el ?? 0)]),
  ]);
  return ['', `${offer.power_MW_el} MW_el from ${offer.start}:`, table(header, rows), ''];
}
