import type { SparkplugSource } from '../../../config/site.js';
import type { UnitDefinition } from '../../../core/definitions.js';
import type { Delivery } from '../link.js';
import { type PayloadFault, routedChannel } from '../payload.js';
import type { SparkplugCount } from './counts.js';
import { readPayload, writePayload } from './messages.js';
import { EdgeSession, type SparkplugChannel, type SparkplugReading } from './session.js';
import { filtersOf, type NodeName, parseTopic, topicOf } from './topics.js';
import { DATATYPE } from './values.js';

export interface SparkplugHostOptions {
  readonly units: readonly UnitDefinition[];
  readonly sources: readonly SparkplugSource[];
  readonly future_tolerance_ms: number;
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** A clock that is never set [ms]. */
  steady(): number;
  count(name: SparkplugCount | PayloadFault): void;
  notice(kind: SparkplugCount | PayloadFault, text: string): void;
  /** Sends a command to an edge node; false where it cannot be sent. */
  command(topic: string, payload: Buffer): boolean;
  /** Readings that no message brought: what is missing since a time. */
  add(readings: readonly SparkplugReading[]): void;
}

/** An edge node is asked to be born again at most so often [ms]. */
export const REBIRTH_EVERY_MS = 10_000;
/** A connection lost for less than this ends nothing: brokers restart [ms]. */
export const LOST_AFTER_MS = 60_000;
/** A node that lived before a loss of the broker and is not heard for so long after it is dead [ms]. */
export const UNHEARD_MS = 60_000;
/** Meanwhile it is asked to be born again this often: a request at QoS 0 may be lost [ms]. */
const ASK_UNHEARD_MS = 20_000;
const TICK_MS = 1000;

interface Node {
  readonly session: EdgeSession;
  /** To be born again: asked as soon as it may be. */
  isWanted: boolean;
  mayAsk_ms: number;
  /** Lived when the broker was lost, and has not been heard since it is back; null: nothing of the kind. */
  unheard: Unheard | null;
}

interface Unheard {
  /** When the broker was lost [ms since 1970]. */
  readonly lost_ms: number;
  /** Since when it might have been heard, and is to be asked again, by the steady clock, losses left out [ms]. */
  since_ms: number;
  askAgain_ms: number;
}

/** How an edge node is, for health. */
export interface EdgeNodeState {
  readonly name: string;
  /** Who has no birth or is dead, in words; empty where all live. */
  readonly absent: readonly string[];
}

/**
 * Readings by Sparkplug B 3.0.0: a session per configured edge node, and requests to be born again
 * where one is not whole. rockhour is no primary host: it publishes no STATE.
 */
export class SparkplugHost {
  private readonly nodes = new Map<string, Node>();
  private readonly sources: ReadonlyMap<string, SparkplugSource>;
  private found: SparkplugReading[] = [];
  private lost: { readonly time_ms: number; readonly since_ms: number } | null = null;
  private timer: NodeJS.Timeout | null = null;

  constructor(private readonly options: SparkplugHostOptions) {
    this.sources = new Map(options.sources.map((source) => [channelKey(source), source]));
    const byNode = new Map<string, { name: NodeName; channels: SparkplugChannel[] }>();
    for (const source of options.sources) {
      const { group, node, unit, channel, device, metric } = source;
      const definition = options.units
        .find(({ id }) => id === unit)
        ?.channels.find(({ id }) => id === channel);
      if (definition === undefined) {
        throw new RangeError(`sources must name channels of units, got ${unit}/${channel}`);
      }
      const key = keyOf(source);
      const entry = byNode.get(key) ?? { name: { group, node }, channels: [] };
      entry.channels.push({ unit, routed: routedChannel(definition), device, metric });
      byNode.set(key, entry);
    }
    for (const [key, { name, channels }] of byNode) {
      const session = new EdgeSession(name, channels, {
        future_tolerance_ms: options.future_tolerance_ms,
        count: (count) => options.count(count),
        fault: (fault, text) => {
          options.count(fault);
          options.notice(fault, text);
        },
        read: (reading) => this.found.push(reading),
        rebirth: () => this.want(key),
      });
      this.nodes.set(key, {
        ...{ session, isWanted: false, unheard: null },
        mayAsk_ms: Number.NEGATIVE_INFINITY,
      });
    }
  }

  get topics(): string[] {
    return [...this.nodes.values()].flatMap(({ session }) => filtersOf(session.name));
  }

  get states(): EdgeNodeState[] {
    return [...this.nodes.values()].map(({ session }) => ({
      name: `${session.name.group}/${session.name.node}`,
      absent: session.absent,
    }));
  }

  /** A reading that is in the journal already. */
  remember(reading: {
    readonly unit: string;
    readonly channel: string;
    readonly time_ms: number;
    readonly arrival_ms: number;
  }): void {
    const source = this.sources.get(channelKey(reading));
    const node = source && this.nodes.get(keyOf(source));
    if (source && node) node.session.remember(source, reading.time_ms, reading.arrival_ms);
  }

