import type { Balance } from '../../core/plan/balance.js';
import type { Flush } from '../../core/plan/flush.js';
import type { Mismatch } from '../../core/plan/mismatch.js';
import type { Trim } from '../../core/plan/trim.js';
import { type AheadHead, headLine } from '../aheadState.js';
import { table } from '../table.js';

const WORDS: Readonly<Record<Flush['way'] | Trim['way'], string>> = {
  full_charge: 'full charge',
  full_discharge: 'full discharge',
  longer_charge: 'longer charge',
  run_on: 'run on',
  stand: 'stand',
};
const f2 = (value: number): string => value.toFixed(2);
const f3 = (value: number): string => value.toFixed(3);

function flushLines({ flush }: Balance): string[] {
  const { as_usual, ways } = flush;
  const gains = as_usual.following_MWh_el.map((_, n) => `cycle ${n + 1} MWh_el`);
  const rows = ways.map((way) => [
    WORDS[way.way],
    f2(way.takes_hours),
    f2(way.takes_MWh_el),
    f2(way.gives_MWh_el),
    f3(way.cost_MWh_el),
    ...way.gains_MWh_el.map(f3),
    way.reason ?? (way.pays_after_cycles === null ? 'not yet' : way.pays_after_cycles),
  ]);
  const money = ways.flatMap(({ way, money: of }) =>
    of === null
      ? []
      : [
          `${WORDS[way]}: energy costs ${f2(of.energy_cost)}, lost time ${f2(of.lost_time_cost)}, cycles gain ${of.gains.map(f2).join(', ')}.`,
        ],
  );
  return [
    '',
    'Flushing the fronts, against going on as usual:',
    table(
      [
        'first',
        'h more',
        'takes MWh_el',
        'gives MWh_el',
        'costs MWh_el',
        ...gains,
        'pays after cycles',
      ],
      rows,
    ),
    `Each usual cycle then gives ${as_usual.following_MWh_el.map(f2).join(', ')} MWh_el; the columns of cycles say how much more.`,
    ...money,
  ];
}

/** The rule that ends the stores together may be another than that of the store that is empty first. */
function endsTogether({ together, alone, ends_first }: Mismatch): string {
  const own = ends_first === null ? undefined : alone[ends_first]?.ends_by;
  return own === together.ends_by
    ? ''
    : `; together they end by ${together.ends_by}, each giving the machine the gas that it then has`;
}

function mismatchLines(mismatch: Mismatch | null, reason: string | null): string[] {
  if (mismatch === null) return ['', reason ?? 'no mismatch'];
  const { together, alone, stranded, drift, trims } = mismatch;
  const hours = Object.entries({ together, ...alone }).map(([name, { hours: h, ends_by }]) => [
    name,
    f2(h.p90),
    f2(h.p50),
    f2(h.p10),
    ends_by,
  ]);
  const matched = mismatch.ends_first === null;
  const words = matched
    ? 'The stores match to a minute.'
    : `Each run alone, store ${mismatch.ends_first} is empty first, the other ${f2(Math.abs(mismatch.mismatch_h))} h later${endsTogether(mismatch)}.`;
  const left =
    stranded === null
      ? []
      : [
          `In ${stranded.store} ${f2(stranded.remains_MWh_th)} MWh_th remain then, ${f2(stranded.stranded_MWh_th)} of them stranded, worth ${f2(stranded.worth_MWh_el)} MWh_el.`,
        ];
  const ways = trims.map((trim) =>
    trim.reason !== null
      ? [WORDS[trim.way], '', '', '', '', '', trim.reason]
      : [
          WORDS[trim.way],
          f2(trim.hours),
          f2(trim.mismatch_before_h),
          f2(trim.mismatch_after_h),
          f3(trim.cost_MWh_el),
          Object.entries(trim.lost_MWh_th)
            .map(([id, lost]) => `${id} ${f2(lost)}`)
            .join(', '),
          trim.past_rule === null
            ? ''
            : `runs past ${trim.past_rule}, to ${trim.outlet_degC?.toFixed(0)} degC`,
        ],
  );
  return [
    '',
    `Discharging ${mismatch.power_MW_el} MW_el, and each store as if it alone set the end:`,
    table(['store', 'h p90', 'h p50', 'h p10', 'ends by'], hours),
    words,
    ...left,
    `Drift: ${f3(drift.per_cycle_h)} h and ${f3(drift.per_cycle_MWh_th)} MWh_th stranded per cycle.`,
    '',
    'Ways to trim it:',
    table(['way', 'h', 'mismatch h', 'after h', 'costs MWh_el', 'lost MWh_th', 'but'], ways),
  ];
}

export function balanceText(answer: AheadHead & Balance): string {
  const { usual } = answer;
  const from = usual.charge_from === 'asked' ? 'as asked' : 'for the rated energy';
  return [
    headLine(answer),
    `Usual cycle: takes ${f2(usual.charge_MWh_el)} MWh_el at ${usual.charging_MW_el} MW_el (${from}), discharges ${usual.discharging_MW_el} MW_el to a rule.`,
    ...(usual.locked
      ? ['One store is full, the other empty: the present beds can neither charge nor discharge.']
      : []),
    `From limit to limit it takes ${f2(usual.full_charge.energy_MWh_el)} MWh_el and gives ${f2(usual.full_discharge.energy_MWh_el)} MWh_el, round trip ${(100 * usual.round_trip).toFixed(1)} %.`,
    ...flushLines(answer),
    ...mismatchLines(answer.mismatch, answer.mismatch_reason),
  ].join('\n');
}
