import type { BaselineState } from '../baseline.js';
import type { IndicatorRule } from '../indicator.js';
import { type Followed, withSigma } from './shown.js';

/** Ten minutes at a time that no value was made of, and what is learned as healthy. */
interface LeftOut {
  readonly uneven: number;
  readonly absurd: number;
  readonly healthy: BaselineState;
}

/**
 * Plain sentence on a store's pressure drop.
 *
 * @param left what was left out, and whether healthy is kept
 * @param channel of the measured drop, -1 = none
 * @param learned whether the healthy ratio is this bed's own
 * @param only whether the excess is there only below freezing; null = not known
 */
export function dropSentence(
  store: string,
  followed: Followed,
  left: LeftOut,
  channel: number,
  learned: boolean,
  only: boolean | null,
  rule: IndicatorRule,
): string {
  if (channel < 0)
    return `Store ${store}: no pressure drop is measured, so dust and frost do not show in it.`;
  const { value, sigma, test } = followed;
  if (value === null || sigma === null)
    return `Store ${store}: its pressure drop is known after an hour of even flow.${leftOut(left)}`;
  const against = learned ? 'its healthy one' : 'the configured law';
  const ratio = `${withSigma(value, sigma, 2)} times ${against} at the same flow and temperatures (limit ${rule.limit})`;
  if (!test.degraded) {
    const note = left.healthy.kept ? '' : ' What is healthy is still being learned.';
    return `Store ${store}: pressure drop ${ratio}.${note}${leftOut(left)}`;
  }
  const when =
    only === true
      ? ' Only while rock is below freezing; it is gone when the bed is warm.'
      : only === false
        ? ' Also while no rock is below freezing.'
        : ' So far the bed was never free of rock below freezing, so frost and dust cannot be told apart by it.';
  return `Store ${store}: pressure drop ${ratio}: the bed lets less gas through.${when}`;
}

function leftOut({ uneven, absurd }: LeftOut): string {
  const parts = [
    uneven > 0 ? `${uneven} with flow that was uneven or hardly read` : '',
    absurd > 0 ? `${absurd} with a drop that no bed has` : '',
  ].filter((part) => part !== '');
  return parts.length === 0 ? '' : ` Left out so far, of ten minutes each: ${parts.join(', ')}.`;
}
