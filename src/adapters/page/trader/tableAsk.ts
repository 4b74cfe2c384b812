import { signal } from '@preact/signals';
import type { UnitDefinition } from '../lib/wire.js';
import { CERTAINTIES } from './words.js';

/** What the form of the offer table says; texts as they were typed. */
export interface TableForm {
  /** null: the usual powers of the unit. */
  readonly powers: string | null;
  readonly closes_before_min: string;
  readonly count: string;
  readonly every_min: string;
  readonly block_min: string;
  readonly shortfall: string;
  readonly surplus: string;
  readonly keep: boolean;
}

export const USUAL_FORM: TableForm = {
  powers: null,
  closes_before_min: '0',
  count: '4',
  every_min: '120',
  block_min: '60',
  shortfall: '',
  surplus: '',
  keep: false,
};

export const form = signal<TableForm>(USUAL_FORM);

/** Offer that is looked at closely; null: the greatest power from the first start. */
export const chosen = signal<{ power_MW_el: number; start: string } | null>(null);
/** Certainty of the large figures. */
export const certainty = signal(0.9);

const SHARES = [1, 0.8, 0.6, 0.4];
const ALIKE = 0.12;
/** What the server takes of powers times starts. */
const MOST_OFFERS = 48;

/** Powers worth a look: those configured, the rated one and parts of it that differ from them. */
export function usualPowers(definition: UnitDefinition): number[] {
  const { rated_power_MW_el: rated, hours_at_MW_el: configured } = definition;
  const powers = [...new Set([rated, ...configured])];
  for (const share of SHARES) {
    const power = Number((share * rated).toPrecision(2));
    if (powers.every((one) => Math.abs(one - power) > ALIKE * rated)) powers.push(power);
  }
  return powers.sort((a, b) => b - a);
}

export const powersText = (powers: readonly number[]): string => powers.join(' ');

/** Powers in MW between blanks or semicolons, decimal point or comma; or what is wrong, in words. */
export function readPowers(text: string, most = MOST_OFFERS): number[] | string {
  const words = text
    .split(/[;\s]+/)
    .map((word) => word.replace(/,$/, ''))
    .filter((word) => word !== '');
  if (words.length === 0) return 'Powers: at least one in MW, such as 1.8 1.2';
  const powers = words.map((word) =>
    /^(\d+([.,]\d*)?|[.,]\d+)$/.test(word) ? Number(word.replace(',', '.')) : Number.NaN,
  );
  const wrong = words[powers.findIndex((power) => !(power > 0))];
  if (wrong !== undefined) {
    return `Powers: “${wrong}” is no power in MW; such as 1.8 1.2, with blanks between them`;
  }
  const different = [...new Set(powers)].sort((a, b) => b - a);
  return different.length <= most ? different : `Powers: ${most} at most`;
}

function numberOf(text: string): number {
  const plain = text.trim().replace(',', '.');
  return plain === '' ? Number.NaN : Number(plain);
}

/** The question of the form; or what is wrong with it, in words. */
export function bodyOf(own: TableForm, definition: UnitDefinition): object | string {
  const powers = readPowers(own.powers ?? powersText(usualPowers(definition)));
  if (typeof powers === 'string') return powers;
  const closes = numberOf(own.closes_before_min);
  if (!(closes >= 0)) return 'Earliest start: minutes from now, 0 or more';
  const count = numberOf(own.count);
  if (!Number.isInteger(count) || count < 1) return 'Starts: a whole number, 1 or more';
  if (powers.length * count > MOST_OFFERS) {
    return `Starts: ${powers.length} powers from ${count} starts; ${MOST_OFFERS} offers can be asked for at once`;
  }
  const priced = [own.shortfall, own.surplus].map(numberOf);
  const some = [own.shortfall, own.surplus].some((text) => text.trim() !== '');
  if (some && !priced.every((price) => price > 0)) {
    return 'Prices: both above 0 per MWh_el, or neither';
  }
  const [shortfall_per_MWh_el, surplus_per_MWh_el] = priced;
  return {
    powers_MW_el: powers,
    gate: { closes_before_min: closes, count, every_min: Number(own.every_min) },
    block_min: Number(own.block_min),
    certainties: CERTAINTIES,
    keep: own.keep,
    stale: 'mark',
    ...(some ? { prices: { shortfall_per_MWh_el, surplus_per_MWh_el } } : {}),
  };
}
