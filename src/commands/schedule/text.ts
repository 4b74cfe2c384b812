import type { RunView, Schedule, ShortfallView } from '../../core/plan/schedule.js';
import { firstMinutesText } from '../firstMinutesText.js';
import { table } from '../table.js';

const three = (value: number): string => value.toFixed(3);
const percent = (share: number): string => `${(share * 100).toFixed(1)} %`;

function shortfall(first: ShortfallView | null): string {
  return first === null
    ? 'nothing is short'
    : `from ${first.time} on ${three(first.MWh_el)} MWh_el, ${first.cause}`;
}

function runsText({ runs, reserve_looked_hours }: Schedule): string[] {
  if (runs.length === 0) return ['No run: the unit stands.'];
  const more = `> ${reserve_looked_hours.toFixed(1)}`;
  const reserve = (run: RunView) =>
    [run.reserve_hours.p90, run.reserve_hours.p50, run.reserve_hours.p10].map((hours) =>
      hours === null ? more : hours.toFixed(2),
    );
  const header = [
    'run',
    'from',
    'to',
    'holds',
    'h past p90',
    'h past p50',
    'h past p10',
    'ends by',
    'stops',
  ];
  const rows = runs.map((run) => [
    ...[run.mode, run.from, run.to, percent(run.probability), ...reserve(run)],
    ...[run.ends_by ?? 'nothing near', run.stops ?? 'no'],
  ]);
  const early = runs.flatMap(({ mode, from, first_minutes }) =>
    first_minutes === undefined
      ? []
      : [
          `${mode} from ${from}: ${firstMinutesText(first_minutes, mode === 'charge' ? 'taken' : 'given')}.`,
        ],
  );
  return [table(header, rows), ...early];
}

function blocksText(schedule: Schedule): string[] {
  const points = new Map(schedule.charge.map((point) => [point.time, point]));
  const energies = ['planned', 'expected', 'certain', 'short', 'ramp'].map((of) => `${of} MWh_el`);
  const header = ['from', 'to', 'mode', 'MW_el', ...energies];
  const rows = schedule.blocks.map((block) => {
    const at = points.get(block.to);
    return [
      ...[block.from, block.to, block.mode, three(block.power_MW_el)],
      ...[block.planned_MWh_el, block.expected_MWh_el, block.certain_MWh_el].map(three),
      ...[block.expected_shortfall_MWh_el, block.ramp_MWh_el].map(three),
      percent(block.met_probability),
      at === undefined ? '-' : percent(at.state_of_charge),
    ];
  });
  return [table([...header, 'met', 'charge after'], rows)];
}

function unmetText({ unmet }: Schedule): string[] {
  if (unmet.length === 0) return [];
  const rows = unmet.map((part) => [
    ...[part.from, part.to, part.cause, three(part.missing_MW_el), three(part.MWh_el)],
  ]);
  const header = ['from', 'to', 'cause', 'MW_el missing', 'MWh_el'];
  return ['What machine, connection or outages do not allow:', table(header, rows)];
}

const NO_NEAREST: Readonly<Record<NonNullable<Schedule['nearest_reason']>, string>> = {
  not_allowed: 'machine, connection and outages leave nothing of it',
  nothing_holds: 'not even a minute of it at the least power',
  not_found: 'none was found in the tries made',
};

function nearestText({ nearest, nearest_reason, certainty }: Schedule): string {
  const sure = percent(certainty);
  if (nearest === null) {
    const why = NO_NEAREST[nearest_reason ?? 'not_found'];
    return `No schedule near it holds with ${sure}: ${why}.`;
  }
  const { factor_discharge, factor_charge, drawn_in, taken_out, probability } = nearest;
  const changes = [
    ...(factor_discharge < 1 ? [`discharging powers x ${factor_discharge.toFixed(4)}`] : []),
    ...(factor_charge < 1 ? [`charging powers x ${factor_charge.toFixed(4)}`] : []),
    ...drawn_in.map(({ mode, asked, to }) => `${mode} until ${to} instead of ${asked}`),
    ...(taken_out ? ['without what is not allowed'] : []),
  ];
  const how = changes.length > 0 ? changes.join(', ') : 'as it is';
  return `Nearest that holds with ${sure}: ${how}; it holds with ${percent(probability)}.`;
}

function netText(schedule: Schedule): string {
  const { planned_net_MWh_el, expected_net_MWh_el, net_MWh_el, between_MWh_el } = schedule;
  const ramps = three(schedule.ramps_between_MWh_el);
  return [
    `Net of the whole, + = given: planned ${three(planned_net_MWh_el)} MWh_el`,
    `expected ${three(expected_net_MWh_el)}, most likely ${three(net_MWh_el)}`,
    `${three(between_MWh_el)} drawn and ${ramps} ramped between the blocks in it.`,
  ].join(', ');
}

/** A schedule check for people. */
export function scheduleText(schedule: Schedule): string[] {
  const { probability, stores_probability, certainty, first_shortfall, ramp_MWh_el } = schedule;
  const stores =
    probability === stores_probability ? '' : `; as far as allowed ${percent(stores_probability)}`;
  return [
    `Holds with ${percent(probability)}${stores}. First shortfall:`,
    `  with 50 %: ${shortfall(first_shortfall.p50)}`,
    `  with ${percent(certainty)}: ${shortfall(first_shortfall.certain)}`,
    ...unmetText(schedule),
    ...runsText(schedule),
    ...blocksText(schedule),
    `Ramps take ${three(ramp_MWh_el)} MWh_el, which is no shortfall.`,
    netText(schedule),
    nearestText(schedule),
    'MWh_el at the connection point, in the direction of the block; given that the machine runs.',
  ];
}
