import { counted } from '../lib/alarmOrder.js';
import type { Connection, UnitEntry } from '../lib/model.js';
import { trustOf } from '../lib/trust.js';
import { type Level, type Verdict, verdictOf } from '../lib/verdict.js';
import type { LeftOut, Standing } from '../lib/wire.js';

export interface UnitVerdict extends Verdict {
  readonly name: string;
}

const ORDER: readonly Level[] = ['urgent', 'unknown', 'care', 'known', 'well'];
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

/** The worst of all units in a few words, and which units it is about. */
export function siteVerdict(all: readonly UnitVerdict[]): Verdict {
  const worst = ORDER.find((level) => all.some((one) => one.level === level)) ?? 'unknown';
  if (all.length === 0) return { level: worst, words: 'No units yet.', because: '' };
  const well = all.filter(({ level }) => level === 'well').length;
  const words = `${well} of ${counted(all.length, 'unit')} as ${well === 1 ? 'it' : 'they'} should be.`;
  const asked = ORDER.slice(0, 3).flatMap((level) => all.filter((one) => one.level === level));
  const [only] = all;
  if (all.length === 1 && only !== undefined && only.level !== 'well') return only;
  if (asked.length === 0) {
    const known = all.filter(({ level }) => level === 'known');
    if (known.length > 0) {
      // What is acknowledged asks for nothing, but it is not as it should be.
      const where = known.slice(0, NAMED).map(({ name, words: what }) => `${name}: ${what}`);
      const more = known.length > NAMED ? [`and ${known.length - NAMED} more`] : [];
      return {
        level: worst,
        words: `Nothing new. ${words}`,
        because: [...where, ...more].join(' · '),
      };
    }
    return {
      level: worst,
      words:
        all.length === 1
          ? 'The unit is as it should be.'
          : `All ${counted(all.length, 'unit')} as they should be.`,
      because: 'Nothing stands.',
    };
  }
  const named = asked.slice(0, NAMED).map(({ name, words: what }) => `${name}: ${what}`);
  const rest = asked.length > NAMED ? [`and ${asked.length - NAMED} more`] : [];
  return { level: worst, words, because: [...named, ...rest].join(' · ') };
}
