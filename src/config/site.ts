import type { AccessToken } from '../access/token.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { EventKind } from '../core/watch/event.js';
import type { Fault } from './faults.js';

/** Where the readings of a channel come from. */
export interface ChannelSource {
  readonly unit: string;
  readonly topic: string;
  /** `value`: one reading a message; `array`: the readings of a whole string, ordered by x. */
  readonly payload: 'value' | 'array';
  /** Channel ids in the order of the array; exactly one for `value`. */
  readonly channels: readonly string[];
}

/** A channel that is a metric of a Sparkplug edge node, or of a device at one. */
export interface SparkplugSource {
  readonly unit: string;
  readonly channel: string;
  readonly group: string;
  readonly node: string;
  /** null: the edge node itself. */
  readonly device: string | null;
  readonly metric: string;
}

/** Certificates towards a server, as PEM. */
export interface ClientTls {
  /** Authorities that are believed; null: those that Node brings along. */
  readonly ca: string | null;
  /** Own certificate and its key; null: none is shown. */
  readonly cert: string | null;
  readonly key: string | null;
  /** Name that the certificate has to be for; null: the host of the url. */
  readonly server_name: string | null;
}

/** Certificate of the own server: the files, and what stood in them at the start. */
export interface ServerTls {
  readonly cert_file: string;
  readonly key_file: string;
  readonly cert: string;
  readonly key: string;
}

/** A file that holds a secret, and the key that names it. */
export interface SecretFile {
  readonly path: string;
  readonly file: string;
}

export interface MqttConfig {
  /** null: rockhour starts its own broker on `embedded_host:embedded_port`. */
  readonly url: string | null;
  readonly embedded_host: string;
  readonly embedded_port: number;
  /** Certificate of its own broker; absent or null: plain TCP. */
  readonly embedded_tls?: ServerTls | null;
  /** Greatest packet that its own broker takes, with its header; absent: what MQTT allows. */
  readonly embedded_packet_max_bytes?: number;
  /** Most that it keeps in memory, retained or waiting for clients; absent: 64 MB. */
  readonly embedded_memory_max_bytes?: number;
  readonly client_id: string;
  readonly username: string | null;
  readonly password: string | null;
  /** Protocol 4 is MQTT 3.1.1, 5 is MQTT 5. */
  readonly protocol: 4 | 5;
  readonly qos: 0 | 1;
  /** Topics of what rockhour publishes start with this. */
  readonly out_prefix: string;
  /** Absent or null: nothing beyond what the url says. */
  readonly tls?: ClientTls | null;
  /** rockhour as an edge node; absent or null: it is none. */
  readonly sparkplug_node?: { readonly group: string; readonly node: string } | null;
}

export interface InfluxConfig {
  readonly url: string;
  readonly database: string;
  readonly username: string | null;
  readonly password: string | null;
  readonly batch_points: number;
  /** Absent or null: nothing beyond what the url says. */
  readonly tls?: ClientTls | null;
}

export interface StoreConfig {
  /** Folder of the local database files. */
  readonly folder: string;
  readonly keep_readings_days: number;
  readonly keep_estimates_days: number;
  /** After this many days only one estimate per `thin_to_s` is kept. */
  readonly thin_after_days: number;
  readonly thin_to_s: number;
  readonly checkpoint_every_s: number;
  /** Room on the disk below which the store is thinned early; absent or 0: never. */
  readonly keep_free_MB?: number;
}

export interface HttpConfig {
  readonly host: string;
  readonly port: number;
  readonly path_prefix: string;
  /** Those of the file and those of tokens_file; absent or empty: nobody is asked who they are. */
  readonly tokens?: readonly AccessToken[];
  /** Tokens that stand in the configuration itself, and the file of the others. */
  readonly tokens_inline?: readonly AccessToken[];
  readonly tokens_file?: string | null;
  /** A proxy in front does the log-in: any name of the host is answered to. */
  readonly login_by_proxy?: boolean;
  /** Absent or null: plain HTTP. */
  readonly tls?: ServerTls | null;
}

/** A receiver of alarms and alerts over HTTP. */
export interface WebhookConfig {
  readonly id: string;
  readonly url: string;
  /** Key of the signature; null: not signed. */
  readonly secret: string | null;
  /** Absent or null: nothing beyond what the url says. */
  readonly tls?: ClientTls | null;
  readonly send: readonly ('alarm' | 'alert')[];
  readonly least_priority: 'high' | 'medium' | 'low';
  readonly timeout_s: number;
  readonly oldest_h: number;
}

/** What may be done to alarms and alerts. */
export interface AlarmsConfig {
  /** Longest time on the shelf [h]. */
  readonly shelve_most_h: number;
  /** Kinds, `KIND/SUBJECT` or whole ids that are out of service. */
  readonly out_of_service: readonly string[];
  /** Kinds that stay until they are reset. */
  readonly latching: readonly EventKind[];
}

/** What is done with readings that come when their scan is closed. */
export interface LateConfig {
  /** Older ones than this against the newest reading are not used [h]; 0 = none is. */
  readonly rewind_h: number;
  /** Spacing of the states that are kept to go back to [s]. */
  readonly rewind_point_every_s: number;
  /** They are taken in once none has come for this long [s], */
  readonly quiet_s: number;
  /** but at the latest after this [s]. */
  readonly wait_most_s: number;
}

export interface NotifyConfig {
  readonly webhooks: readonly WebhookConfig[];
}

/** A unit that is not run, because its part of the file has faults. */
export interface LeftOutUnit {
  /** As in the file; its place there (`units[2]`) where that is no id, or another unit's. */
  readonly id: string;
  readonly name: string;
  readonly faults: readonly Fault[];
}

/** A whole site: what the YAML file becomes once it is found sound. Frozen. */
export interface SiteConfig {
  readonly name: string;
  readonly units: readonly UnitDefinition[];
  readonly sources: readonly ChannelSource[];
  /** Channels that come by Sparkplug; absent: none. */
  readonly sparkplug?: readonly SparkplugSource[];
  /** Units of the file that have faults and are not run; absent: none. */
  readonly left_out?: readonly LeftOutUnit[];
  /** How long after its nominal end a scan waits for missing readings [s]. */
  readonly scan_deadline_s: number;
  /**
   * A reading stamped further ahead of this machine's clock than this is counted and not used [s];
   * without it 300.
   */
  readonly clock_tolerance_s?: number;
  /** Without it as `DEFAULT_LATE` has it. */
  readonly late?: LateConfig;
  readonly mqtt: MqttConfig;
  readonly influx: InfluxConfig | null;
  /** Absent: shelved for 8 h at most, all in service, none latching. */
  readonly alarms?: AlarmsConfig;
  /** Absent: nobody else is told. */
  readonly notify?: NotifyConfig;
  readonly store: StoreConfig;
  readonly http: HttpConfig;
  /** Files with passwords and keys, whose permissions are looked at; absent: none. */
  readonly secret_files?: readonly SecretFile[];
}
