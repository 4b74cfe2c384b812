import type { AlarmEntry } from '../core/alarm/entry.js';
import type { AlarmReport } from '../core/alarm/report.js';
import { table } from './table.js';

const words = (text: string) => text.replaceAll('_', ' ');

/** What is shown, with what to do; then one line each on what is held back. */
export function listText({
  standing,
  suppressed,
}: {
  readonly standing: readonly AlarmEntry[];
  readonly suppressed: readonly AlarmEntry[];
}): string {
  const shown = standing.map((entry) =>
    [
      `${entry.class}, ${entry.priority}, ${words(entry.state)}${by(entry)}: ${entry.id}`,
      `  ${entry.time}  ${entry.message}`,
      `  to do ${until(entry)}: ${entry.action}`,
      `  else: ${entry.consequence}`,
    ].join('\n'),
  );
  const held = suppressed.map((entry) => `${words(entry.state)}: ${entry.id}${heldBy(entry)}`);
  return [
    ...(shown.length === 0 ? ['Nothing stands.'] : shown),
    ...(held.length === 0 ? [] : ['', `Held back (${held.length}):`, ...held]),
  ].join('\n');
}

function until({ act_by, respond_within_h }: AlarmEntry): string {
  return act_by === undefined ? `within ${hours(respond_within_h)}` : `until ${act_by}`;
}

function by({ acknowledged_by }: AlarmEntry): string {
  return acknowledged_by === null ? '' : ` by ${acknowledged_by}`;
}

function heldBy({ shelved, out_of_service, active }: AlarmEntry): string {
  const stands = active ? ', stands' : '';
  if (shelved) return `${stands}, by ${shelved.by} until ${shelved.until}: ${shelved.why}`;
  if (out_of_service) return `${stands}, by ${out_of_service.by}: ${out_of_service.why}`;
  return stands;
}

function hours(h: number): string {
  if (h < 1) return `${Math.round(60 * h)} min`;
  return h < 48 ? `${h} h` : `${Math.round(h / 24)} d`;
}

const percent = (share: number) => `${(100 * share).toFixed(1)} %`;

export function figuresText(report: AlarmReport): string {
  const { by_priority, floods, chattering, stale, most_frequent, held_back } = report;
  const shares = by_priority
    ? ` (${percent(by_priority.high)} high, ${percent(by_priority.medium)} medium, ${percent(by_priority.low)} low)`
    : '';
  const lines = [
    `${report.unit ?? 'all units'}, ${report.from} to ${report.to}`,
    `${report.annunciated} alarms${shares}, ${report.alerts} alerts`,
    `${report.per_10_min.toFixed(3)} alarms per 10 min, ${report.per_day.toFixed(2)} per day, at most ` +
      `${report.most_in_10_min} in 10 min`,
    `${floods.length} floods, ${percent(report.share_in_flood)} of the time`,
    ...floods.map((flood) => `  ${flood.from} to ${flood.to ?? 'now'}: ${flood.count} alarms`),
    `chattering: ${chattering.map((one) => `${one.id} (${one.most_in_a_minute} in a minute)`).join(', ') || 'none'}`,
    `standing longer than a day: ${stale.map((one) => `${one.id} (${one.hours.toFixed(1)} h)`).join(', ') || 'none'}`,
    `held back now: ${held_back.shelved} shelved, ${held_back.suppressed_by_design} by design, ` +
      `${held_back.out_of_service} out of service`,
  ];
  if (most_frequent.length === 0) return lines.join('\n');
  const rows = most_frequent.map(({ id, count, share }) => [id, count, percent(share)]);
  return [...lines, '', table(['most frequent alarm', 'times', 'share'], rows)].join('\n');
}
