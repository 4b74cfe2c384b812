import type { Estimate } from '../../core/estimate.js';
import type { Headroom } from '../../core/plan/headroom.js';
import type { LimitedAnswer } from '../../core/plan/limitedBy.js';
import { statesOf, type WatchView } from '../../core/watch/causes.js';
import type { WatchEvent } from '../../core/watch/event.js';
import type { OwnNode } from './sparkplug/ownNode.js';

/** As much of the link as announcing needs. */
export interface Outlet {
  readonly connected: boolean;
  publish(topic: string, payload: string): boolean;
}

/** The standing alarms of a unit and what changed last. */
export interface AlarmsMessage {
  readonly time: string;
  readonly unit: string;
  /** What is shown, the urgent first. */
  readonly standing: readonly object[];
  readonly last: WatchEvent | null;
  /** What is held back: shelved, suppressed by design, out of service. */
  readonly suppressed: readonly object[];
  /** How many there are of each state. */
  readonly counts: Readonly<Record<string, number>>;
  /** Entries beyond the length of a message. */
  readonly left_out: number;
}

/** What a unit can still take, with the head that every answer about what lies ahead has. */
export interface HeadroomMessage {
  readonly time: string;
  readonly unit: string;
  readonly valid_until: string;
  readonly quality: Estimate['quality'];
  readonly given: string;
  readonly limits: object;
  readonly answers: readonly Headroom[];
}

/** A kept offer table without its blocks, see `shortTable`. */
export interface OffersMessage {
  readonly unit: string;
  /** The number under which it is kept, and when it was asked for. */
  readonly no: number;
  readonly asked: string;
  readonly [key: string]: unknown;
}

export interface AnnouncerOptions {
  readonly prefix: string;
  readonly version: string;
  readonly site: string;
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** Who tells the same in another way; null: nobody. */
  readonly also?: Pick<OwnNode, 'state' | 'dispatch' | 'alarms'> | null;
}

/** Spacing of the heartbeat [ms]. */
export const HEARTBEAT_MS = 10_000;
/** Spacing of what the indicators show, by source time, while no state changes [ms]. */
const WATCH_MS = 60_000;

/**
 * What rockhour says over MQTT, all of it retained and at least once (QoS 1), as JSON:
 *
 * - `PREFIX/UNIT/state`     the estimate of the last scan
 * - `PREFIX/UNIT/dispatch`  `{"time", "unit", "answers": [...]}`: the hours computed last
 * - `PREFIX/UNIT/headroom`  what the unit can still take at configured charging powers, see HeadroomMessage
 * - `PREFIX/UNIT/offers`    the offer table kept last without its blocks, with `no` and `asked`
 * - `PREFIX/UNIT/alarms`    see AlarmsMessage; `.../command` and `.../answer` are in alarmCommands
 * - `PREFIX/UNIT/watch`     what the indicators show and what is probably behind it, see WatchView; at
 *                           most once a minute of source time unless an indicator changed its state
 * - `PREFIX/UNIT/event`     each alarm and alert that is raised or returns, not retained; by notify/eventTeller
 * - `PREFIX/heartbeat`      `{"status": "online", "time", "site", "version", "uptime_s"}` every 10 s,
 *                           and `{"status": "offline"}` by the broker's last will or a clean stop
 *
 * After an outage the newest of each is said again; what was between is in the history.
 */
export class Announcer {
  private readonly latest = new Map<string, string>();
  private readonly watched = new Map<string, { time_ms: number; states: string }>();
  private timer: NodeJS.Timeout | null = null;
  private readonly started_ms: number;

  constructor(
    private readonly outlet: Outlet,
    private readonly options: AnnouncerOptions,
  ) {
    this.started_ms = options.now();
  }

  /** The last will that belongs to the link of this announcer. */
  static will(prefix: string): { topic: string; payload: string } {
    return { topic: `${prefix}/heartbeat`, payload: '{"status":"offline"}' };
  }

  start(): void {
    this.timer ??= setInterval(() => this.beat(), HEARTBEAT_MS);
  }

  stop(): void {
    if (!this.timer) return;
    clearInterval(this.timer);
    this.timer = null;
    const { topic, payload } = Announcer.will(this.options.prefix);
    this.outlet.publish(topic, payload);
  }

  /** To be called when the link is up, at the start and after each outage. */
  connected(): void {
    this.beat();
    for (const [topic, payload] of this.latest) this.outlet.publish(topic, payload);
  }

  state(estimate: Estimate): void {
    this.say(`${estimate.unit}/state`, estimate);
    this.options.also?.state(estimate);
  }

  dispatch(unit: string, time: string, answers: readonly LimitedAnswer[]): void {
    this.say(`${unit}/dispatch`, { time, unit, answers });
    this.options.also?.dispatch(unit, time, answers);
  }

  headroom(message: HeadroomMessage): void {
    this.say(`${message.unit}/headroom`, message);
  }

  offers(message: OffersMessage): void {
    this.say(`${message.unit}/offers`, message);
  }

  alarms(message: AlarmsMessage): void {
    this.say(`${message.unit}/alarms`, message);
    this.options.also?.alarms(message);
  }

  watch(view: WatchView): void {
    const { unit } = view;
    const time_ms = Date.parse(view.time);
    const states = statesOf(view);
    const last = this.watched.get(unit);
    if (last?.states === states && Math.abs(time_ms - last.time_ms) < WATCH_MS) return;
    this.watched.set(unit, { time_ms, states });
    this.say(`${unit}/watch`, view);
  }

  private say(name: string, content: object): void {
    const topic = `${this.options.prefix}/${name}`;
    const payload = JSON.stringify(content);
    this.latest.set(topic, payload);
    this.outlet.publish(topic, payload);
  }

  private beat(): void {
    const now_ms = this.options.now();
    const beat = {
      status: 'online',
      time: new Date(now_ms).toISOString(),
      site: this.options.site,
      version: this.options.version,
      uptime_s: Math.round((now_ms - this.started_ms) / 1000),
    };
    this.outlet.publish(`${this.options.prefix}/heartbeat`, JSON.stringify(beat));
  }
}
