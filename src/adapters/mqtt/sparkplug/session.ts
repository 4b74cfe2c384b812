import { isFuture } from '../../../core/scan/assemble.js';
import type { PayloadFault, PayloadReading, Quality, RoutedChannel } from '../payload.js';
import type { SparkplugCount, SparkplugFate } from './counts.js';
import { bdSeqOf, GREATEST_MS, judged, payloadTime, seqOf } from './fields.js';
import { aliasKey, type Metric, type Payload, sent, wide } from './messages.js';
import type { MessageKind, NodeName } from './topics.js';

export interface SparkplugReading extends PayloadReading {
  readonly unit: string;
}

/** A channel of this edge node, or of a device at it. */
export interface SparkplugChannel {
  readonly unit: string;
  readonly routed: RoutedChannel;
  /** null: the edge node itself. */
  readonly device: string | null;
  readonly metric: string;
}

export interface SessionHooks {
  /** How far ahead of its arrival a source time is believed [ms]. */
  readonly future_tolerance_ms: number;
  count(name: SparkplugCount): void;
  fault(name: PayloadFault | 'sparkplug_not_in_birth', text: string): void;
  read(reading: SparkplugReading): void;
  /** What is known of the node is no longer whole: it is to be born again. */
  rebirth(): void;
}

/** `awaiting`: its edge node was born anew, and its own birth has to follow at once. */
type Life = 'unknown' | 'awaiting' | 'alive' | 'dead';

interface Known {
  readonly channel: SparkplugChannel;
  datatype: number | undefined;
  /** Newest source time believed [ms]. */
  newest_ms: number;
  /** The newest that was told of it is that it has no value. */
  isMissing: boolean;
}

/** The edge node itself, or a device at it. */
interface Part {
  readonly device: string | null;
  life: Life;
  since_ms: number;
  readonly byMetric: Map<string, Known>;
  /** Of the running birth; null: a metric that nothing is configured for. */
  aliases: Map<number | string, Known | null>;
}

/** DBIRTHs follow the NBIRTH at once (6.4.24); a device silent for so long is gone [ms]. */
const AWAITED_MS = 10_000;

/**
 * What is known of one edge node: whether it and its devices live, which connection it lives by
 * (bdSeq), the sequence number of its last message, the aliases of its births.
 *
 * Its channels report by exception, so silence means no change, for as long as the node lives. Deaths
 * end that: every channel gets a bad reading at the death's time, and so does a channel that a birth
 * does not name. A birth tells what stands at its time, whenever that had changed last.
 */
export class EdgeSession {
  private readonly parts = new Map<string | null, Part>();
  private bdSeq: number | null = null;
  private seq: number | null = null;

  constructor(
    readonly name: NodeName,
    channels: readonly SparkplugChannel[],
    private readonly hooks: SessionHooks,
  ) {
    this.addPart(null);
    for (const channel of channels) {
      const part = this.parts.get(channel.device) ?? this.addPart(channel.device);
      part.byMetric.set(channel.metric, {
        ...{ channel, datatype: undefined, isMissing: false },
        newest_ms: Number.NEGATIVE_INFINITY,
      });
    }
  }

  get isAlive(): boolean {
    return this.own.life === 'alive';
  }

  /** Who has no birth or is dead, in words; empty where all live. */
  get absent(): string[] {
    const words = { unknown: 'not born yet', awaiting: 'not born again', dead: 'dead' } as const;
    return [...this.parts.values()].flatMap(({ device, life }) =>
      life === 'alive' ? [] : [`${device ?? 'edge node'} ${words[life]}`],
    );
  }

  /**
   * Takes a message in.
   * @param duplicate the broker may have sent it before
   * @param steady_ms a clock that is never set, for waiting [ms]
   */
  receive(
    kind: MessageKind,
    device: string | null,
    payload: Payload,
    arrival_ms: number,
    duplicate: boolean,
    steady_ms: number,
  ): void {
    const fate = this.take(kind, device, payload, arrival_ms, duplicate, steady_ms);
    this.hooks.count(fate);
    if (fate === 'sparkplug_before_birth' || fate === 'sparkplug_after_death') this.hooks.rebirth();
  }

