import { type AlarmRules, Alarms } from './alarms.js';
import { Checkpoints } from './checkpoints.js';
import { Cycles } from './cycles.js';
import type { Database } from './database.js';
import { Estimates } from './estimates.js';
import { Events } from './events.js';
import { guarded } from './guarded.js';
import { LateReadings } from './lateReadings.js';
import { Layouts } from './layouts.js';
import { Offers } from './offers.js';
import { Outbox } from './outbox.js';
import { Profiles } from './profiles.js';
import { RewindPoints } from './rewindPoints.js';
import { Rewinds } from './rewinds.js';
import { Rollups } from './rollups.js';
import { Sequence } from './sequence.js';
import { WatchViews } from './watchViews.js';

/** An open history: its file, and the parts that each have some tables of it. */
export interface HistoryParts {
  readonly database: Database;
  readonly rollups: Rollups;
  readonly estimates: Estimates;
  readonly profiles: Profiles;
  readonly events: Events;
  readonly alarms: Alarms;
  readonly checkpoints: Checkpoints;
  readonly outbox: Outbox;
  readonly offers: Offers;
  readonly cycles: Cycles;
  readonly watch: WatchViews;
  readonly rewindPoints: RewindPoints;
  readonly late: LateReadings;
  readonly rewinds: Rewinds;
  readonly sequence: Sequence;
}

const HANDED_OUT = [
  ...(['estimates', 'profiles', 'events', 'alarms', 'checkpoints', 'outbox', 'offers'] as const),
  ...(['cycles', 'watch', 'rewindPoints', 'late', 'rewinds'] as const),
];
/** Parts that others use. */
export type HandedOut = Pick<HistoryParts, (typeof HANDED_OUT)[number]>;

export function partsOf(database: Database, rules: AlarmRules): HistoryParts {
  const sequence = new Sequence(database);
  const alarms = new Alarms(database, rules);
  const layouts = new Layouts(database);
  const rollups = new Rollups(database, layouts);
  return {
    database,
    rollups,
    estimates: new Estimates(database, sequence, layouts, rollups),
    profiles: new Profiles(database),
    events: new Events(database, sequence, alarms),
    alarms,
    checkpoints: new Checkpoints(database),
    outbox: new Outbox(database),
    offers: new Offers(database),
    cycles: new Cycles(database, sequence),
    watch: new WatchViews(database),
    rewindPoints: new RewindPoints(database),
    late: new LateReadings(database),
    rewinds: new Rewinds(database, sequence),
    sequence,
  };
}

/**
 * The parts that others use, each call of which acts on damage.
 * @param mend gives the parts of a fresh history; null where the failure is not to be acted on
 */
export function guardedParts(
  parts: HistoryParts,
  mend: (thrown: unknown) => HistoryParts | null,
): HandedOut {
  const one = <K extends keyof HandedOut>(name: K) =>
    guarded(parts[name], (thrown) => mend(thrown)?.[name] ?? null);
  return Object.fromEntries(HANDED_OUT.map((name) => [name, one(name)])) as unknown as HandedOut;
}
