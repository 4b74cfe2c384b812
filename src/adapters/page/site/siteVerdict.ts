import { counted } from '../lib/alarmOrder.js';
import type { Connection, UnitEntry } from '../lib/model.js';
import { trustOf } from '../lib/trust.js';
import { KNOWN_LEAD, type Level, type Verdict, verdictOf } from '../lib/verdict.js';
import type { LeftOut, Standing } from '../lib/wire.js';

export interface UnitVerdict extends Verdict {
  readonly name: string;
}

const ORDER: readonly Level[] = ['urgent', 'unknown', 'care', 'known', 'well'];
/** Those that ask for something. */
const ASKED = ORDER.slice(0, 3);
/** So many units are named; of more the number is told. */
const NAMED = 4;

export function verdictsOf(
  connection: Connection,
  units: readonly UnitEntry[],
  standing: readonly Standing[],
): UnitVerdict[] {
  return units.map((entry) => {
    const own = standing.filter((event) => event.unit === entry.unit);
    return { name: entry.name, ...verdictOf(trustOf(connection, entry), entry, own) };
  });
}

/** A unit that is not run: nothing at all is known of it. */
export function leftOutVerdict({ name, faults }: LeftOut): UnitVerdict {
  const words = `Left out: ${counted(faults.length, 'fault')} in its configuration.`;
  return { name, level: 'unknown', words, because: '' };
}

/** What the units are counted for, by the worst that is to be said of any. */
const COUNTED: Readonly<Record<Exclude<Level, 'well'>, string>> = {
  urgent: 'Alarm',
  unknown: 'Not known',
  care: 'To be looked at',
  known: KNOWN_LEAD,
};

/** The worst of all units in a few words, and which units it is about. */
export function siteVerdict(all: readonly UnitVerdict[]): Verdict {
  const worst = ORDER.find((level) => all.some((one) => one.level === level)) ?? 'unknown';
  const [first] = all;
  if (first === undefined) return { level: worst, words: 'No units yet.', because: '' };
  const units = counted(all.length, 'unit');
  if (worst === 'well') {
    const words =
      all.length === 1 ? 'The unit is as it should be.' : `All ${units} as they should be.`;
    return { level: worst, words, because: 'Nothing stands.' };
  }
  if (all.length === 1) return first;
  const own = all.filter(({ level }) => level === worst);
  const well = all.filter(({ level }) => level === 'well').length;
  const rest = well === 0 ? '' : `; ${well} as ${well === 1 ? 'it' : 'they'} should be`;
  // What is acknowledged asks for nothing: it is named only where nothing else is.
  const asked = worst === 'known' ? own : ASKED.flatMap((level) => ofLevel(all, level));
  const named = asked.slice(0, NAMED).map(({ name, words }) => `${name}: ${plain(words)}`);
  const more = asked.length > NAMED ? [`and ${asked.length - NAMED} more`] : [];
  return {
    level: worst,
    words: `${COUNTED[worst]}: ${own.length} of ${units}${rest}.`,
    because: [...named, ...more].join(' · '),
  };
}

const ofLevel = (all: readonly UnitVerdict[], level: Level) =>
  all.filter((one) => one.level === level);

/** Without the lead that the words of the site have already. */
const plain = (words: string): string => words.replace(`${KNOWN_LEAD}: `, '');
