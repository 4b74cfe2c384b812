import type { IndicatorKind } from './indicator.js';

/** What may be behind what the indicators show. */
export const CAUSE_KINDS = [
  'dust_or_fines',
  'frost',
  'channelling',
  'flow_meter',
  'insulation',
  'valve',
  'settled_bed',
  'machine',
  'gas_loss',
  'thermocouples',
  'store_mismatch',
] as const;
export type CauseKind = (typeof CAUSE_KINDS)[number];

/** What a cause speaks of: one store, or all that the unit has. */
/** From here on a cause is called probable: more likely than all others together. */
export const PROBABLE = 0.5;

export interface CauseNote {
  readonly of: 'store' | 'unit';
  /** How often it is the reason, among those told of here; only the order of size matters. */
  readonly prior: number;
  /** Chance that an indicator of the store decides `degraded` where this is the cause and shows in full. */
  readonly shows: Readonly<Partial<Record<IndicatorKind, number>>>;
  /** The same for the other store; where absent that is as with a sound plant. */
  readonly other?: Readonly<Partial<Record<IndicatorKind, number>>>;
  /** Of `shows`, what is only a consequence: told with the cause's own alert, not as another one. */
  readonly follows?: readonly IndicatorKind[];
  /** As a person says it. */
  readonly words: string;
  /** What to look at on site. */
  readonly check: string;
}

/** What follows from any trouble of a bed says little of which it is. */
const FOLLOWS = { energy_lost: 0.4, store_mismatch: 0.3, front_view: 0.2 } as const;
const OF_A_BED = ['spread_ratio', 'energy_lost', 'store_mismatch', 'front_view'] as const;

/**
 * Causes with what they show. Chances are judgement from how each acts on the bed (which law of the
 * model it enters), not counts from plants: no published statistics of such faults were found.
 */
export const CAUSES: Readonly<Record<CauseKind, CauseNote>> = {
  dust_or_fines: {
    of: 'store',
    prior: 0.2,
    shows: {
      ...FOLLOWS,
      heat_transfer: 0.9,
      pressure_drop: 0.6,
      spread_ratio: 0.7,
      string_flow: 0.2,
    },
    follows: OF_A_BED,
    words: 'dust or fines in the bed',
    check: 'filters and screens of the gas loop, dust in a sample of the gas, rock at the manhole',
  },
  frost: {
    of: 'store',
    prior: 0.06,
    shows: {
      ...FOLLOWS,
      pressure_drop: 0.95,
      heat_transfer: 0.3,
      string_flow: 0.2,
      spread_ratio: 0.3,
    },
    follows: OF_A_BED,
    words: 'frost in the cold bed',
    check:
      'the dew point of the gas, the dryer and its last regeneration, leaks that let in moist air',
  },
  channelling: {
    of: 'store',
    prior: 0.15,
    shows: {
      ...FOLLOWS,
      string_flow: 0.95,
      spread_ratio: 0.7,
      heat_transfer: 0.3,
      front_travel: 0.1,
    },
    follows: OF_A_BED,
    words: 'gas that finds a channel through the bed',
    check:
      'the level and slope of the rock at the manhole, the distributor plates, and gaps along the wall',
  },
  flow_meter: {
    of: 'unit',
    prior: 0.15,
    shows: { front_travel: 0.95, pressure_drop: 0.3, energy_lost: 0.1 },
    other: { front_travel: 0.95, pressure_drop: 0.3 },
    // Where it is by as much as the travel says of the meter: see consequences.ts.
    follows: ['energy_lost', 'pressure_drop'],
    words: 'the flow meter',
    check:
      'the zero of the flow meter, its impulse lines and its range; and rock that was exchanged',
  },
  insulation: {
    of: 'store',
    prior: 0.1,
    shows: { standing_loss: 0.95, valve_leak: 0.05, energy_lost: 0.2, store_mismatch: 0.2 },
    follows: ['energy_lost', 'store_mismatch'],
    words: 'the insulation of the vessel',
    check:
      'the shell with an infrared camera, wet insulation, and lids and nozzles that are warm or iced',
  },
  valve: {
    of: 'store',
    prior: 0.1,
    shows: { valve_leak: 0.95, standing_loss: 0.4, energy_lost: 0.2, store_mismatch: 0.2 },
    follows: ['energy_lost', 'store_mismatch'],
    words: 'a valve that leaks while the unit stands',
    check:
      'the seats of the valves at this store, their end positions, and pipes that stay warm or cold',
  },
  settled_bed: {
    of: 'store',
    prior: 0.08,
    shows: { settling: 0.95, sensor_health: 0.3, string_flow: 0.15, front_view: 0.2 },
    follows: ['front_view'],
    words: 'a bed that has settled',
    check: 'the level of the rock at the top manhole, and the thermocouples that hang free',
  },
  machine: {
    of: 'unit',
    prior: 0.1,
    shows: { plateau: 0.95, front_travel: 0.05, energy_lost: 0.2 },
    other: { plateau: 0.5 },
    follows: ['energy_lost'],
    words: 'the machine, its coolers or its pressures',
    check:
      'the coolers, the pressures before and behind the machine, and the gas thermometers at its ends',
  },
  gas_loss: {
    of: 'unit',
    prior: 0.05,
    shows: { gas_inventory: 0.95, pressure_drop: 0.1, plateau: 0.2 },
    words: 'gas that is lost from the loop',
    check:
      'seals, flanges and vents of the loop. Argon and nitrogen displace oxygen: measure it before anyone goes near pits and closed rooms',
  },
  thermocouples: {
    of: 'store',
    prior: 0.12,
    shows: { sensor_health: 0.9, front_view: 0.5, spread_ratio: 0.1, heat_transfer: 0.05 },
    words: 'thermocouples, not the bed',
    check: 'the cards, cold junctions and cables that the sensors have in common',
  },
  store_mismatch: {
    of: 'unit',
    prior: 0.1,
    shows: { store_mismatch: 0.95, energy_lost: 0.3 },
    follows: ['energy_lost'],
    words: 'stores that have drifted apart over cycles',
    check: 'nothing on site; ask `rockhour balance` what charging one store longer would win back',
  },
};
