import type { RejectedSensor } from '../estimate.js';
import { rejectedSensors } from '../track/storeEstimate.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';

/**
 * Thermocouples of a store that are not read now. Those of a `group_fault` are: the group is used on
 * without what its readings have in common.
 */
export function outOfUse(model: StoreModel, state: StoreState): RejectedSensor[] {
  return rejectedSensors(model, state).filter(({ verdict }) => verdict !== 'group_fault');
}
