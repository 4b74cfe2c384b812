import { INDICATOR_KINDS, type IndicatorKind } from './indicator.js';
import { INDICATORS_VERSION, type IndicatorStates } from './indicators.js';
import { INDICATOR_EVENTS } from './kinds.js';
import type { WatchState } from './watch.js';

/** What an edit of the definition has left as it was. */
export interface Unchanged {
  readonly unit: string;
  /** Stores before and now, in the order of the state's arrays. */
  readonly before: readonly string[];
  readonly now: readonly string[];
  /** Ids of the stores that are in both, with the same bed and strings. */
  readonly stores: ReadonlySet<string>;
  readonly machine: boolean;
  readonly rating: boolean;
}

/** Indicators of the whole unit: what is healthy for them hangs on every store. */
const OF_UNIT: ReadonlySet<IndicatorKind> = new Set([
  'gas_inventory',
  'store_mismatch',
  'energy_lost',
]);

/**
 * Kinds of indicators that a build of another INDICATORS_VERSION begins anew; empty where it takes them
 * over.
 */
export function lostToVersion(saved: WatchState): string[] {
  if (saved.indicators_version === INDICATORS_VERSION) return [];
  const held = saved.indicators ?? {};
  return INDICATOR_KINDS.filter((kind) => held[kind] !== undefined);
}

/**
 * States of the indicators that an edit has not touched: those of unchanged stores as they are, those of
 * the whole unit where all its stores are unchanged. The others are begun anew.
 *
 * @param fresh states of a unit as now defined, to take the places of what is lost; not kept
 * @returns the states, and what was lost as `INDICATOR/SUBJECT`
 */
export function carryIndicators(
  saved: WatchState,
  fresh: IndicatorStates,
  unchanged: Unchanged,
): { states: IndicatorStates; lost: string[] } {
  const lost = lostToVersion(saved);
  if (lost.length > 0) return { states: {}, lost };
  // What is no indicator's own, as how old values are, goes on with those that are there.
  const states: IndicatorStates = { ...saved.indicators };
  for (const kind of INDICATOR_KINDS) {
    const state = states[kind];
    if (state === undefined) continue;
    delete states[kind];
    const dropped = (subject: string) => lost.push(`${kind}/${subject}`);
    const byMachine = kind === 'plateau' || kind === 'energy_lost';
    const fits = (unchanged.machine || !byMachine) && (unchanged.rating || kind !== 'energy_lost');
    if (OF_UNIT.has(kind)) {
      const { before, now, stores } = unchanged;
      const same = before.join('\n') === now.join('\n') && now.every((id) => stores.has(id));
      if (fits && same) states[kind] = state;
      else dropped(unchanged.unit);
    } else {
      states[kind] = carryStores(
        state as ByPlace | BySubject,
        fresh[kind],
        unchanged,
        fits,
        dropped,
      );
    }
  }
  return { states, lost };
}

/** States in the order of the stores. */
interface ByPlace {
  readonly stores: readonly unknown[];
}
/** States by id of a store, or by `STORE/STRING`. */
type BySubject = Readonly<Record<string, unknown>>;

function carryStores(
  state: ByPlace | BySubject,
  fresh: unknown,
  { before, now, stores }: Unchanged,
  fits: boolean,
  dropped: (subject: string) => void,
): unknown {
  const keeps = (id: string) => fits && stores.has(id);
  if (Array.isArray(state.stores)) {
    const { stores: own } = state as ByPlace;
    for (const id of before) if (!keeps(id)) dropped(id);
    const anew = (fresh as ByPlace).stores;
    const carried = now.map((id, s) => (keeps(id) ? own[before.indexOf(id)] : anew[s]));
    return { ...state, stores: carried };
  }
  return Object.fromEntries(
    Object.entries(state).filter(([subject]) => {
      if (keeps(subject.split('/')[0] as string)) return true;
      dropped(subject);
      return false;
    }),
  );
}

const KIND_OF_EVENT = new Map(
  Object.entries(INDICATOR_EVENTS).map(([kind, event]) => [event as string, kind]),
);

/**
 * Whether a condition still has what it was told by: its subject, and, of an indicator, its state.
 *
 * @param key `KIND/SUBJECT` of the condition
 * @param lost as `carryIndicators` tells it
 */
export function conditionFits(
  key: string,
  subjects: ReadonlySet<string>,
  lost: ReadonlySet<string>,
): boolean {
  const kind = key.slice(0, key.indexOf('/'));
  const subject = key.slice(kind.length + 1);
  const indicator = KIND_OF_EVENT.get(kind);
  if (indicator === undefined) return subjects.has(subject);
  if (lost.has(indicator) || lost.has(`${indicator}/${subject}`)) return false;
  return subjects.has(subject) || subjects.has(subject.split('/')[0] as string);
}
