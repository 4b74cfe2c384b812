import type { FirstMinutes } from '../core/estimate.js';

/** What is missing of a power in its first minutes, in words. */
export function firstMinutesText(lack: FirstMinutes, done: 'given' | 'taken'): string {
  const { lacking_MW, lacking_at_worst_MW, minutes, lacking_MWh_el, probability } = lack;
  const odds = `${Math.round(probability * 100)} % that it counts`;
  const worst = `up to ${lacking_at_worst_MW.toFixed(2)} MW with 90 %`;
  if (!(lacking_MW > 0)) return `at first some of it may not be ${done}, ${worst}; ${odds}`;
  const least = Math.max(0.1, minutes).toFixed(1);
  const energy = `${lacking_MWh_el.toFixed(3)} MWh_el`;
  return `at first up to ${lacking_MW.toFixed(2)} MW of it are not ${done}, for ${least} min, ${energy} (${worst}; ${odds})`;
}
