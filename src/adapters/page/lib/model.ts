import type { Beat, Standing, StreamState, UnitDefinition, UnitList } from './wire.js';

export type Connection = 'connecting' | 'live' | 'lost';

export interface UnitEntry {
  readonly unit: string;
  readonly name: string;
  definition: UnitDefinition | null;
  state: StreamState | null;
  /** Age of the newest reading as last told [s], and when that was [ms of this page's clock]. */
  age_s: number | null;
  aged_ms: number;
  stale: boolean;
}

/** Everything the page knows. Its size is bounded by the number of units and standing events. */
export class PageModel {
  site = '';
  version = '';
  connection: Connection = 'connecting';
  /** Wall clock of the last change of `connection` to `lost`. */
  lostSince_ms = 0;
  units: UnitEntry[] = [];
  selected: string | null = null;
  standing: Standing[] = [];
  /** Shelved, suppressed by design or out of service. */
  heldBack: Standing[] = [];
  private readonly listeners: (() => void)[] = [];
  private drawing = false;

  get unit(): UnitEntry | null {
    return this.units.find((entry) => entry.unit === this.selected) ?? null;
  }

  /** Called once per frame at most, however much changes in between. */
  onChange(listener: () => void): void {
    this.listeners.push(listener);
  }

  changed(): void {
    if (this.drawing) return;
    this.drawing = true;
    requestAnimationFrame(() => {
      this.drawing = false;
      for (const listener of this.listeners) listener();
    });
  }

  takeUnits(list: UnitList): void {
    this.site = list.site;
    this.version = list.version;
    this.units = list.units.map((summary) => {
      const before = this.units.find((entry) => entry.unit === summary.unit);
      const { unit, name, age_s, stale } = summary;
      return {
        unit,
        name,
        definition: before?.definition ?? null,
        state: before?.state ?? null,
        age_s,
        aged_ms: performance.now(),
        stale,
      };
    });
    if (this.unit === null) this.selected = this.units[0]?.unit ?? null;
    this.changed();
  }

  takeState(state: StreamState): void {
    const entry = this.units.find((candidate) => candidate.unit === state.unit);
    if (entry === undefined) return;
    // A state without profile, as another unit's, keeps the profile that is shown.
    entry.state = { ...state, profile: state.profile ?? entry.state?.profile ?? null };
    this.takeAge(entry, state.age_s, state.stale);
    this.changed();
  }

  takeBeat(beat: Beat): void {
    for (const { unit, age_s, stale } of beat.units) {
      const entry = this.units.find((candidate) => candidate.unit === unit);
      if (entry !== undefined) this.takeAge(entry, age_s, stale);
    }
    this.changed();
  }

  setConnection(connection: Connection): void {
    if (connection === this.connection) return;
    if (connection === 'lost') this.lostSince_ms = Date.now();
    this.connection = connection;
    this.changed();
  }

  private takeAge(entry: UnitEntry, age_s: number | null, stale: boolean): void {
    entry.age_s = age_s;
    entry.aged_ms = performance.now();
    entry.stale = stale;
  }
}

/** Age of the newest reading now: it goes on growing while nothing comes. */
export function ageNow(entry: UnitEntry): number | null {
  return entry.age_s === null ? null : entry.age_s + (performance.now() - entry.aged_ms) / 1000;
}
