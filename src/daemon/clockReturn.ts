import type { JournalEntry } from '../adapters/history/journal.js';
import { packImage, unpackImage } from '../adapters/history/thinImage.js';
import { believedTime, isFuture, LEAST_DATE_MS, type Reading } from '../core/scan/assemble.js';
import { isOfStretch, LEAST_LEAD_MS, type Stretch } from './clockStretch.js';
import type { RunnerImage } from './runnerImage.js';

/** Without a state to go back to, a unit that is no further ahead than this waits [ms]. */
const AFRESH_LEAD_MS = 48 * 3_600_000;
/** What has to come by the clocks of now before a unit goes back: time [ms] and scans begun. */
const LEAST_TIME_MS = 60_000;
const LEAST_SCANS = 3;
/**
 * A unit begins anew once as many scans have begun as its state has: what it has told by clocks that
 * may have been right goes then. Where it is known to have come ahead by about as much as it stands
 * ahead, no more than of so long [ms].
 */
const LONGEST_DOUBT_MS = 86_400_000;
/** What a state counts of which it is not known: it has run for long. */
const MANY_SCANS = 1e12;
/** Scans of which readings are kept meanwhile, the newest. */
const MOST_KEPT_SCANS = 40;
/** A lead is that of a jump ahead where one is no less than this share of the other, or by this less [ms]. */
const LIKE_JUMP = 0.9;
const LIKE_JUMP_MS = 600_000;
/** A state is put aside for as long as the jump was, within these [ms of scans]. */
const ASIDE_MS = { least: 86_400_000, most: 7 * 86_400_000 };
/** Stretches that were put aside and are known. */
const MOST_STRETCHES = 8;

/** A reading with its number in the journal. */
export interface Numbered extends Reading {
  readonly seq: number;
}

/** The unit as it was before its sources came far ahead at once. */
interface Aside {
  /** A `RunnerImage`, packed; a typed array, as structured clones keep no Buffer. null: it was not saved. */
  readonly packed: Uint8Array | null;
  /** Newest source time believed then [ms]. */
  readonly newest_ms: number;
  /** Scans with readings that its state had taken in. */
  readonly scans: number;
  /** Entry that came ahead, and by how much [ms]. */
  readonly seq: number;
  readonly jump_ms: number;
}

/** What has come by the clocks of now while the unit stands ahead of them. */
interface Doubt {
  /** When the first came, by this machine's clock [ms]. */
  readonly since_ms: number;
  /** Scans begun, and the last of them. */
  readonly scans: number;
  readonly index: number;
}

/** Where the time of a unit began that its state has lived through. */
interface Begun {
  /** Its first entry, and the begin of its first scan [ms]. */
  readonly seq: number;
  readonly time_ms: number;
}

/** Structured-cloneable. */
export interface ClockReturnState {
  readonly scans: number;
  /** null, or absent in what was saved before it was told: not known. */
  readonly begun?: Begun | null;
  /** By how much the unit came ahead at once when a state was put aside that was let go since [ms]. */
  readonly once_ms?: number | null;
  readonly heard_ms: number | null;
  readonly leaptAt: number | null;
  readonly doubt: Doubt | null;
  readonly aside: Aside | null;
  readonly kept: readonly Numbered[];
  readonly queue: readonly Numbered[];
  readonly stretches: readonly Stretch[];
}

/** To where a unit goes back. */
export interface WentBack {
  /** null: it begins anew. */
  readonly image: RunnerImage | null;
  readonly stretch: Stretch;
}

/**
 * Clocks of plant and machine may be wrong together, by one server of time, and right again later: the
 * unit then stands at a time that is still to come, and all that is live would be too late for it. Hence
 * a unit whose sources come far ahead at once puts its state aside, and goes back to it once readings
 * that are live by the machine's clock have come for a minute while the unit stands further ahead of it
 * than that. These readings wait meanwhile and are taken in then. All of it is a function of the
 * journal and goes into checkpoints.
 */
export class ClockReturn {
  private scans = 0;
  private begun: Begun | null = null;
  private once_ms: number | null = null;
  /** When the newest entry came, by this machine's clock [ms]. */
  private heard_ms: number | null = null;
  /** Scans taken in when entries began to come much later than those before: it was set, or stood still. */
  private leaptAt: number | null = null;
  private aside: Aside | null = null;
  private doubt: Doubt | null = null;
  private kept: Numbered[] = [];
  private queue: Numbered[] = [];
  private known: Stretch[] = [];

  constructor(
    private readonly unit: {
      readonly scan_period_s: number;
      readonly channels: readonly unknown[];
    },
    private readonly future_tolerance_ms: number,
  ) {}

  /** Stretches that were put aside, oldest first. */
  get stretches(): readonly Stretch[] {
    return this.known;
  }

  /** Newest source time of the state that is put aside [ms]; null where none is. */
  get aside_ms(): number | null {
    return this.aside?.newest_ms ?? null;
  }

