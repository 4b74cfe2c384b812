import { z } from 'zod';
import { ROLES } from '../../access/role.js';
import { HASH_PATTERN, HASH_WORDS, NAME_PATTERN, NAME_WORDS } from '../../access/token.js';
import { MOST_TOKENS } from '../../access/tokensFile.js';
import { sparkplugNodeSchema, topic } from './channels.js';
import { key, positive, section, worded } from './key.js';
import { ca_file, file, ownCertificate, server_name, serverTls } from './tls.js';

const port = () => z.int().min(0).max(65535);
const login = {
  username: key(
    z.string().min(1).max(200),
    '-',
    'Name to log in with.',
    'rockhour',
    'none',
  ).optional(),
  password_file: key(
    z.string().min(1).max(1000),
    '-',
    'File that holds the password; relative to this configuration.',
    '/run/secrets/rockhour',
    'none',
  ).optional(),
  password_env: key(
    worded(
      z
        .string()
        .regex(/^[A-Za-z_][A-Za-z0-9_]*$/)
        .max(200),
      'the name of an environment variable',
    ),
    '-',
    'Environment variable that holds the password.',
    'ROCKHOUR_PASSWORD',
    'none',
  ).optional(),
};

/** Broker that the readings come from. */
export const mqttSchema = z.strictObject({
  url: key(
    worded(
      z.string().regex(/^(mqtts?|tcp|tls|wss?):\/\/[^\s/@]+(\/[^\s@]*)?$/),
      'an address such as mqtt://host:1883, without name and password',
    ),
    '-',
    'Address of the broker, without name and password.',
    'mqtt://broker.plant:1883',
    'rockhour starts its own broker',
  ).optional(),
  embedded_host: key(
    z.string().min(1).max(255),
    '-',
    'Where its own broker listens.',
    '127.0.0.1',
  ).default('127.0.0.1'),
  embedded_port: key(port(), '-', 'Port of its own broker; 0 = any free one.', 1883).default(1883),
  embedded_tls: section(
    ownCertificate.optional(),
    'Certificate of its own broker, read again when it changes; TLS 1.2 at least, and nothing else.',
    'plain TCP',
  ),
  embedded_packet_max_kB: key(
    z.int().min(16).max(250_000),
    'kB',
    'A client of its own broker that sends a greater packet is cut off.',
    1200,
  ).default(1200),
  embedded_memory_max_MB: key(
    z.int().min(8).max(4000),
    'MB',
    'Most that its own broker keeps: half waits for rockhour, a quarter for others, a quarter is retained.',
    64,
  ).default(64),
  client_id: key(z.string().min(1).max(128), '-', 'Client id at the broker.', 'rockhour').default(
    'rockhour',
  ),
  ...login,
  tls: section(
    z
      .strictObject({
        ca_file,
        cert_file: file(
          "PEM file of rockhour's own certificate, where the broker asks for one",
          '/etc/rockhour/client.pem',
          'no certificate is shown',
        ).optional(),
        key_file: file(
          'PEM file of the private key to cert_file, without a passphrase',
          '/etc/rockhour/client.key',
          'no certificate is shown',
        ).optional(),
        server_name,
      })
      .optional(),
    'Certificates for a url that begins with mqtts, tls or wss; TLS 1.2 at least.',
    'the authorities that Node brings along',
  ),
  protocol: key(
    z.union([z.literal(4), z.literal(5)]),
    '-',
    '4 is MQTT 3.1.1, 5 is MQTT 5.',
    4,
  ).default(4),
  qos: key(
    z.union([z.literal(0), z.literal(1)]),
    '-',
    'Quality of service of the subscriptions; 1 = acknowledged once written to disk.',
    1,
  ).default(1),
  in_prefix: key(topic(), '-', 'Topics that are not given start with this.', 'plant').default(
    'plant',
  ),
  out_prefix: key(
    topic(),
    '-',
    'Topics of what rockhour publishes start with this.',
    'rockhour',
  ).default('rockhour'),
  sparkplug_node: section(
    sparkplugNodeSchema.optional(),
    'rockhour as a Sparkplug edge node with a device for each unit, beside what it publishes as JSON.',
    'it is none',
  ),
});

