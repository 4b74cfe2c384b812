import type { Mode } from '../definitions.js';
import type { EventKind } from '../watch/event.js';

/**
 * Suppression by design (ISA-18.2, IEC 62682): when an alarm means nothing, by a rule that was thought
 * of beforehand, and not by anybody's choice of the moment.
 */
export interface DesignRule {
  /** Modes in which it is held back. */
  readonly modes: readonly Mode[];
  /**
   * `all`: taken off the list as well. `new`: only what comes up meanwhile is held back; what stands
   * already stays, since it tells of the bed and not of the moment: taken off at each stand, it would
   * be unacknowledged anew at each start.
   */
  readonly holds: 'all' | 'new';
  readonly why: string;
}

const NO_FLOW = 'no flow while the unit stands: what is told of it is left over from before';
const WHILE_FLOWING: DesignRule = { modes: ['stand'], holds: 'new', why: NO_FLOW };
const DISCHARGE_ONLY: readonly Mode[] = ['charge', 'stand'];

/** One rule per kind that has any; the others are told whatever the unit does. */
export const DESIGN_RULES: Readonly<Partial<Record<EventKind, DesignRule>>> = {
  outlet_near_limit: {
    modes: DISCHARGE_ONLY,
    holds: 'all',
    why: 'the outlet limit ends discharges alone',
  },
  estimate_blind: {
    modes: DISCHARGE_ONLY,
    holds: 'all',
    why: 'nothing is delivered on the strength of the estimate',
  },
  pressure_drop_near_limit: { modes: ['stand'], holds: 'all', why: 'no flow, no pressure drop' },
  pressure_drop_high: WHILE_FLOWING,
  string_flow_uneven: WHILE_FLOWING,
  front_travel_off: WHILE_FLOWING,
  heat_transfer_low: WHILE_FLOWING,
  plateau_off: WHILE_FLOWING,
};

/**
 * Whether a rule holds an alarm back now.
 *
 * @param mode of its unit; null: not known yet, when nothing is held back anew
 * @param isShown it stands in the list, or has stood and waits for an acknowledgement
 */
export function heldByDesign(kind: EventKind, mode: Mode | null, isShown: boolean): boolean {
  const rule = DESIGN_RULES[kind];
  if (rule === undefined || mode === null || !rule.modes.includes(mode)) return false;
  return rule.holds === 'all' || !isShown;
}
