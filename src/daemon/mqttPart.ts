import type { Access } from '../access/access.js';
import type { AlarmAnswer } from '../adapters/http/service.js';
import { AlarmCommands } from '../adapters/mqtt/alarmCommands.js';
import { Announcer } from '../adapters/mqtt/announcer.js';
import { type BrokerOptions, EmbeddedBroker } from '../adapters/mqtt/broker.js';
import type { DoorOptions } from '../adapters/mqtt/door.js';
import type { Intake } from '../adapters/mqtt/intake.js';
import { type LinkOptions, MqttLink } from '../adapters/mqtt/link.js';
import type { SparkplugHost } from '../adapters/mqtt/sparkplug/host.js';
import { nodeClientId } from '../adapters/mqtt/sparkplug/ownLink.js';
import { parseTopic, topicOf } from '../adapters/mqtt/sparkplug/topics.js';
import { TopicSet } from '../adapters/mqtt/topicRules.js';
import type { MqttConfig } from '../config/site.js';
import { RockhourError, withoutCredentials } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';
import type { OwnNodePart, OwnNodePartOptions } from './ownNodePart.js';

/** What its own broker refuses. */
type Refusal =
  | Parameters<DoorOptions['refused']>[0]
  | Parameters<NonNullable<BrokerOptions['refused']>>[0];

/** A start waits this long for the broker's first word; one that is away does not hold it up [ms]. */
const FIRST_WORD_MS = 2000;

/** A message that the broker has not taken within this is sent again [ms]. */
const DELIVER_MS = 10_000;

export interface MqttPartOptions {
  readonly config: MqttConfig;
  readonly site: string;
  readonly version: string;
  readonly intake: Intake;
  /** Edge nodes that readings come from. */
  readonly edgeNodes: SparkplugHost;
  /** Makes rockhour an edge node that reaches the broker in this way; absent: it is none. */
  ownNode?(login: OwnNodePartOptions['login']): OwnNodePart;
  /** When the newest reading in the journal came [ms]; null where there is none. */
  heardLast(): number | null;
  readonly clock: DaemonClock;
  readonly log: Log;
  readonly notices: Notices;
  readonly counters: Counters;
  /** Ids of the units. */
  readonly units: readonly string[];
  /** Who may come in at its own broker. */
  readonly access: Access;
  /** Follows a command about an alarm of a unit. */
  command(command: unknown, unit: string): AlarmAnswer;
  /** The broker can be reached, at the start and after each outage. */
  connected(): void;
}

/** Everything about the broker: the embedded one where none is named, the link, what is said. */
export class MqttPart {
  readonly announcer: Announcer;
  /** rockhour as an edge node; null: it is none. */
  readonly ownNode: OwnNodePart | null;
  private readonly link: MqttLink;
  private readonly broker: EmbeddedBroker | null;
  private readonly commands: AlarmCommands;
  private refusal: string | null = null;
  private lost: string | null = null;
  /** The broker has been reached, or could not be. */
  private heard: () => void = () => undefined;

  constructor(private readonly options: MqttPartOptions) {
    const { config, intake } = options;
    const { embedded_host, embedded_port, url } = config;
    this.commands = new AlarmCommands({
      ...{ prefix: config.out_prefix, units: options.units },
      now: () => options.clock.now(),
      follow: (command, unit) => {
        const answer = options.command(command, unit);
        return answer.accepted
          ? { accepted: true, state: answer.entry?.state ?? 'normal' }
          : { accepted: false, fault: answer.fault };
      },
      answer: (topic, payload) => this.link.tell(topic, payload),
      malformed: (text) => {
        options.counters.add('alarm_commands_malformed');
        options.notices.warn('alarm_commands_malformed', text);
      },
      lost: () => options.counters.add('alarm_answers_lost'),
    });
    this.broker =
      url === null
        ? new EmbeddedBroker(embedded_host, embedded_port, this.door(), this.brokerOptions())
        : null;
    this.ownNode = options.ownNode?.(this.login) ?? null;
    this.link = new MqttLink({
      client_id: config.client_id,
      ...this.login,
      qos: config.qos,
      topics: [...intake.topics, ...this.commands.topics],
      will: Announcer.will(config.out_prefix),
      receive: (delivery) => {
        if (!this.commands.isFor(delivery)) return intake.receive(delivery);
        const { acknowledge } = delivery;
        const inTurn = acknowledge && (() => intake.acknowledgeInTurn(acknowledge));
        this.commands.receive({ ...delivery, acknowledge: inTurn });
      },
      up: () => this.up(),
      down: (reason) => {
        this.lost = reason;
        options.counters.failed(new RockhourError('BROKER_UNREACHABLE', reason));
        this.heard();
        options.edgeNodes.linkDown();
        // By kind and minute: two clients with one client id would push each other out for ever.
        options.notices.warn(
          'mqtt_down',
          `no connection to the MQTT broker ${this.name}: ${reason}; rockhour keeps trying`,
        );
      },
      refused: (reason) => {
        this.refusal = reason;
        options.log.error(`the MQTT broker refused a subscription: ${reason}`);
      },
    });
    this.announcer = new Announcer(this.link, {
      prefix: config.out_prefix,
      version: options.version,
      site: options.site,
      now: () => options.clock.now(),
      also: this.ownNode?.node ?? null,
    });
  }

