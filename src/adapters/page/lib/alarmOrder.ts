import type { Standing } from './wire.js';

/** Those to acknowledge before the others. */
const STATE_ORDER: Readonly<Record<Standing['state'], number>> = {
  unacknowledged: 0,
  latched_unacknowledged: 1,
  returned_unacknowledged: 1,
  acknowledged: 2,
  latched_acknowledged: 2,
  normal: 3,
  shelved: 4,
  suppressed_by_design: 4,
  out_of_service: 4,
};
const PRIORITY_ORDER = { high: 0, medium: 1, low: 2 } as const;

export const ALARM_STATE_WORDS: Readonly<Record<Standing['state'], string>> = {
  unacknowledged: 'not acknowledged',
  latched_unacknowledged: 'latched, not acknowledged',
  returned_unacknowledged: 'returned to normal, not acknowledged',
  acknowledged: 'acknowledged',
  latched_acknowledged: 'latched, acknowledged',
  normal: 'normal',
  shelved: 'shelved',
  suppressed_by_design: 'suppressed by design',
  out_of_service: 'out of service',
};

/** Waits for somebody to acknowledge it. */
export function isOpen({ state }: Standing): boolean {
  return STATE_ORDER[state] < STATE_ORDER.acknowledged;
}

/** What asks for an answer first: open before acknowledged, alarms before alerts, by priority. */
export function inOrder(standing: readonly Standing[]): Standing[] {
  return [...standing].sort(
    (a, b) =>
      STATE_ORDER[a.state] - STATE_ORDER[b.state] ||
      (a.class === b.class ? 0 : a.class === 'alarm' ? -1 : 1) ||
      PRIORITY_ORDER[a.priority] - PRIORITY_ORDER[b.priority] ||
      b.time.localeCompare(a.time),
  );
}

export function counted(count: number, name: string): string {
  return `${count} ${name}${count === 1 ? '' : 's'}`;
}

/** `1 alarm, 2 alerts` of those that are open; '' where there is none. */
export function openWords(standing: readonly Standing[]): { words: string; alarms: number } {
  const open = standing.filter(isOpen);
  const alarms = open.filter((event) => event.class === 'alarm').length;
  const rest = open.length - alarms;
  const words = [alarms > 0 && counted(alarms, 'alarm'), rest > 0 && counted(rest, 'alert')];
  return { words: words.filter((one) => one !== false).join(', '), alarms };
}
