import { effect, signal } from '@preact/signals';
import { api } from '../lib/page.js';
import { Asking } from './asking.js';
import type { TypedBlock } from './scheduleText.js';
import type { ScheduleCheck } from './wire.js';

const KEPT_AS = 'rockhour.schedule';

function kept(): string {
  try {
    return sessionStorage.getItem(KEPT_AS) ?? '';
  } catch {
    // Storage may be forbidden; a reload then empties the field.
    return '';
  }
}

/** What stands in the field; it stays while other parts are looked at, and over a reload. */
export const scheduleText = signal(kept());
effect(() => {
  try {
    sessionStorage.setItem(KEPT_AS, scheduleText.value);
  } catch {
    // As above.
  }
});
export const scheduleCertainty = signal(0.9);

/** An answer, with the text and the rows that it is of. */
export interface Checked extends ScheduleCheck {
  readonly text: string;
}

export const scheduleAsking = new Asking<Checked>();
/** Lines of the rows that were last asked about, for faults of the server. */
export const askedLines = signal<readonly number[]>([]);
/** The text that was last asked about: a refusal is of that one alone. */
export const askedText = signal('');

/** Holds a schedule against the unit. Local times are the connection's; without one, UTC. */
export function checkSchedule(
  { unit, zone }: { unit: string; zone: string | null },
  blocks: readonly TypedBlock[],
  text: string,
): void {
  askedText.value = text;
  askedLines.value = blocks.map(({ line }) => line);
  const body = {
    blocks: blocks.map(({ mode, power_MW_el, from, to }) => ({ mode, power_MW_el, from, to })),
    certainty: scheduleCertainty.value,
    zone: zone ?? 'UTC',
    stale: 'mark',
  };
  void scheduleAsking.ask(unit, async (ended) => {
    const check = await api.ahead<ScheduleCheck>(api.path(unit, 'schedule'), { body }, ended);
    return { ...check, text };
  });
}