  /** How the broker is reached. */
  private get login(): Pick<
    LinkOptions,
    'url' | 'inside' | 'username' | 'password' | 'tls' | 'protocol'
  > {
    const { broker } = this;
    const { username, password, tls = null, protocol } = this.options.config;
    return {
      // Asked for at the start: the port of an embedded broker is known only then.
      url: () => this.url,
      inside: broker?.inside ?? null,
      username: broker?.login?.username ?? username,
      password: broker?.login?.password ?? password,
      tls,
      // The embedded broker speaks 3.1.1 only.
      protocol: broker ? 4 : protocol,
    };
  }

  /** Address of the broker without name and password. */
  get name(): string {
    return withoutCredentials(this.url);
  }

  get isConnected(): boolean {
    return this.link.connected;
  }

  /** Why there is no connection, null where there is one or the first is still awaited. */
  get trouble(): string | null {
    return this.isConnected ? null : this.lost;
  }

  /** Why the broker refused a subscription, null where it did not. */
  get refused(): string | null {
    return this.refusal;
  }

  /** @throws RockhourError PORT_IN_USE */
  async startBroker(): Promise<void> {
    await this.broker?.start();
  }

  /** Publishes a message that is not retained; resolves once the broker has it, else throws. */
  deliver(topic: string, payload: string): Promise<void> {
    return this.link.deliver(topic, payload, DELIVER_MS);
  }

  /** Sends a command to an edge node, at most once; false where it cannot be sent. */
  command(topic: string, payload: Buffer): boolean {
    return this.link.command(topic, payload);
  }

  unsubscribe(topic: string): void {
    this.link.unsubscribe(topic);
    // An edge node's devices are subscribed by a filter.
    const parsed = parseTopic(topic);
    if (parsed?.device) this.link.unsubscribe(topicOf(parsed, parsed.kind, '+'));
  }

  async stopBroker(): Promise<void> {
    await this.broker?.stop();
  }

  /**
   * Resolves once the subscriptions stand: what is published from then on is not lost. Where the
   * broker is away, once that is known.
   */
  async startLink(): Promise<void> {
    const heard = new Promise<void>((resolve) => {
      this.heard = resolve;
    });
    const limit = setTimeout(() => this.heard(), FIRST_WORD_MS);
    this.options.intake.start();
    this.options.edgeNodes.start(this.options.heardLast());
    this.announcer.start();
    this.link.start();
    this.ownNode?.start();
    await heard;
    clearTimeout(limit);
  }

  /** What has come in is committed and acknowledged, the farewell said, then the link ended. */
  async stopLink(): Promise<void> {
    this.options.edgeNodes.stop();
    this.options.intake.stop();
    this.announcer.stop();
    await this.ownNode?.stop();
    await this.link.stop();
  }

  private door(): DoorOptions {
    const { access, config, intake } = this.options;
    return {
      ...{ access, out_prefix: config.out_prefix },
      own_ids: [config.client_id, nodeClientId(config.client_id)],
      ...{ readings: new TopicSet(intake.topics), commands: this.commands.topics },
      refused: (what, text) => this.refusedSomebody(what, text),
    };
  }

  private brokerOptions(): BrokerOptions {
    const { config, log } = this.options;
    const { embedded_tls: tls = null, embedded_packet_max_bytes: most } = config;
    const { embedded_memory_max_bytes: memory } = config;
    return {
      tls,
      ...(most === undefined ? {} : { packet_most_bytes: most }),
      ...(memory === undefined ? {} : { memory_most_bytes: memory }),
      refused: (what, text) => this.refusedSomebody(what, text),
      held: (text) => {
        this.options.counters.add('broker_publishers_held');
        this.options.notices.warn('broker_publishers_held', `at its own broker ${text}`);
      },
      info: (text) => log.info(text),
      error: (text) => log.error(text),
    };
  }

  private refusedSomebody(what: Refusal, text: string): void {
    const { counters, notices } = this.options;
    counters.add(`broker_${what}_refused`);
    notices.warn(`broker_${what}_refused`, `its own broker refused: ${text}`);
  }

  private get url(): string {
    return this.broker?.url ?? this.options.config.url ?? '';
  }

  private up(): void {
    this.heard();
    this.refusal = null;
    this.options.notices.info('mqtt_up', `connected to the MQTT broker ${this.name}`);
    this.announcer.connected();
    this.options.edgeNodes.linkUp();
    this.options.connected();
  }
}
