import { batch, computed, signal } from '@preact/signals';
import type { Beat, LeftOut, Standing, StreamState, UnitDefinition, UnitList } from './wire.js';

export type Connection = 'connecting' | 'live' | 'lost';

/** What is known of a unit; a change makes another object of it. */
export interface UnitEntry {
  readonly unit: string;
  readonly name: string;
  readonly definition: UnitDefinition | null;
  readonly state: StreamState | null;
  /** Age of the newest reading as last told [s], and when that was [ms of this page's clock]. */
  readonly age_s: number | null;
  readonly aged_ms: number;
  readonly stale: boolean;
  /** At which of the configured powers the firm figures of all units are told [MW]. */
  readonly firmPower_MW: number | null;
}

/**
 * Everything that all sheets share, as signals: who reads one is drawn again when it changes. Its size
 * is bounded by the number of units and of standing events.
 */
export class PageModel {
  readonly site = signal('');
  readonly version = signal('');
  readonly connection = signal<Connection>('connecting');
  /** Wall clock of the last change of `connection` to `lost`. */
  readonly lostSince_ms = signal(0);
  readonly units = signal<readonly UnitEntry[]>([]);
  /** Units that are not run until their configuration is mended. */
  readonly leftOut = signal<readonly LeftOut[]>([]);
  readonly selected = signal<string | null>(null);
  /** Unit that the address asked for and that is not run here; null once another was chosen. */
  readonly notHere = signal<string | null>(null);
  readonly standing = signal<readonly Standing[]>([]);
  /** Shelved, suppressed by design or out of service. */
  readonly heldBack = signal<readonly Standing[]>([]);
  /** Longest time for which one may be shelved [h], as configured. */
  readonly shelveMost_h = signal(0);
  /** Events of a storm that were not sent one by one, and when the last of them came [wall clock]. */
  readonly storm = signal<{ readonly count: number; readonly last_ms: number } | null>(null);
  /** Goes on once a second, for ages that grow by themselves [ms of performance.now()]. */
  readonly tick_ms = signal(performance.now());
  /** Counts what was told about alarms: lists that are asked for are asked for again. */
  readonly alarmNews = signal(0);
  /** The chosen unit. */
  readonly unit = computed(
    () => this.units.value.find((entry) => entry.unit === this.selected.value) ?? null,
  );

  takeUnits(list: UnitList): void {
    batch(() => {
      this.site.value = list.site;
      this.version.value = list.version;
      this.leftOut.value = list.left_out;
      const before = this.units.value;
      this.units.value = list.units.map((summary) => {
        const known = before.find((entry) => entry.unit === summary.unit);
        const { unit, name, age_s, stale, dispatchable } = summary;
        return {
          unit,
          name,
          definition: known?.definition ?? null,
          state: known?.state ?? null,
          age_s,
          aged_ms: performance.now(),
          stale,
          firmPower_MW: dispatchable?.power_MW ?? known?.firmPower_MW ?? null,
        };
      });
      if (this.unit.value === null) this.selected.value = this.units.value[0]?.unit ?? null;
    });
  }

  takeStorm(leftOut: number): void {
    const count = (this.storm.value?.count ?? 0) + leftOut;
    this.storm.value = { count, last_ms: Date.now() };
  }

  takeDefinition(unit: string, definition: UnitDefinition | null): void {
    this.change(unit, { definition });
  }

  takeState(state: StreamState): void {
    const before = this.units.value.find((entry) => entry.unit === state.unit);
    if (before === undefined) return;
    // A state without profile, as another unit's, keeps the profile that is shown.
    const profile = state.profile ?? before.state?.profile ?? null;
    this.change(state.unit, {
      state: { ...state, profile },
      age_s: state.age_s,
      aged_ms: performance.now(),
      stale: state.stale,
    });
  }

  takeBeat(beat: Beat): void {
    batch(() => {
      for (const { unit, age_s, stale } of beat.units) {
        this.change(unit, { age_s, aged_ms: performance.now(), stale });
      }
    });
  }

  setConnection(connection: Connection): void {
    if (connection === this.connection.value) return;
    batch(() => {
      if (connection === 'lost') this.lostSince_ms.value = Date.now();
      this.connection.value = connection;
    });
  }

  private change(unit: string, news: Partial<UnitEntry>): void {
    const before = this.units.value;
    if (!before.some((entry) => entry.unit === unit)) return;
    this.units.value = before.map((entry) => (entry.unit === unit ? { ...entry, ...news } : entry));
  }
}

/**
 * Age of the newest reading now: it goes on growing while nothing comes.
 * @param tick_ms of the model; read it, so that the age is drawn every second
 */
export function ageNow(entry: UnitEntry, tick_ms: number): number | null {
  if (entry.age_s === null) return null;
  return entry.age_s + Math.max(0, Math.max(tick_ms, performance.now()) - entry.aged_ms) / 1000;
}