  /** What time brings: devices whose birth has not followed that of their node are gone. */
  tick(arrival_ms: number, steady_ms: number): void {
    for (const part of this.parts.values()) {
      if (part.life !== 'awaiting' || steady_ms - part.since_ms < AWAITED_MS) continue;
      this.end(part, arrival_ms, 'dead');
    }
  }

  /** From this time on nothing is known: the connection was lost, or rockhour was not there. */
  lost(time_ms: number): void {
    for (const part of this.parts.values()) this.end(part, time_ms, 'unknown');
    this.seq = null;
  }

  /** It has not been heard since this time, though it was asked: dead without a word. */
  unheard(time_ms: number): void {
    for (const part of this.parts.values()) this.end(part, time_ms, 'dead');
  }

  /** A reading of a channel that is in the journal already. */
  remember(
    { device, metric }: Pick<SparkplugChannel, 'device' | 'metric'>,
    time_ms: number,
    arrival_ms: number,
  ): void {
    const known = this.parts.get(device)?.byMetric.get(metric);
    if (known) this.heard(known, time_ms, arrival_ms);
  }

  private get own(): Part {
    return this.parts.get(null)!;
  }

  private addPart(device: string | null): Part {
    const part: Part = {
      ...{ device, life: 'unknown', since_ms: 0 },
      ...{ byMetric: new Map(), aliases: new Map() },
    };
    this.parts.set(device, part);
    return part;
  }

  private take(
    kind: MessageKind,
    device: string | null,
    payload: Payload,
    arrival_ms: number,
    duplicate: boolean,
    steady_ms: number,
  ): SparkplugFate {
    const { own } = this;
    if (kind === 'NBIRTH') return this.nodeBorn(payload, arrival_ms, steady_ms);
    if (kind === 'NDEATH') {
      if (own.life !== 'alive' || bdSeqOf(payload) !== this.bdSeq)
        return 'sparkplug_foreign_deaths';
      // Its will was written when it connected: the time of arrival is that of the death (5.5).
      for (const one of this.parts.values()) this.end(one, arrival_ms, 'dead');
      return 'sparkplug_deaths';
    }
    if (own.life === 'dead') return 'sparkplug_after_death';
    if (own.life !== 'alive') return 'sparkplug_before_birth';
    this.follow(payload, duplicate);
    const part = this.parts.get(device);
    if (kind === 'DBIRTH') {
      if (part) this.born(part, payload, arrival_ms);
      return 'sparkplug_births';
    }
    if (kind === 'DDEATH') {
      if (part) this.end(part, payloadTime(payload) ?? arrival_ms, 'dead', arrival_ms);
      return 'sparkplug_deaths';
    }
    if (part?.life === 'dead') return 'sparkplug_after_death';
    if (part && part.life !== 'alive') return 'sparkplug_before_birth';
    if (part) this.data(part, payload, arrival_ms);
    return 'sparkplug_data';
  }

  private nodeBorn(payload: Payload, arrival_ms: number, steady_ms: number): SparkplugFate {
    this.bdSeq = bdSeqOf(payload);
    this.seq = seqOf(payload);
    for (const part of this.parts.values()) {
      if (part.life !== 'alive' || part.device === null) continue;
      part.life = 'awaiting';
      part.since_ms = steady_ms;
    }
    this.born(this.own, payload, arrival_ms);
    return 'sparkplug_births';
  }

  /** Sequence numbers run from 0 to 255 and on at 0 over all messages of a node but its death (6.4.6). */
  private follow(payload: Payload, duplicate: boolean): void {
    const seq = seqOf(payload);
    const last = this.seq;
    if (duplicate && seq === last) return;
    this.seq = seq;
    if (last === null || seq === (last + 1) % 256) return;
    this.hooks.count('sparkplug_seq_gaps');
    this.hooks.rebirth();
  }

