import type { Mode } from '../definitions.js';
import type { EventKind } from '../watch/event.js';

/**
 * Suppression by design (ISA-18.2, IEC 62682): when an alarm means nothing, by a rule that was thought
 * of beforehand, and not by anybody's choice of the moment.
 *
 * A rule holds back only what comes up meanwhile; what is on the list already stays there until it has
 * returned and somebody has acknowledged it. Taken off the list at each stand, an alarm of the bed would
 * be unacknowledged anew at each start, and the alarm of a discharge that is over would come back as
 * returned at the start of the next one, hours too late.
 */
export interface DesignRule {
  /** Modes in which it is held back. */
  readonly modes: readonly Mode[];
  readonly why: string;
}

const NO_FLOW = 'no flow while the unit stands: what is told of it is left over from before';
const WHILE_FLOWING: DesignRule = { modes: ['stand'], why: NO_FLOW };
const DISCHARGE_ONLY: readonly Mode[] = ['charge', 'stand'];

/** One rule per kind that has any; the others are told whatever the unit does. */
export const DESIGN_RULES: Readonly<Partial<Record<EventKind, DesignRule>>> = {
  outlet_near_limit: {
    modes: DISCHARGE_ONLY,
    why: 'the outlet limit ends discharges alone',
  },
  estimate_blind: {
    modes: DISCHARGE_ONLY,
    why: 'nothing is delivered on the strength of the estimate',
  },
  pressure_drop_near_limit: { modes: ['stand'], why: 'no flow, no pressure drop' },
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
  return rule !== undefined && mode !== null && !isShown && rule.modes.includes(mode);
}