  /** By how much the unit has come ahead at once since [ms]: it stands ahead by that if clocks are wrong. */
  get ahead_ms(): number {
    return this.aside?.jump_ms ?? 0;
  }

  /** The last entry by which it was found that clocks had been ahead; 0: never. */
  get found_seq(): number {
    return this.known.at(-1)?.through_seq ?? 0;
  }

  /** Readings that wait until it is clear which time is right. */
  get waiting(): number {
    return this.kept.length;
  }

  /** An entry came, a reading or a mark. Silence has marks: it is no leap of this machine's clock. */
  hear(arrival_ms: number): void {
    if (arrival_ms < LEAST_DATE_MS) return;
    const by_ms = arrival_ms - (this.heard_ms ?? arrival_ms);
    this.heard_ms = arrival_ms;
    if (Math.abs(by_ms) > LEAST_LEAD_MS) this.leaptAt = by_ms > 0 ? this.scans : null;
  }

  /** A scan was taken in; silence counts for nothing. */
  step(reported: number): void {
    if (reported === 0) return;
    this.scans++;
    const since = (scans: number) => (this.scans - scans) * this.unit.scan_period_s * 1000;
    if (this.leaptAt !== null && since(this.leaptAt) >= ASIDE_MS.least) this.leaptAt = null;
    if (this.aside === null) return;
    const { scans, jump_ms } = this.aside;
    if (since(scans) < Math.min(Math.max(ASIDE_MS.least, jump_ms), ASIDE_MS.most)) return;
    this.aside = null;
    this.once_ms = Math.max(jump_ms, this.once_ms ?? 0);
  }

  /**
   * Whether a reading comes so far ahead of all before it, by a machine's clock that has come ahead as
   * well, that the state is to be put aside; of several such that of the furthest is, and the newer of two
   * that are alike: an outage that was as long must not stand for it.
   */
  isJump(reading: Reading, newest_ms: number): boolean {
    if (this.leaptAt === null || isFuture(reading, this.future_tolerance_ms)) return false;
    return believedTime(reading) - newest_ms > Math.max(LEAST_LEAD_MS, leastLike(this.ahead_ms));
  }

  /** Puts the state of before an entry aside. */
  put(image: RunnerImage, newest_ms: number, ahead: Numbered): void {
    const packed = Uint8Array.from(packImage(image));
    const jump_ms = believedTime(ahead) - newest_ms;
    this.aside = { packed, newest_ms, scans: this.scans, seq: ahead.seq, jump_ms };
  }

  /**
   * Looks at a reading before it is taken in.
   * @returns `own`: it is taken in where the unit stands; `kept`: it waits; else the unit goes back, and
   *   what has waited, this one included, is to be had from `next`
   */
  look(reading: Numbered, newest_ms: number | null): 'own' | 'kept' | WentBack {
    const { time_ms, arrival_ms } = reading;
    if (newest_ms === null) {
      this.begin([reading]);
      return 'own';
    }
    const lead_ms = newest_ms - arrival_ms;
    if (lead_ms <= LEAST_LEAD_MS) {
      // The clocks are where the unit stands, again or still.
      if (this.doubt && believedTime(reading) > newest_ms - LEAST_LEAD_MS) this.endDoubt();
      return 'own';
    }
    const isLive =
      Math.abs(time_ms - arrival_ms) <= this.future_tolerance_ms &&
      Math.min(time_ms, arrival_ms) >= LEAST_DATE_MS;
    const back = this.backFrom(arrival_ms, lead_ms);
    if (!isLive || (back === undefined && lead_ms <= AFRESH_LEAD_MS)) return 'own';
    this.keep(reading);
    return this.isSure(back, lead_ms) ? this.goBack(back, newest_ms, reading) : 'kept';
  }

  /** The next reading that has waited and is to be taken in. */
  next(): Numbered | undefined {
    return this.queue.shift();
  }

  /** Whether something of the journal, reading or mark, is of a stretch that was put aside. */
  wasPutAside(entry: JournalEntry): boolean {
    return this.known.some((stretch) => isOfStretch(stretch, entry));
  }

  /** @param whole with the state that is put aside, which may be as large as the unit's own */
  save(whole: boolean): ClockReturnState {
    const { scans, begun, once_ms, heard_ms, leaptAt, doubt, kept, queue, known } = this;
    const aside = this.aside && { ...this.aside, packed: whole ? this.aside.packed : null };
    const lists = { kept: [...kept], queue: [...queue], stretches: [...known] };
    return { scans, begun, once_ms, heard_ms, leaptAt, doubt, aside, ...lists };
  }

