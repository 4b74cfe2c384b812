import { randomBytes } from 'node:crypto';
import type { WatchEvent } from '../../core/watch/event.js';
import type { JsonWriter } from './json.js';
import type { PlantService, ServiceMessage } from './service.js';
import { StreamClient, type StreamSink } from './stream-client.js';
import type { HttpTuning } from './tuning.js';
import { streamStateView } from './views.js';

interface KeptEvent {
  readonly sequence: number;
  readonly text: string;
}

/**
 * One live stream for all clients. Messages:
 *
 *     hello  first of every connection: site, version, units, heartbeat, and whether it resumes
 *     state  the newest state of a unit; newer ones replace those that a client has not yet got
 *     event  an alarm or alert raised or returned; every one of them, in order, but in a storm
 *     alarms the list is another one, by a person, a rule or the time: ask /api/alarms again;
 *            `left_out` events of a storm were not sent one by one (/api/events has them)
 *     beat   a sign of life with the age of each unit's readings
 *
 * Only `hello` and `event` carry an id, `${run}-${sequence}`: the run is drawn anew at each start,
 * so that an id of an earlier process is known as such. A client that comes back with the last id
 * it saw gets the events since (`resume: "resumed"`); where they are no longer kept it is told so
 * (`resume: "gap"`) and has to ask /api/events. States are never replayed: the newest one is sent.
 */
export class LiveStream {
  private readonly run = randomBytes(4).toString('hex');
  private readonly clients = new Set<StreamClient>();
  private readonly names = new Map<string, number>();
  private readonly kept: KeptEvent[] = [];
  private readonly changed = new Set<string>();
  private sequence = 0;
  private flushTimer: NodeJS.Timeout | null = null;
  private beatTimer: NodeJS.Timeout | null = null;
  private unsubscribe: (() => void) | null = null;
  private lastFlush_ms = Number.NEGATIVE_INFINITY;
  /** The list of alarms has changed without an event since the last flush. */
  private listChanged = false;
  /** Events since then that were not sent one by one. */
  private leftOut = 0;
  /** Events sent in the second that began then. */
  private sent = 0;
  private second_ms = Number.NEGATIVE_INFINITY;
  /** Streams ended because the client did not take what was sent. */
  slowEnded = 0;

  constructor(
    private readonly service: PlantService,
    private readonly json: JsonWriter,
    private readonly tuning: HttpTuning,
  ) {}

  get open(): number {
    return this.clients.size;
  }

  /** Streams open with one token. */
  openOf(name: string): number {
    return this.names.get(name) ?? 0;
  }

  start(): void {
    this.unsubscribe ??= this.service.subscribe((message) => this.take(message));
    this.beatTimer ??= setInterval(() => this.beat(), this.tuning.heartbeat_ms);
  }

  stop(): void {
    this.unsubscribe?.();
    this.unsubscribe = null;
    if (this.beatTimer !== null) clearInterval(this.beatTimer);
    if (this.flushTimer !== null) clearTimeout(this.flushTimer);
    this.beatTimer = null;
    this.flushTimer = null;
    for (const client of this.clients) client.end();
    this.clients.clear();
  }

  /** Takes a client in; the sink's closing takes it out again. */
  attach(
    sink: StreamSink,
    lastId: string | null,
    profileOf: string | null,
    name: string | null = null,
  ): void {
    const client = new StreamClient(sink, profileOf, this.tuning.waiting_most, () => {
      this.slowEnded += 1;
    });
    sink.onClose(() => this.leave(client, name));
    this.clients.add(client);
    if (name !== null) this.names.set(name, this.openOf(name) + 1);

    const missed = this.missedSince(lastId);
    const resume = lastId === null ? 'new' : missed === null ? 'gap' : 'resumed';
    const hello = {
      site: this.service.siteName,
      version: this.service.version,
      units: this.service.unitIds(),
      heartbeat_ms: this.tuning.heartbeat_ms,
      resume,
    };
    // A resuming client keeps its own id until the events it missed have moved it on.
    const id = resume === 'resumed' ? lastId : this.idOf(this.sequence);
    client.push('hello', message('hello', this.json.write(hello), id));
    // One message: coming back after a long time is not being slow.
    if (missed !== null && missed.length > 0) {
      client.push('missed', missed.map((event) => event.text).join(''));
    }
    for (const unit of this.service.unitIds()) this.sendState(unit, [client]);
    client.push('beat', this.beatText());
  }

