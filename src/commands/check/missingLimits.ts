import type { UnitDefinition } from '../../core/definitions.js';

/** A limit that the configuration does not have. */
export interface MissingLimit {
  readonly limit: string;
  readonly stands_in: string;
  readonly costs: string;
}

const J_PER_KWH = 3.6e6;

/** Every limit on what can be sold that is not there: what is taken instead, and what that costs. */
export function missingLimits(unit: UnitDefinition): MissingLimit[] {
  const { limits } = unit;
  const { operation, connection, availability } = limits;
  const list: MissingLimit[] = [];
  const add = (limit: string, stands_in: string, costs: string) =>
    list.push({ limit, stands_in, costs });
  const MW = (power_W: number) => `${Number((power_W / 1e6).toPrecision(3))} MW_el`;
  const kWh = (energy_J: number) => `${Number((energy_J / J_PER_KWH).toPrecision(3))} kWh_el`;

  for (const direction of ['charge', 'discharge'] as const) {
    const { power_min_W, power_max_W } = limits[direction];
    const power_W = direction === 'charge' ? power_max_W : unit.rated_power_W;
    if (power_min_W === 0) {
      add(
        `${direction}.power_min_MW_el`,
        'every power above 0 can be held',
        `blocks below what the machine can hold are offered and found to hold: they fail in full`,
      );
    }
    if ((operation?.ramp_W_s[direction] ?? null) === null) {
      add(
        `operation.ramp_MW_per_min.${direction}`,
        'power changes at once',
        `each minute that it truly takes to ${MW(power_W)} leaves ${kWh(power_W * 30)} open in the first block`,
      );
    }
  }
  const start = operation?.start;
  if (start === undefined || start.warm.time_s === 0) {
    add(
      'operation.start',
      'the unit runs at once and draws nothing for it',
      `each minute that a start truly takes leaves ${kWh(unit.rated_power_W * 60)} of rated power open after a stand`,
    );
  } else if (!Number.isFinite(start.cold_after_s)) {
    add(
      'operation.start.cold',
      'every start is a warm one',
      `each minute more that a cold start takes leaves ${kWh(unit.rated_power_W * 60)} of rated power open after a long stand`,
    );
  }
  if ((operation?.change_over_s ?? 0) === 0) {
    add(
      'operation.change_over_min',
      'the direction turns at once',
      `each minute that it truly takes leaves ${kWh(unit.rated_power_W * 60)} of rated power open after a charge`,
    );
  }
  if (connection === undefined) {
    add(
      'connection',
      `${MW(limits.discharge.power_max_W)} given and ${MW(limits.charge.power_max_W)} taken at any time; blocks begin by UTC`,
      'power that the grid does not take is offered; blocks may not be those of the market, nor its days of 23 and 25 hours',
    );
  }
  if ((limits.outages ?? []).length === 0) {
    add(
      'outages',
      'none is planned',
      `each day that the unit is out untold, up to ${kWh(unit.rated_power_W * unit.rated_hours * 3600)} a discharge are offered in vain`,
    );
  }
  if (availability === undefined) {
    add(
      'availability',
      'nothing: figures hold given that the machine runs',
      'how often it does not, whoever buys has to know himself',
    );
  }
  return list;
}
