import type { Mode, UnitDefinition } from '../definitions.js';
import { instantOf } from './localTime.js';
import type { BidPrices } from './newsvendor.js';
import { BLOCKS_S, distinct, type OffersAsk, requireOffers, WrongQuestion } from './offerAsk.js';

/** An offer table as people and programs ask for it: MW, minutes, hours, times in ISO 8601. */
export interface WrittenOffersAsk {
  readonly powers_MW_el: readonly number[];
  /** Local to the connection where they have no offset. */
  readonly starts?: readonly string[] | undefined;
  readonly gate?:
    | {
        readonly closes_before_min: number;
        readonly count: number;
        /** Absent: a block. */
        readonly every_min?: number | undefined;
      }
    | undefined;
  readonly block_min: number;
  readonly certainties: readonly number[];
  readonly plan: readonly {
    readonly mode: Mode;
    readonly power_MW_el: number;
    readonly from: string;
    readonly to: string;
  }[];
  readonly horizon_h?: number | undefined;
  readonly prices?: BidPrices | undefined;
}

/** What is asked where nothing is said. */
export const USUAL_CERTAINTIES: readonly number[] = [0.5, 0.75, 0.9, 0.95];

const HOUR_S = 3600;

/**
 * The question in SI units, held against the unit and the time of its estimate; see `requireOffers`.
 *
 * @param asked_ms clock of who asks, in source time
 * @throws WrongQuestion with the field as it was written, such as `plan.1.from`
 */
export function offersAskOf(
  unit: UnitDefinition,
  written: WrittenOffersAsk,
  now_ms: number,
  asked_ms: number,
): OffersAsk {
  const zone = unit.limits.connection?.time_zone ?? null;
  const instant = (text: string, field: string): number => {
    const found = instantOf(text, zone);
    if ('ms' in found) return found.ms;
    throw new WrongQuestion(field, text, found.expected);
  };
  if (!BLOCKS_S.some((block) => block === written.block_min * 60)) {
    throw new WrongQuestion('block_min', written.block_min, '15, 30 or 60');
  }
  const block_s = (written.block_min * 60) as OffersAsk['block_s'];
  const { gate } = written;
  const ask: OffersAsk = {
    powers_W: written.powers_MW_el.map((power) => power * 1e6),
    ...(written.starts === undefined
      ? {}
      : { starts_ms: written.starts.map((text, i) => instant(text, `starts.${i}`)) }),
    ...(gate === undefined
      ? {}
      : {
          gate: {
            closes_before_s: gate.closes_before_min * 60,
            count: gate.count,
            every_s: gate.every_min === undefined ? block_s : gate.every_min * 60,
          },
        }),
    block_s,
    certainties: written.certainties,
    legs: written.plan.map(({ mode, power_MW_el, from, to }, i) => ({
      mode,
      power_W: power_MW_el * 1e6,
      from_ms: instant(from, `plan.${i}.from`),
      to_ms: instant(to, `plan.${i}.to`),
    })),
    ...(written.horizon_h === undefined ? {} : { horizon_s: written.horizon_h * HOUR_S }),
    ...(written.prices === undefined ? {} : { prices: written.prices }),
    asked_ms,
  };
  try {
    requireOffers(unit, now_ms, ask);
  } catch (thrown) {
    if (!(thrown instanceof WrongQuestion)) throw thrown;
    const { field, value, expected } = thrown;
    throw new WrongQuestion(
      asWritten(field),
      field === 'starts_ms' ? written.starts : valueAsWritten(field, value),
      expectedAsWritten(field, expected),
    );
  }
  return distinct(ask);
}

/** Names of the core as a client writes them. */
function asWritten(field: string): string {
  const names: [RegExp, string][] = [
    [/powers_W/g, 'powers_MW_el'],
    [/power_W/g, 'power_MW_el'],
    [/starts_ms/g, 'starts'],
    [/^legs/, 'plan'],
    [/(from|to)_ms/g, '$1'],
    [/horizon_s/g, 'horizon_h'],
    [/(closes_before|every|block)_s/g, '$1_min'],
    [/\[(\d+)\]/g, '.$1'],
  ];
  return names.reduce((text, [found, instead]) => text.replace(found, instead), field);
}

/** What one of the core's units is in those of a client, by the end of a field's name. */
const PER_WRITTEN: readonly [RegExp, number, string][] = [
  [/powers?_W(\[\d+\])?$/, 1e6, 'MW_el'],
  [/horizon_s$/, HOUR_S, 'h'],
  [/(closes_before|every)_s$/, 60, 'min'],
];

function valueAsWritten(field: string, value: unknown): unknown {
  if (typeof value !== 'number') return value;
  const [, per] = PER_WRITTEN.find(([found]) => found.test(field)) ?? [null, 1];
  return Number((value / per).toPrecision(9));
}

/** Seconds told of a field in the unit that it is asked in. */
function expectedAsWritten(field: string, expected: string): string {
  const [, per, name] = PER_WRITTEN.find(([found]) => found.test(field)) ?? [null, 1, 's'];
  return expected.replace(/(\d+) s\b/g, (_, s) => `${Number(s) / per} ${name}`);
}