  private born(part: Part, payload: Payload, arrival_ms: number): void {
    part.life = 'alive';
    part.aliases = new Map();
    const named = new Set<Known>();
    for (const metric of payload.metrics ?? []) {
      const known = part.byMetric.get(metric.name ?? '') ?? null;
      if (sent(metric, 'alias')) part.aliases.set(aliasKey(metric.alias!), known);
      if (known === null) {
        this.hooks.count('sparkplug_unused_metrics');
        continue;
      }
      named.add(known);
      known.datatype = sent(metric, 'datatype') ? metric.datatype : undefined;
      this.value(known, metric, payload, arrival_ms, true);
    }
    for (const known of part.byMetric.values()) {
      if (named.has(known)) continue;
      const { group, node } = this.name;
      const where = [group, node, part.device].filter((one) => one !== null).join('/');
      this.hooks.fault(
        'sparkplug_not_in_birth',
        `${where}: its birth names no metric ${known.channel.metric}`,
      );
      this.makeMissing(known, payloadTime(payload) ?? arrival_ms, arrival_ms);
    }
  }

  private data(part: Part, payload: Payload, arrival_ms: number): void {
    for (const metric of payload.metrics ?? []) {
      const hasAlias = sent(metric, 'alias');
      const byAlias = hasAlias ? part.aliases.get(aliasKey(metric.alias!)) : undefined;
      const known = byAlias ?? part.byMetric.get(metric.name ?? '');
      if (known) this.value(known, metric, payload, arrival_ms, false);
      else if (hasAlias && byAlias === undefined && !sent(metric, 'name')) {
        this.hooks.count('sparkplug_unknown_aliases');
        this.hooks.rebirth();
      } else this.hooks.count('sparkplug_unused_metrics');
    }
  }

  private value(
    known: Known,
    metric: Metric,
    payload: Payload,
    arrival_ms: number,
    isBirth: boolean,
  ): void {
    const { routed } = known.channel;
    const text = `metric ${known.channel.metric} of ${this.name.group}/${this.name.node}`;
    const fault = (name: PayloadFault) => this.hooks.fault(name, text);
    const isHistorical = sent(metric, 'isHistorical') && metric.isHistorical === true;
    const payload_ms = payloadTime(payload);
    let time_ms = sent(metric, 'timestamp') ? wide(metric.timestamp!) : payload_ms;
    if (time_ms === null) {
      fault('without_time');
      time_ms = arrival_ms;
    }
    if (!(time_ms <= GREATEST_MS)) {
      fault('malformed');
      return;
    }
    const isExceptional = routed.definition.reporting.kind === 'by_exception';
    this.forgetAhead(known, arrival_ms);
    if (isBirth && isExceptional && !isHistorical) {
      // A birth comes after the death before it, also by a clock that is behind rockhour's.
      time_ms = Math.max(time_ms, payload_ms ?? time_ms, known.newest_ms);
    }
    const { value, quality } = judged(routed, known.datatype, metric, fault);
    if (!isHistorical && time_ms >= known.newest_ms) known.isMissing = Number.isNaN(value);
    if (!isHistorical) this.heard(known, time_ms, arrival_ms);
    this.read(known, time_ms, value, quality);
  }

  /** A time too far ahead is not believed anywhere, and must not hold up what comes after it. */
  private heard(known: Known, time_ms: number, arrival_ms: number): void {
    if (isFuture({ time_ms, arrival_ms }, this.hooks.future_tolerance_ms)) return;
    known.newest_ms = Math.max(known.newest_ms, time_ms);
  }

  /** What was heard by clocks that were ahead, this machine's too, holds up nothing either once they are right. */
  private forgetAhead(known: Known, now_ms: number): void {
    const { newest_ms } = known;
    if (isFuture({ time_ms: newest_ms, arrival_ms: now_ms }, this.hooks.future_tolerance_ms))
      known.newest_ms = Number.NEGATIVE_INFINITY;
  }

  private end(part: Part, time_ms: number, life: Life, now_ms = time_ms): void {
    part.life = life;
    part.aliases = new Map();
    for (const known of part.byMetric.values()) this.makeMissing(known, time_ms, now_ms);
  }

  /** A bad reading, which ends holding. Not before the newest: what is older than that changes nothing. */
  private makeMissing(known: Known, time_ms: number, now_ms: number): void {
    if (known.isMissing) return;
    this.forgetAhead(known, now_ms);
    known.isMissing = true;
    this.hooks.count('sparkplug_made_missing');
    this.read(known, Math.max(time_ms, known.newest_ms), Number.NaN, 'bad');
  }

  private read({ channel }: Known, time_ms: number, value: number, quality: Quality): void {
    const { unit, routed } = channel;
    this.hooks.read({ unit, channel: routed.definition, time_ms, value, quality });
  }
}
