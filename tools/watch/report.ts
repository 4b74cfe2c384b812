import { table } from '../../src/commands/table.js';
import { type Figure, figure, median } from '../score/figure.js';
import type { Block } from '../score/table.js';
import { BRANCHES, type Branch, strongest } from './branches.js';
import type { HealthyJudged, Judged } from './judge.js';

/** Goals: 18 of 20 of the strongest grade, no false degradation alert, an alarm a day at most. */
const FOUND_SHARE = 0.9;
const ALARMS_PER_DAY = 1;
const HEALTHY_DAYS = 300;
/** With faults and with healthy weeks, of a whole run. */
const PLANTS = 40;

const HEAD = [
  'fault',
  'seeds',
  'right',
  'wrong cause',
  'no cause',
  'late',
  'missed',
  'right at once',
  'delay h',
  'worst',
  'others',
];

/** Per grade what was found, when, and by which name; then what else was raised. */
export function faultTable(judged: ReadonlyMap<string, readonly Judged[]>): string {
  const rows: string[][] = [];
  const notes: string[] = [];
  for (const branch of BRANCHES) {
    const own = judged.get(branch.id) ?? [];
    if (own.length === 0) continue;
    const count = (outcome: Judged['outcome']) => own.filter((j) => j.outcome === outcome).length;
    const delays = own.flatMap((j) => (j.delay_h === null ? [] : [j.delay_h]));
    const hours = (value: number | null) => (value === null ? '-' : value.toFixed(1));
    rows.push([
      `${branch.words}${strongest(branch) ? ' *' : ''}`,
      String(own.length),
      ...(['right', 'wrong_cause', 'no_cause', 'late', 'missed'] as const).map((o) =>
        String(count(o)),
      ),
      String(own.filter((j) => j.rightAtOnce).length),
      hours(median(delays)),
      hours(delays.length === 0 ? null : Math.max(...delays)),
      String(own.reduce((sum, j) => sum + j.others.length, 0)),
    ]);
    notes.push(...notesOf(branch, own));
  }
  const last = '* must be found in its time with the right cause in 18 of 20';
  return [table(HEAD, rows), last, ...notes].join('\n');
}

function notesOf(branch: Branch, own: readonly Judged[]): string[] {
  return own.flatMap((j) => {
    const words = [
      ...(j.outcome === 'right' ? [] : [`${j.outcome}${j.cause === null ? '' : ` ${j.cause}`}`]),
      ...(j.others.length === 0 ? [] : [`also ${j.others.join(', ')}`]),
    ];
    return words.length === 0 ? [] : [`  ${branch.id} seed ${j.seed}: ${words.join('; ')}`];
  });
}

/** Figures with goals, as the table of `npm run score` has them. */
export function watchBlocks(
  judged: ReadonlyMap<string, readonly Judged[]>,
  healthy: readonly HealthyJudged[],
): Block[] {
  const found: Figure[] = BRANCHES.filter(strongest).flatMap((branch) => {
    const own = judged.get(branch.id) ?? [];
    if (own.length === 0) return [];
    const right = own.filter((j) => j.outcome === 'right').length;
    const goal = { least: Math.ceil(FOUND_SHARE * own.length - 1e-9) };
    const note = `of ${own.length}, within ${branch.window_h} h`;
    return [figure(`${branch.words}, right cause`, right, 'seeds', goal, note)];
  });
  const blocks: Block[] = [];
  const title = 'watch: strongest grade of each fault';
  if (found.length > 0)
    blocks.push({
      scenario: 'watch',
      row: 'faults',
      title,
      seeds: seedsOf(judged),
      figures: found,
    });
  if (healthy.length > 0)
    blocks.push({
      scenario: 'watch',
      row: 'healthy',
      title: 'watch: healthy unit-days',
      seeds: healthy.length,
      figures: healthyFigures(healthy),
    });
  return blocks;
}

const seedsOf = (judged: ReadonlyMap<string, readonly Judged[]>): number =>
  Math.max(0, ...[...judged.values()].map((own) => own.length));

function healthyFigures(healthy: readonly HealthyJudged[]): Figure[] {
  const days = healthy.reduce((sum, h) => sum + h.days, 0);
  const alarms = healthy.reduce((sum, h) => sum + h.alarms, 0);
  const degradation = healthy.flatMap((h) => h.degradation);
  const other = healthy.reduce((sum, h) => sum + h.other.length, 0);
  // A part of the plants is not asked for all the days.
  const enough = healthy.length >= PLANTS;
  const clean = healthy.filter((h) => h.degradation.length === 0).length;
  return [
    figure('unit-days', Math.round(days), 'd', enough ? { least: HEALTHY_DAYS } : null),
    figure('degradation alerts', degradation.length, '', { most: 0 }, byKind(degradation)),
    figure('  plants without any', clean, '', null, `of ${healthy.length}`),
    figure('annunciated alarms', alarms / days, 'per day', { most: ALARMS_PER_DAY }),
    figure('alerts of sensors, data and views', other / days, 'per day'),
  ];
}

function byKind(events: HealthyJudged['degradation']): string {
  const counts = new Map<string, number>();
  for (const { kind } of events) counts.set(kind, (counts.get(kind) ?? 0) + 1);
  return [...counts].map(([kind, n]) => `${kind} ${n}`).join(', ');
}

/** Each false alert, with its seed and time in the healthy stretch, and what is true of it. */
export function falseAlerts(healthy: readonly HealthyJudged[]): string[] {
  return healthy.flatMap(({ seed, degradation }) =>
    degradation.map(
      (e) =>
        `  seed ${seed}, ${e.stretch} at ${e.t_h.toFixed(1)} h: ${e.kind} ${e.subject}: ${e.message}${trulyText(e.truly)}`,
    ),
  );
}

const trulyText = (truly: number | null | undefined): string =>
  typeof truly === 'number'
    ? ` In truth the stores had walked ${(100 * Math.abs(truly)).toFixed(1)} % of the rated energy apart.`
    : '';