  private leave(client: StreamClient, name: string | null): void {
    this.clients.delete(client);
    if (name === null) return;
    const left = this.openOf(name) - 1;
    if (left > 0) this.names.set(name, left);
    else this.names.delete(name);
  }

  /** Kept events after `lastId`; null where it cannot be told which were missed. */
  private missedSince(lastId: string | null): KeptEvent[] | null {
    if (lastId === null) return [];
    const found = /^([0-9a-f]{8})-(\d{1,15})$/.exec(lastId);
    if (found === null || found[1] !== this.run) return null;
    const after = Number(found[2]);
    if (after > this.sequence) return null;
    const first = this.kept[0]?.sequence ?? this.sequence + 1;
    if (after < first - 1) return null;
    return this.kept.filter((event) => event.sequence > after);
  }

  private take(news: ServiceMessage): void {
    if (news.kind === 'event') this.takeEvent(news.event);
    else if (news.kind === 'alarms') this.listChanged = true;
    else this.changed.add(news.unit);
    this.flushSoon();
  }

  private takeEvent(event: WatchEvent): void {
    this.sequence += 1;
    const { sequence } = this;
    const text = message('event', this.json.write(event), this.idOf(sequence));
    this.kept.push({ sequence, text });
    if (this.kept.length > this.tuning.events_kept) this.kept.shift();
    if (this.sentOf(performance.now()) >= this.tuning.events_at_once) {
      this.leftOut += 1;
      return;
    }
    this.sent += 1;
    for (const client of this.clients) client.push(`event ${sequence}`, text);
  }

  /** Events sent in the present second. */
  private sentOf(now_ms: number): number {
    if (now_ms - this.second_ms >= 1000) {
      this.second_ms = now_ms;
      this.sent = 0;
    }
    return this.sent;
  }

  private flushSoon(): void {
    if (this.flushTimer !== null) return;
    if (this.changed.size === 0 && !this.listChanged && this.leftOut === 0) return;
    const since = performance.now() - this.lastFlush_ms;
    const wait = Math.max(0, this.tuning.state_every_ms - since);
    this.flushTimer = setTimeout(() => this.flush(), wait);
  }

  private flush(): void {
    this.flushTimer = null;
    this.lastFlush_ms = performance.now();
    for (const unit of this.changed) this.sendState(unit, this.clients);
    this.changed.clear();
    if (!this.listChanged && this.leftOut === 0) return;
    const news = this.leftOut === 0 ? {} : { left_out: this.leftOut };
    this.listChanged = false;
    this.leftOut = 0;
    const text = message('alarms', this.json.write(news), null);
    for (const client of this.clients) client.push('alarms', text);
  }

  /** One view and one text per kind of client, however many of them there are. */
  private sendState(unit: string, clients: Iterable<StreamClient>): void {
    const texts = new Map<boolean, string>();
    for (const client of clients) {
      const withProfile = client.profileOf === unit;
      let text = texts.get(withProfile);
      if (text === undefined) {
        const now = this.service.now(unit);
        if (now === undefined) return;
        text = message('state', this.json.write(streamStateView(now, withProfile)), null);
        texts.set(withProfile, text);
      }
      client.push(`state ${unit}`, text);
    }
  }

  private beat(): void {
    const text = this.beatText();
    for (const client of this.clients) {
      client.push('beat', text);
      client.endIfStuck(3 * this.tuning.heartbeat_ms);
    }
  }

  private beatText(): string {
    const units = this.service.unitIds().map((unit) => {
      const now = this.service.now(unit);
      return { unit, age_s: now?.age_s ?? null, stale: now?.stale ?? true };
    });
    return message('beat', this.json.write({ units }), null);
  }

  private idOf(sequence: number): string {
    return `${this.run}-${sequence}`;
  }
}

/** The data is JSON, hence a single line. */
function message(event: string, data: string, id: string | null): string {
  return `${id === null ? '' : `id: ${id}\n`}event: ${event}\ndata: ${data}\n\n`;
}
