import type { Mode, UnitDefinition } from '../core/definitions.js';

/** One phase of the repeating schedule; it ends at its state of charge, its time or a limit of the plant. */
export interface Phase {
  readonly mode: Mode;
  /** Net electrical power at the connection point, positive both ways [W]; 0 while standing. */
  readonly power_W: number;
  /** Ends when the fuller store (charging) or the emptier one (discharging) reaches this. */
  readonly until_soc: number | null;
  readonly longest_s: number;
}

const HOUR = 3600;

/** Charge, stand, discharge at rated power and in part load, stand, again and again. */
export function scheduleOf(unit: UnitDefinition): readonly Phase[] {
  const { charge, discharge } = unit.limits;
  const rated = Math.min(unit.rated_power_W, discharge.power_max_W);
  const part = Math.max(0.6 * rated, discharge.power_min_W);
  return [
    {
      mode: 'charge',
      power_W: Math.max(0.75 * charge.power_max_W, charge.power_min_W),
      until_soc: 0.75,
      longest_s: 24 * HOUR,
    },
    { mode: 'stand', power_W: 0, until_soc: null, longest_s: 0.75 * HOUR },
    { mode: 'discharge', power_W: rated, until_soc: 0.52, longest_s: 24 * HOUR },
    { mode: 'discharge', power_W: part, until_soc: 0.35, longest_s: 24 * HOUR },
    { mode: 'stand', power_W: 0, until_soc: null, longest_s: 0.5 * HOUR },
  ];
}

/** What goes wrong in the demonstration, by the number of the cycle (0 the first). */
export interface Incidents {
  /** From the start of this cycle dust settles in one store and takes its heat transfer down. */
  readonly dust: {
    readonly cycle: number;
    readonly store: string;
    readonly factor: number;
    readonly over_s: number;
  };
  /** From so long after the start of this cycle one thermocouple no longer moves. */
  readonly stuck: { readonly cycle: number; readonly after_s: number; readonly channel: string };
}

/**
 * The incidents of a unit: dust in the cold store (whose front stays sharp while charging, so that a
 * spreading one shows soonest), else in the only one; a stuck thermocouple in the middle of the first
 * store's middle string, one cycle later, while the front is on its way there.
 */
export function incidentsOf(unit: UnitDefinition): Incidents {
  const dusty = unit.stores.find((s) => s.kind === 'cold') ?? unit.stores[0];
  const other = unit.stores.find((s) => s !== dusty) ?? dusty;
  const string = other?.strings[Math.floor(other.strings.length / 2)];
  const thermocouple = string?.thermocouples[Math.floor(string.thermocouples.length / 2)];
  if (!dusty || !thermocouple)
    throw new RangeError(`unit ${unit.id} has no store with a thermocouple`);
  return {
    dust: { cycle: 1, store: dusty.id, factor: 0.15, over_s: 2 * HOUR },
    stuck: { cycle: 2, after_s: HOUR, channel: thermocouple.id },
  };
}
