import type { UnitDefinition } from '../definitions.js';
import type { Quality } from '../estimate.js';
import { GIVEN } from './given.js';
import { limitsView } from './limitsView.js';

/**
 * Head of an answer about what lies ahead, whoever gives it, but for the estimate's age.
 *
 * @param time source time of the estimate, ISO 8601; a stale one is valid no longer than that
 */
export function aheadHead(unit: UnitDefinition, time: string, quality: Quality, stale = false) {
  const time_ms = Date.parse(time);
  const valid_ms = stale ? time_ms : time_ms + unit.hours_every_s * 1000;
  return {
    unit: unit.id,
    time,
    valid_until: new Date(valid_ms).toISOString(),
    quality,
    given: GIVEN,
    limits: limitsView(unit, time_ms),
  };
}