  /** @param state absent in what was saved before it was told: of a unit that has run for long */
  restore(state: ClockReturnState | undefined): void {
    this.scans = state?.scans ?? MANY_SCANS;
    this.begun = state?.begun ?? null;
    this.once_ms = state?.once_ms ?? null;
    this.heard_ms = state?.heard_ms ?? null;
    this.leaptAt = state?.leaptAt ?? null;
    this.doubt = state?.doubt ?? null;
    this.aside = state?.aside ?? null;
    this.kept = [...(state?.kept ?? [])];
    this.queue = [...(state?.queue ?? [])];
    this.known = [...(state?.stretches ?? [])];
  }

  /** What was learned in a state of another definition is taken over: it is as old as that one. */
  takeOver(state: ClockReturnState | undefined): void {
    this.scans += state?.scans ?? MANY_SCANS;
    this.begun = state?.begun ?? null;
    this.once_ms = state?.aside?.jump_ms ?? state?.once_ms ?? null;
  }

  /** Of a runner that goes behind another of this unit: it leaves out what that one has put aside. */
  follow({ known, aside }: ClockReturn): void {
    this.known = known;
    if (this.aside?.packed === null && this.aside.seq === aside?.seq) this.aside = aside;
  }

  /** A state of another journal: numbers tell nothing. */
  forget(): void {
    const none = { doubt: null, aside: null, kept: [], queue: [], stretches: [] };
    const { scans, once_ms } = this;
    const begun = this.begun && { ...this.begun, seq: 0 };
    this.restore({ scans, begun, once_ms, heard_ms: null, leaptAt: null, ...none });
  }

  /** Sources that were silent come ahead as well: clocks that are right again go back by about as much. */
  private backFrom(now_ms: number, lead_ms: number): Aside | undefined {
    const { aside } = this;
    if (!aside?.packed || aside.newest_ms > now_ms + this.future_tolerance_ms) return undefined;
    return isLike(lead_ms, aside.jump_ms) ? aside : undefined;
  }

  /** A state begins with these readings, by the order in which they came. */
  private begin(readings: readonly Numbered[]): void {
    const period_ms = this.unit.scan_period_s * 1000;
    const times = readings.map(({ time_ms, arrival_ms }) => Math.min(time_ms, arrival_ms));
    const time_ms = Math.floor(Math.min(...times) / period_ms) * period_ms;
    this.begun = { seq: readings[0]!.seq, time_ms };
  }

  private keep(reading: Numbered): void {
    const index = Math.floor(reading.time_ms / (this.unit.scan_period_s * 1000));
    const none = { since_ms: reading.arrival_ms, scans: 0, index: Number.NEGATIVE_INFINITY };
    const { since_ms, scans, index: last } = this.doubt ?? none;
    this.doubt = { since_ms, scans: scans + Number(index > last), index: Math.max(index, last) };
    this.kept.push(reading);
    const most = MOST_KEPT_SCANS * this.unit.channels.length;
    if (this.kept.length > most) this.kept.splice(0, this.kept.length - most);
  }

  private endDoubt(): void {
    this.doubt = null;
    this.kept = [];
  }

  private isSure(back: Aside | undefined, lead_ms: number): boolean {
    const { doubt, kept } = this;
    if (doubt === null || kept.length < this.unit.channels.length / 2) return false;
    if (kept.at(-1)!.arrival_ms - doubt.since_ms < LEAST_TIME_MS) return false;
    if (back) return doubt.scans >= LEAST_SCANS;
    if (this.once_ms !== null && isLike(lead_ms, this.once_ms) && doubt.scans >= this.mostScans)
      return true;
    return doubt.scans >= Math.max(LEAST_SCANS, this.scans);
  }

  private get mostScans(): number {
    return Math.max(LEAST_SCANS, Math.ceil(LONGEST_DOUBT_MS / (this.unit.scan_period_s * 1000)));
  }

  private goBack(back: Aside | undefined, ahead_ms: number, last: Numbered): WentBack {
    const stretch = {
      from_seq: back?.seq ?? this.begun?.seq ?? 0,
      back_seq: this.kept[0]!.seq,
      through_seq: last.seq,
      before_ms: back?.newest_ms ?? null,
      begun_ms: this.begun?.time_ms ?? null,
      ...{ ahead_ms, found_ms: last.arrival_ms },
    };
    this.queue = this.kept;
    if (!back) {
      this.begin(this.queue);
      this.once_ms = null;
    }
    this.endDoubt();
    this.scans = back?.scans ?? 0;
    this.leaptAt = null;
    this.aside = null;
    this.known = [...this.known, stretch].slice(-MOST_STRETCHES);
    const image = back?.packed ? (unpackImage(Buffer.from(back.packed)) as RunnerImage) : null;
    return { image, stretch };
  }
}

/** The least lead that is like a jump [ms]. */
const leastLike = (jump_ms: number) => LIKE_JUMP * jump_ms - LIKE_JUMP_MS;

function isLike(lead_ms: number, jump_ms: number): boolean {
  return lead_ms >= leastLike(jump_ms) && jump_ms >= leastLike(lead_ms);
}
