import type { UnitDefinition } from '../../src/core/definitions.js';
import { groupError, type PlantDraw } from '../../test/plant/draws.js';
import type { ErrorModel } from '../score/sensorSets.js';
import type { RunOptions } from '../score/series.js';
import { columnOf } from '../score/twins.js';

/** Errors that add to a reading, so that they can be taken out of a recording as if never drawn. */
export const ERRORS = ['offset', 'gain', 'group', 'gas'] as const;
export type ReadingError = (typeof ERRORS)[number];

const ZERO_K = 273.15;

/**
 * Takes errors out of the readings of a recording. A thermocouple reads
 *
 *   z = T + o + a (T - 273.15 K) + g(t) + noise
 *
 * with offset o, gain a and the swing g of its card; a thermometer in the gas T + o. Each was drawn, so
 * that T follows from z but for the noise. What a junction sees (its place, its share of the gas, the
 * lag of its thermowell) is part of T and stays.
 *
 * @param period_s of the recording, from whose start the swing counts
 */
export function withoutErrors(
  unit: UnitDefinition,
  draw: PlantDraw,
  errors: ErrorModel,
  period_s: number,
  out: ReadonlySet<ReadingError>,
): NonNullable<RunOptions['through']> {
  const groupOf = new Map(
    unit.stores.flatMap((s) =>
      s.strings.flatMap((t) => t.thermocouples.map((c) => [c.id, c.group] as const)),
    ),
  );
  const drawn = unit.channels.map(({ id, role }) => {
    if (role.kind === 'gas_temperature') {
      return { gas: true, own: draw.gasSensors[id]!, group: undefined };
    }
    if (role.kind !== 'thermocouple') return null;
    const group = errors === 'class' ? groupOf.get(id) : null;
    return {
      gas: false,
      own: draw.thermocouples[columnOf(id, errors)]!,
      group: group ? draw.groups[group] : undefined,
    };
  });
  return ({ values, held }, scan) => {
    const right = values.map((z, i) => {
      const sensor = drawn[i];
      if (!sensor) return z;
      const { gas, own, group } = sensor;
      if (gas) return out.has('gas') ? z - own.offset_K : z;
      const swing = group === undefined ? 0 : groupError(group, (scan + 1) * period_s);
      const bare = z - own.offset_K - swing;
      const gain = bare - (bare + ZERO_K * own.gain) / (1 + own.gain);
      return (
        z -
        (out.has('offset') ? own.offset_K : 0) -
        (out.has('group') ? swing : 0) -
        (out.has('gain') ? gain : 0)
      );
    });
    return { values: right, held };
  };
}
