import type { CauseKind } from '../../src/core/watch/causes.js';
import type { EventKind } from '../../src/core/watch/event.js';
import { INDICATOR_EVENTS } from '../../src/core/watch/kinds.js';

/** What the watch should make of a fault. */
export interface Expected {
  /** Alerts that tell of it, of the store that it is in. */
  readonly kinds: readonly EventKind[];
  /** Causes that are right. */
  readonly causes: readonly CauseKind[];
  /** Alerts that follow from it truly, in the same store or of the unit: no one is misled by them. */
  readonly follows: readonly EventKind[];
  /** It is the unit's, not one store's: any subject counts. */
  readonly unit?: true;
}

/** By the kind of a branch: its id up to the grade. */
export const EXPECTED: Readonly<Record<string, Expected>> = {
  transfer: {
    kinds: ['heat_transfer_low', 'front_spread'],
    causes: ['dust_or_fines'],
    follows: ['energy_lost', 'front_view_disagrees'],
  },
  channel: {
    kinds: ['string_flow_uneven'],
    causes: ['channelling'],
    follows: ['front_spread', 'energy_lost', 'front_view_disagrees'],
  },
  // Its 13 % more pressure drop at the flow it reads may be told as dust: counted among the others.
  meter: {
    kinds: ['front_travel_off'],
    causes: ['flow_meter'],
    follows: ['front_view_disagrees'],
    unit: true,
  },
  drop: { kinds: ['pressure_drop_high'], causes: ['dust_or_fines'], follows: [] },
  settled: { kinds: ['bed_settled'], causes: ['settled_bed'], follows: ['sensor_rejected'] },
  insulation: { kinds: ['standing_loss_high'], causes: ['insulation'], follows: ['energy_lost'] },
  leak: { kinds: ['valve_leaks'], causes: ['valve'], follows: ['standing_loss_high'] },
};

/** Alerts that say that the plant degrades: none of them may come from a healthy one. */
export const DEGRADATION: ReadonlySet<EventKind> = new Set<EventKind>([
  'front_spread',
  ...Object.values(INDICATOR_EVENTS),
]);

export function expectedOf(branch: string): Expected {
  const kind = branch.replace(/-.*/, '');
  const found = EXPECTED[kind];
  if (!found) throw new RangeError(`branch ${branch}: nothing is expected of ${kind}`);
  return found;
}

/** Whether a subject is the store, or a string or end of it. */
export const isOf = (subject: string, store: string): boolean =>
  subject === store || subject.startsWith(`${store}/`) || subject.startsWith(`${store}_`);
