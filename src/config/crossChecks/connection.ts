import { isTimeZone } from '../../core/plan/localTime.js';
import type { Path } from '../faults.js';
import { minutesOf } from '../resolveTrade.js';
import type { UnitBlock } from '../schema/site.js';
import type { ConnectionBlock } from '../schema/trade.js';
import { type CrossFault, cross } from './cross.js';

const DAY_MIN = 1440;
/** Area and place: the runtime's list also has abbreviations and offsets, which know no summer time. */
const NAMED = /^(?:UTC|[A-Z]\w+\/[A-Z][\w/+-]*)$/;
const SIDES = ['export_max_MW_el', 'import_max_MW_el'] as const;
const SIDE_OF = { charge: 'import_max_MW_el', discharge: 'export_max_MW_el' } as const;

/** Connection and outages held against the calendar, each other and the machine. */
export function connectionFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const { connection } = unit.limits;
  const at: Path = [...path, 'limits', 'connection'];
  return [
    ...(connection === undefined
      ? []
      : [
          ...zoneFaults(connection, at),
          ...powerFaults(unit, connection, path),
          ...connection.windows.flatMap((_, i) => windowFaults(connection, i, at)),
          ...overlapFaults(connection, at),
        ]),
    ...outageFaults(unit, path),
  ];
}

function zoneFaults({ time_zone }: ConnectionBlock, at: Path): CrossFault[] {
  if (NAMED.test(time_zone) && isTimeZone(time_zone)) return [];
  return [
    cross([...at, 'time_zone'], time_zone, 'a zone of the IANA list, such as Europe/Berlin', {
      hint: 'abbreviations such as CEST and fixed offsets tell no summer time',
    }),
  ];
}

function powerFaults(unit: UnitBlock, connection: ConnectionBlock, path: Path): CrossFault[] {
  const at: Path = [...path, 'limits', 'connection'];
  const faults: CrossFault[] = [];
  const sold: { path: Path; value: number }[] = [
    { path: [...path, 'rated_power_MW_el'], value: unit.rated_power_MW_el },
    ...(unit.hours_at_MW_el ?? []).map((value, i) => ({
      path: [...path, 'hours_at_MW_el', i],
      value,
    })),
  ];
  for (const { path: own, value } of sold) {
    // More than the machine gives is a fault of its own.
    const most = Math.max(connection.export_max_MW_el, unit.limits.discharge.power_max_MW_el);
    if (value <= connection.export_max_MW_el || value > most) continue;
    faults.push(
      cross(
        own,
        value,
        `at most limits.connection.export_max_MW_el (${connection.export_max_MW_el})`,
        {
          others: [[...at, 'export_max_MW_el']],
        },
      ),
    );
  }
  for (const direction of ['charge', 'discharge'] as const) {
    const { power_min_MW_el: least, power_max_MW_el: most } = unit.limits[direction];
    if (least > most) continue;
    const side = SIDE_OF[direction];
    if (connection[side] > 0 && least <= connection[side]) continue;
    faults.push(
      cross(
        [...at, side],
        connection[side],
        `above 0 and at least limits.${direction}.power_min_MW_el (${least})`,
        {
          others: [[...path, 'limits', direction, 'power_min_MW_el']],
          hint: `with less the unit could never ${direction}`,
        },
      ),
    );
  }
  return faults;
}

function windowFaults(connection: ConnectionBlock, i: number, at: Path): CrossFault[] {
  const own = connection.windows[i]!;
  const path: Path = [...at, 'windows', i];
  const faults: CrossFault[] = [];
  if (own.from === '24:00') {
    faults.push(cross([...path, 'from'], own.from, 'a time from 00:00 to 23:59'));
  } else if (own.from === own.to) {
    faults.push(
      cross([...path, 'to'], own.to, 'another time than from', {
        others: [[...path, 'from']],
        hint: 'what holds all day is a limit of the connection itself',
      }),
    );
  }
  for (const side of SIDES) {
    const value = own[side];
    if (value === undefined || value <= connection[side]) continue;
    faults.push(
      cross([...path, side], value, `at most ${side} of the connection (${connection[side]})`, {
        others: [[...at, side]],
      }),
    );
  }
  if (SIDES.every((side) => (own[side] ?? connection[side]) >= connection[side])) {
    if (faults.length === 0) {
      faults.push({
        ...cross(path, undefined, 'less than the connection in one direction at least', {
          others: SIDES.flatMap((side): Path[] => [
            [...path, side],
            [...at, side],
          ]),
        }),
        found: 'a window that limits nothing',
      });
    }
  }
  return faults;
}

/** Stretches of a day that a window covers [min]. */
function covers(window: ConnectionBlock['windows'][number]): [number, number][] {
  const from = minutesOf(window.from);
  const to = minutesOf(window.to);
  if (to > from) return [[from, to]];
  return [
    [from, DAY_MIN],
    [0, to],
  ];
}

function overlapFaults(connection: ConnectionBlock, at: Path): CrossFault[] {
  return connection.windows.flatMap((window, i) => {
    const earlier = connection.windows.findIndex(
      (other, k) =>
        k < i &&
        covers(window).some(([from, to]) =>
          covers(other).some(([a, b]) => Math.max(from, a) < Math.min(to, b)),
        ),
    );
    if (earlier < 0) return [];
    const { from, to } = connection.windows[earlier]!;
    const path: Path = [...at, 'windows', i];
    return [
      {
        ...cross(path, undefined, `a window apart from windows[${earlier}], ${from} to ${to}`, {
          others: [i, earlier].flatMap((k): Path[] => [
            [...at, 'windows', k, 'from'],
            [...at, 'windows', k, 'to'],
          ]),
        }),
        found: `${window.from} to ${window.to}`,
      },
    ];
  });
}

function outageFaults(unit: UnitBlock, path: Path): CrossFault[] {
  return unit.limits.outages.flatMap((outage, i) => {
    const at: Path = [...path, 'limits', 'outages', i];
    const faults: CrossFault[] = [];
    if (!(Date.parse(outage.to) > Date.parse(outage.from))) {
      faults.push(
        cross([...at, 'to'], outage.to, `later than from (${outage.from})`, {
          others: [[...at, 'from']],
        }),
      );
    }
    const directions = ['discharge', 'charge'] as const;
    const most = directions.map((d) => unit.limits[d].power_max_MW_el);
    const left = directions.map((d) => outage[`${d}_max_MW_el`]);
    directions.forEach((d, k) => {
      if (left[k]! <= most[k]!) return;
      faults.push(
        cross(
          [...at, `${d}_max_MW_el`],
          left[k],
          `at most limits.${d}.power_max_MW_el (${most[k]})`,
          { others: [[...path, 'limits', d, 'power_max_MW_el']] },
        ),
      );
    });
    if (directions.every((_, k) => left[k] === most[k])) {
      faults.push(
        cross([...at, 'discharge_max_MW_el'], left[0], 'less in one direction at least', {
          others: directions.flatMap((d): Path[] => [
            [...at, `${d}_max_MW_el`],
            [...path, 'limits', d, 'power_max_MW_el'],
          ]),
          hint: 'an outage in which both directions have all their power is none',
        }),
      );
    }
    return faults;
  });
}