/** Time-series database that the estimates are forwarded to. */
export const influxSchema = z.strictObject({
  url: key(
    worded(
      z.string().regex(/^https?:\/\/[^\s/@]+\/?$/),
      'an address such as http://host:8086, without name and password',
    ),
    '-',
    'Address of the database, without name and password.',
    'http://127.0.0.1:8086',
  ),
  database: key(
    worded(
      z.string().regex(/^[A-Za-z_][A-Za-z0-9_-]{0,63}$/),
      'a name that begins with a letter and holds at most 64 letters, digits, _ and -',
    ),
    '-',
    'Name of the database.',
    'rockhour',
  ).default('rockhour'),
  ...login,
  tls: section(
    serverTls.optional(),
    'Certificates for a url that begins with https; TLS 1.2 at least.',
    'the authorities that Node brings along',
  ),
  batch_points: key(z.int().min(1).max(50000), '-', 'Most points in one request.', 5000).default(
    5000,
  ),
});

const days = (what: string, usual: number) => key(positive(36500), 'd', what, usual).default(usual);
/** Local store: journal, estimates and events. */
export const localStoreSchema = z.strictObject({
  folder: key(
    z.string().min(1).max(1000),
    '-',
    'Folder of the local database files; relative to this configuration.',
    './data',
  ).default('./data'),
  keep_readings_days: days('Readings older than this are deleted.', 90),
  keep_estimates_days: days('Estimates older than this are deleted.', 730),
  thin_after_days: days('After this time only one estimate per thin_to_s is kept.', 30),
  thin_to_s: key(
    z.int().min(1).max(86400),
    's',
    'Spacing of the estimates that are kept.',
    600,
  ).default(600),
  checkpoint_every_s: key(
    z.int().min(10).max(86400),
    's',
    'How often the state of the estimator is saved; the journal since is replayed at a start.',
    600,
  ).default(600),
  keep_free_MB: key(
    z.int().min(0).max(10_000_000),
    'MB',
    'Below so much room for the store it is thinned beyond what the ages above ask; 0 = never.',
    200,
  ).default(200),
});

const token = z.strictObject({
  name: key(
    worded(z.string().regex(NAME_PATTERN), NAME_WORDS),
    '-',
    'Whose token it is: recorded with what is done, and the user name at its own broker.',
    'control_room',
  ),
  role: key(
    z.enum(ROLES),
    '-',
    'view, acknowledge or configure, each with all before it; feed: readings in over its own broker.',
    'acknowledge',
  ),
  hash: key(
    worded(z.string().regex(HASH_PATTERN), HASH_WORDS),
    '-',
    'SHA-256 of the token, as rockhour admit prints it.',
    `sha256:${'0'.repeat(64)}`,
  ),
});

/** Page and API. */
export const httpSchema = z.strictObject({
  host: key(
    z.string().min(1).max(255),
    '-',
    'Where page and API listen; beyond this machine only with tokens, or with login_by_proxy.',
    '127.0.0.1',
  ).default('127.0.0.1'),
  port: key(port(), '-', 'Port; 0 = any free one.', 8080).default(8080),
  path_prefix: key(
    worded(
      z
        .string()
        .max(200)
        .regex(/^(\/[A-Za-z0-9._~-]+)*$/),
      'a path that begins with / and does not end with one, or an empty text',
    ),
    '-',
    'Path before all routes, for a proxy.',
    '/rockhour',
  ).default(''),
  tokens: section(
    z.array(section(token, 'A token.')).max(MOST_TOKENS).default([]),
    'Who may come in, to page, API and its own broker; made by rockhour admit.',
    'nobody is asked who they are',
  ),
  tokens_file: file(
    'File with a line NAME ROLE HASH for each token, beside tokens; read again when it changes',
    '/etc/rockhour/tokens',
    'tokens alone',
  ).optional(),
  login_by_proxy: key(
    z.boolean(),
    '-',
    'true: there are no tokens, and a proxy in front of rockhour does the log-in.',
    false,
  ).default(false),
  tls: section(
    ownCertificate.optional(),
    'Certificate of page and API, read again when it changes; TLS 1.2 at least.',
    'plain HTTP',
  ),
});
