import type { Direction } from '../../core/definitions.js';
import type { Path } from '../faults.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';

/** Least power has to be reached within an hour, greatest within a day: a slower ramp is a slip. */
const LEAST_WITHIN_MIN = 60;
const GREATEST_WITHIN_MIN = 24 * 60;

/** Ramps and start-ups that contradict powers, auxiliaries or the connection. */
export function operationFaults(unit: UnitBlock, path: Path): CrossFault[] {
  return [
    ...rampFaults(unit, path, 'charge'),
    ...rampFaults(unit, path, 'discharge'),
    ...startFaults(unit, path),
    ...energyFaults(unit, path, 'warm'),
    ...energyFaults(unit, path, 'cold'),
  ];
}

function rampFaults(unit: UnitBlock, path: Path, direction: Direction): CrossFault[] {
  const ramp = unit.limits.operation?.ramp_MW_per_min[direction];
  if (ramp === undefined) return [];
  const at: Path = [...path, 'limits', 'operation', 'ramp_MW_per_min', direction];
  const own = unit.limits[direction];
  const bounds = [
    { key: 'power_min_MW_el', within_min: LEAST_WITHIN_MIN, words: 'an hour' },
    { key: 'power_max_MW_el', within_min: GREATEST_WITHIN_MIN, words: 'a day' },
  ] as const;
  return bounds.flatMap(({ key, within_min, words }) => {
    const power = own[key];
    if (power / ramp <= within_min) return [];
    const least = Number((power / within_min).toPrecision(3));
    return [
      cross(at, ramp, `at least ${least} MW_el/min, so that ${key} is reached within ${words}`, {
        others: [[...path, 'limits', direction, key]],
        hint: `limits.${direction}.${key} is ${power} MW_el; the ramp is per minute`,
      }),
    ];
  });
}

function startFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const start = unit.limits.operation?.start;
  if (start === undefined) return [];
  const at: Path = [...path, 'limits', 'operation', 'start'];
  const faults: CrossFault[] = [];
  const cold: Path = [...at, 'cold'];
  const after: Path = [...at, 'cold_after_h'];
  if (start.cold !== undefined && start.cold_after_h === undefined) {
    faults.push(
      cross(after, undefined, 'after how many hours a start is cold, since start.cold is given', {
        others: [cold],
      }),
    );
  }
  if (start.cold === undefined && start.cold_after_h !== undefined) {
    faults.push(
      cross(cold, undefined, 'what a cold start takes, since start.cold_after_h is given', {
        others: [after],
      }),
    );
  }
  if (start.warm === undefined || start.cold === undefined) return faults;
  for (const key of ['time_min', 'energy_kWh_el'] as const) {
    const warm = start.warm[key];
    const own = start.cold[key];
    if (warm === undefined || own === undefined || own >= warm) continue;
    faults.push(
      cross([...cold, key], own, `at least what a warm start takes (${warm})`, {
        others: [[...at, 'warm', key]],
      }),
    );
  }
  return faults;
}

function energyFaults(unit: UnitBlock, path: Path, kind: 'warm' | 'cold'): CrossFault[] {
  const { operation, connection } = unit.limits;
  const own = operation?.start[kind];
  if (own?.energy_kWh_el === undefined) return [];
  const at: Path = [...path, 'limits', 'operation', 'start', kind];
  const energy: Path = [...at, 'energy_kWh_el'];
  const time: Path = [...at, 'time_min'];
  if (own.time_min === 0) {
    if (own.energy_kWh_el === 0) return [];
    return [
      cross(energy, own.energy_kWh_el, '0, or a time_min above 0 in which it is drawn', {
        others: [time],
      }),
    ];
  }
  const hours = own.time_min / 60;
  const standing_kW = unit.machine.auxiliary_standing_kW;
  const faults: CrossFault[] = [];
  // A hair of rounding is none.
  if (own.energy_kWh_el < standing_kW * hours * (1 - 1e-9)) {
    const least = Number((standing_kW * hours).toPrecision(3));
    faults.push(
      cross(energy, own.energy_kWh_el, `at least ${least} kWh_el, which the auxiliaries draw`, {
        others: [time, [...path, 'machine', 'auxiliary_standing_kW']],
        hint: 'the energy of a start-up includes the standing auxiliaries; left out it is those alone',
      }),
    );
  }
  if (connection === undefined) return faults;
  const draw_MW = own.energy_kWh_el / hours / 1e3;
  if (draw_MW > connection.import_max_MW_el) {
    const most = Number((connection.import_max_MW_el * 1e3 * hours).toPrecision(3));
    faults.push(
      cross(
        energy,
        own.energy_kWh_el,
        `at most ${most} kWh_el: over ${own.time_min} min that is all the connection imports`,
        { others: [time, [...path, 'limits', 'connection', 'import_max_MW_el']] },
      ),
    );
  }
  return faults;
}