  /**
   * @param heard_ms when the newest reading in the journal came [ms]: what was told until then stands
   *                 no longer, since nobody was there to hear a death; null where there is none
   */
  start(heard_ms: number | null): void {
    if (this.nodes.size === 0) return;
    this.timer ??= setInterval(() => this.tick(), TICK_MS);
    if (heard_ms !== null) this.forgetAll(heard_ms + 1);
  }

  stop(): void {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
  }

  /**
   * Connected and subscribed: what was said meanwhile is not known. A broker that was killed says no
   * will, so that a node that died with it is dead only by its silence.
   */
  linkUp(): void {
    const { now, steady } = this.options;
    const lost_ms = this.lost?.time_ms ?? now();
    const since_ms = steady();
    const away_ms = this.lost === null ? 0 : since_ms - this.lost.since_ms;
    this.lost = null;
    for (const [key, node] of this.nodes) {
      // A link that comes and goes does not begin it anew; while it is away nothing can be heard.
      if (node.unheard) node.unheard.since_ms += away_ms;
      else if (node.session.isAlive)
        node.unheard = { lost_ms, since_ms, askAgain_ms: since_ms + ASK_UNHEARD_MS };
      this.want(key);
    }
  }

  linkDown(): void {
    this.lost ??= { time_ms: this.options.now(), since_ms: this.options.steady() };
  }

  /** The readings of a message; null where it is of no edge node that is configured. Never throws. */
  receive({ topic, payload, retained, duplicate }: Delivery, arrival_ms: number) {
    const parsed = parseTopic(topic);
    const node = parsed && this.nodes.get(keyOf(parsed));
    if (!parsed || !node) return null;
    const { count, notice, steady } = this.options;
    if (retained === true) {
      count('sparkplug_retained');
      notice('sparkplug_retained', `a retained message on ${topic} is not used`);
      return [];
    }
    const read = payload.length === 0 ? 'garbled' : readPayload(payload);
    if (typeof read === 'string') {
      count(`sparkplug_${read}`);
      notice(`sparkplug_${read}`, `topic ${topic}: ${payload.length} bytes, ${read}`);
      return [];
    }
    const { kind, device } = parsed;
    if (kind === 'NBIRTH') node.isWanted = false;
    // What the broker sends once more may be of before it was lost; a death may be of another connection.
    if (kind !== 'NDEATH' && !duplicate) node.unheard = null;
    node.session.receive(kind, device, read, arrival_ms, duplicate, steady());
    return this.takeFound();
  }

  tick(): void {
    const { now, steady, add } = this.options;
    const steady_ms = steady();
    for (const { session } of this.nodes.values()) session.tick(now(), steady_ms);
    for (const node of this.nodes.values()) {
      if (this.lost === null) this.lookForUnheard(node, steady_ms);
      this.ask(node);
    }
    const found = this.takeFound();
    if (found.length > 0) add(found);
    if (this.lost && steady_ms - this.lost.since_ms >= LOST_AFTER_MS) {
      const { time_ms } = this.lost;
      this.lost = null;
      this.forgetAll(time_ms);
    }
  }

  private lookForUnheard(node: Node, steady_ms: number): void {
    const { session, unheard } = node;
    if (unheard === null) return;
    const { count, notice } = this.options;
    if (!session.isAlive) node.unheard = null;
    else if (steady_ms - unheard.since_ms >= UNHEARD_MS) {
      node.unheard = null;
      session.unheard(unheard.lost_ms);
      count('sparkplug_unheard_nodes');
      const { group, node: name } = session.name;
      const asked = `not heard for ${UNHEARD_MS / 1000} s after a loss of the broker`;
      notice('sparkplug_unheard_nodes', `edge node ${group}/${name} is taken for dead: ${asked}`);
    } else if (steady_ms >= unheard.askAgain_ms) {
      unheard.askAgain_ms += ASK_UNHEARD_MS;
      node.isWanted = true;
    }
  }

  private forgetAll(time_ms: number): void {
    for (const { session } of this.nodes.values()) session.lost(time_ms);
    const found = this.takeFound();
    if (found.length > 0) this.options.add(found);
  }

  private takeFound(): SparkplugReading[] {
    const { found } = this;
    this.found = [];
    return found;
  }

  private want(key: string): void {
    const node = this.nodes.get(key)!;
    node.isWanted = true;
    this.ask(node);
  }

  private ask(node: Node): void {
    const { command, count, now, steady } = this.options;
    if (!node.isWanted || steady() < node.mayAsk_ms) return;
    const timestamp = now();
    const metric = { name: REBIRTH, timestamp, datatype: DATATYPE.Boolean, booleanValue: true };
    const payload = writePayload({ timestamp, metrics: [metric] });
    if (!command(topicOf(node.session.name, 'NCMD'), payload)) return;
    count('sparkplug_rebirth_requests');
    node.isWanted = false;
    node.mayAsk_ms = steady() + REBIRTH_EVERY_MS;
  }
}

/** Metric by which an edge node is asked to be born again (6.4.19). */
export const REBIRTH = 'Node Control/Rebirth';

const channelKey = ({ unit, channel }: Pick<SparkplugSource, 'unit' | 'channel'>) =>
  `${unit}\n${channel}`;

const keyOf = ({ group, node }: NodeName) => `${group}/${node}`;
