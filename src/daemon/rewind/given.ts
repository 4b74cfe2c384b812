import type { Checkpoint } from '../../adapters/history/checkpoints.js';
import type { History } from '../../adapters/history/history.js';
import type { Journal, JournalEntry } from '../../adapters/history/journal.js';
import type { UnitBackup } from '../../adapters/history/unitBackup.js';
import { shapeOf, type UnitShape } from '../../core/unitShape.js';
import { isOfTheMachine, type WatchEvent } from '../../core/watch/event.js';
import { reasonOf } from '../../errors.js';
import type { UnitRunner } from '../unitRunner.js';

/** Journal run again for a bed that is begun anew [ms of arrival]. */
const AFRESH_MS = 86_400_000;
const SCANS_MS = 3_600_000;

/** A unit in a state from outside, from which it is to go on. */
export interface GivenStart {
  /** A runner in that state, or one that awaits to take it over. */
  readonly second: UnitRunner;
  /** The state, with its place in this journal. */
  readonly checkpoint: Checkpoint;
  /** Of the definition that it was saved under, where that is another one than now. */
  readonly shape: UnitShape | null;
  /** Entries behind this number are taken in. */
  readonly from_seq: number;
  /** Scans of before are not entered: they are the state's own, or nothing is known of them [ms]. */
  readonly enter_from_ms: number;
  /** The journal has every entry since the state. */
  readonly reaches: boolean;
  /** Stores whose beds are begun anew, and `INDICATOR/SUBJECT` of what was learned as healthy and is lost. */
  readonly anew: readonly string[];
  readonly lost: readonly string[];
  readonly restored: { readonly state_of: string; readonly who: string };
}

export interface GivenParts {
  readonly journal: Journal;
  readonly history: History;
  fresh(): UnitRunner;
  now_ms: number;
  /** A state further ahead of this machine's clock is not believed [ms]. */
  readonly future_tolerance_ms: number;
}

/**
 * Holds a backup against the unit as it is now and makes a runner of it; nothing that runs is touched.
 * @throws RangeError in words that go on after 'the file'
 */
export function startOf(backup: UnitBackup, who: string, parts: GivenParts): GivenStart {
  const { journal, history, fresh, now_ms, future_tolerance_ms } = parts;
  const second = fresh();
  const { unit } = second;
  if (backup.unit !== unit.id) throw new RangeError(`is of unit ${backup.unit}, not ${unit.id}`);
  const { time_ms, image } = backup;
  const state_of = new Date(time_ms).toISOString();
  if (time_ms > now_ms + future_tolerance_ms)
    throw new RangeError(`is of ${state_of}, which is ahead of this machine's clock`);
  const place = placeIn(journal, backup);
  const common = { reaches: place.reaches, restored: { state_of, who } };
  const period_ms = unit.scan_period_s * 1000;
  const { shape } = image as { shape?: UnitShape };
  const isSame = JSON.stringify(shape) === JSON.stringify(shapeOf(unit));
  const checkpoint = { time_ms, journal_seq: place.seq, image };
  const stored = { ...checkpoint, load: () => structuredClone(image) };
  try {
    if (isSame) {
      const lost = second.restore(stored, 0, standingOf(unit.id, history));
      second.clocks.forget();
      if (second.checkpoint()?.time_ms !== time_ms)
        throw new RangeError('its state is of another time than it says');
      second.prove();
      const open_ms = second.openFrom! * period_ms;
      const enter_from_ms = Math.max(open_ms, Math.floor(place.first_ms / period_ms) * period_ms);
      return {
        ...{ ...common, second, checkpoint, shape: null, from_seq: place.seq, enter_from_ms },
        ...{ anew: [], lost },
      };
    }
    const { anew, lost, fits, state } = second.weigh(stored);
    second.prove(state);
    const { standing = standingOf(unit.id, history) } = image as { standing?: WatchEvent[] };
    const kept = standing.filter(({ kind, subject }) => fits(`${kind}/${subject}`));
    const back_ms = anew.length > 0 ? AFRESH_MS : SCANS_MS;
    const from_seq = Math.min(place.seq, journal.seqBefore(place.arrival_ms - back_ms));
    second.takeOverLater(stored, from_seq, kept);
    const next_ms = (Math.floor(time_ms / period_ms) + 1) * period_ms;
    const enter_from_ms = Math.max(next_ms, Math.floor(place.first_ms / period_ms) * period_ms);
    return {
      ...{ ...common, second, checkpoint, shape: shape!, from_seq, enter_from_ms },
      ...{ anew, lost },
    };
  } catch (thrown) {
    throw new RangeError(`cannot be used by this version: ${reasonOf(thrown)}`);
  }
}

/** Where in this journal a backup was made. */
interface Place {
  readonly seq: number;
  /** When the entry there came [ms]. */
  readonly arrival_ms: number;
  readonly reaches: boolean;
  /** Source time before which nothing is known since the state [ms]. */
  readonly first_ms: number;
}

/** By its anchor; in another journal, or one that has been thinned, by the time that it came. */
function placeIn(journal: Journal, { journal_seq, anchor, time_ms }: UnitBackup): Place {
  const arrival_ms = anchor?.arrival_ms ?? time_ms;
  const own = anchor === null ? undefined : journal.at(journal_seq);
  if (own && isSameEntry(own, anchor!)) {
    const first_ms = Number.NEGATIVE_INFINITY;
    return { seq: journal_seq, arrival_ms, reaches: true, first_ms };
  }
  const seq = journal.seqBefore(arrival_ms);
  const [next] = journal.read(seq, 1);
  const first_ms = next ? next.arrival_ms : Number.NEGATIVE_INFINITY;
  return { seq, arrival_ms, reaches: false, first_ms: Math.min(first_ms, 8.64e15) };
}

const isSameEntry = (one: JournalEntry, other: JournalEntry) =>
  JSON.stringify(one) === JSON.stringify(other);

function standingOf(unit: string, history: History): WatchEvent[] {
  return history.alarms.active(unit).filter(({ kind }) => !isOfTheMachine(kind));
}
