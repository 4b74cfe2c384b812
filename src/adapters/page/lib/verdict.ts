import { inOrder, isOpen } from './alarmOrder.js';
import { clock, dateClock, hoursText } from './format.js';
import type { UnitEntry } from './model.js';
import type { Trust } from './trust.js';
import type { Standing } from './wire.js';

/**
 * Whether all is well with a unit: `urgent` and `care` are new and coloured, `known` stands and is
 * acknowledged, `unknown` cannot be told from here.
 */
export type Level = 'well' | 'known' | 'care' | 'urgent' | 'unknown';

export interface Verdict {
  readonly level: Level;
  /** A few words that are read from afar. */
  readonly words: string;
  /** What that rests on, or what to do. */
  readonly because: string;
}

const NOT_KNOWN: Partial<Record<Trust, readonly [string, string]>> = {
  connecting: ['Connecting.', 'The first figures are awaited.'],
  lost: [
    'Not known: no connection.',
    'Go by the control system meanwhile. If it lasts: is the daemon running, does the network reach it?',
  ],
  stale: [
    'Not known: no new readings.',
    'Go by the control system meanwhile. Does the data collection run, does the broker take its messages?',
  ],
  empty: [
    'Not known: no scan yet.',
    'It begins with the first scan. If none comes: do the names of the channels fit those that are sent?',
  ],
};

/** `outlet near limit, hot`: what it is about, without its figures. */
export const nameOf = ({ kind, subject }: Standing): string =>
  `${kind.replaceAll('_', ' ')}, ${subject}`;

/** How long there is to act, against the time of the newest estimate; null where nobody knows. */
export function actWords({ act_by }: Standing, now: string | undefined): string | null {
  if (act_by === undefined) return null;
  if (now === undefined) return `act by ${clock(act_by)}`;
  const left_h = (Date.parse(act_by) - Date.parse(now)) / 3.6e6;
  return left_h > 0
    ? `act by ${clock(act_by)}, in ${hoursText(left_h)}`
    : `to be acted on until ${clock(act_by)}, which is over`;
}

/**
 * The worst that is to be said of a unit, the new before the known.
 *
 * @param standing what stands in this unit
 */
export function verdictOf(
  trust: Trust,
  entry: UnitEntry | null,
  standing: readonly Standing[],
): Verdict {
  const notKnown = NOT_KNOWN[trust];
  if (notKnown !== undefined) {
    return { level: 'unknown', words: notKnown[0], because: notKnown[1] };
  }
  const events = inOrder(standing);
  const time = entry?.state?.estimate?.time;
  const open = events.filter(isOpen);
  const alarm = open.find((event) => event.class === 'alarm');
  if (alarm !== undefined) return ofEvent('urgent', alarm, open, time);
  if (trust === 'blind') {
    return {
      level: 'care',
      words: 'Blind: no readings.',
      because: 'The figures are a prediction, and their uncertainty grows.',
    };
  }
  const [first] = open;
  if (first !== undefined) return ofEvent('care', first, open, time);
  if (trust === 'degraded') {
    return {
      level: 'care',
      words: 'Degraded: readings are left out.',
      because: `${inUse(entry)}. The estimate goes on without the others.`,
    };
  }
  const [known] = events;
  if (known !== undefined) return ofEvent('known', known, events, time);
  const fewer = thinned(entry);
  if (fewer !== null) return fewer;
  return {
    level: 'well',
    words: 'All as it should be.',
    because: `${inUse(entry)} · estimate good · nothing stands`,
  };
}

/** How the words begin where all that stands is acknowledged. */
export const KNOWN_LEAD = 'Nothing new. Known';
const LEAD = { urgent: 'Alarm', care: 'Alert', known: KNOWN_LEAD } as const;

function ofEvent(
  level: keyof typeof LEAD,
  event: Standing,
  all: readonly Standing[],
  time: string | undefined,
): Verdict {
  const act = event.active ? actWords(event, time) : null;
  const more = all.length > 1 ? ` · ${all.length - 1} more` : '';
  return {
    level,
    words: `${LEAD[level]}: ${nameOf(event)}${act === null ? '' : `; ${act}`}${more}`,
    because: becauseOf(event),
  };
}

/** What to do of an alarm; of others since when: the list below has what was seen, once. */
function becauseOf(event: Standing): string {
  const since = dateClock(event.time);
  const who = event.acknowledged_by;
  if (!event.active) return `Since ${since}, and over again; it waits for its acknowledgement.`;
  if (!isOpen(event)) return `Since ${since}${who === null ? '' : `, acknowledged by ${who}`}.`;
  if (event.class === 'alarm') return event.action;
  return `Since ${since}. An alert: nothing has to be done at once.`;
}

/** A store that has lost more than this share of its thermocouples is seen less well. */
const THIN_SHARE = 0.2;

/** What of a unit's thermocouples is not in use, although nothing stands; null where that is little. */
function thinned(entry: UnitEntry | null): Verdict | null {
  const stores = (entry?.definition?.stores ?? []).flatMap(({ id, strings }) => {
    const sensors = entry?.state?.estimate?.stores[id]?.sensors;
    const all = strings.reduce((sum, string) => sum + string.thermocouples.length, 0);
    return sensors === undefined ? [] : [{ id, all, ...sensors }];
  });
  const thin = stores.filter(({ all, used }) => all - used > THIN_SHARE * all);
  if (thin.length > 0) {
    const told = thin.map(({ id, all, used }) => `${id}: ${used} of ${all}`).join(', ');
    return {
      level: 'care',
      words: 'Many thermocouples are not in use.',
      because: `In use in store ${told}. The estimate goes on; Rock, Thermocouples says why.`,
    };
  }
  const rejected = stores.reduce((sum, store) => sum + store.rejected.length, 0);
  if (rejected === 0) return null;
  const are = rejected === 1 ? 'thermocouple is' : 'thermocouples are';
  return {
    level: 'known',
    words: `As it should be, but ${rejected} ${are} left out.`,
    because: `${inUse(entry)} · estimate good · nothing stands`,
  };
}

/** `82 of 84 thermocouples in use` */
function inUse(entry: UnitEntry | null): string {
  const stores = Object.values(entry?.state?.estimate?.stores ?? {});
  const used = stores.reduce((sum, store) => sum + store.sensors.used, 0);
  const strings = entry?.definition?.stores.flatMap((store) => store.strings) ?? [];
  const all = strings.reduce((sum, string) => sum + string.thermocouples.length, 0);
  return all === 0 ? `${used} thermocouples in use` : `${used} of ${all} thermocouples in use`;
}
