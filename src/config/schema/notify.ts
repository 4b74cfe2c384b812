import { z } from 'zod';
import { id, key, positive, section, worded } from './key.js';
import { serverTls } from './tls.js';

const webhook = z.strictObject({
  id: key(id(), '-', 'Name of the receiver, in logs, health and counters.', 'on_call'),
  url: key(
    worded(
      z.string().regex(/^https?:\/\/[^\s/@]+(\/[^\s@]*)?$/),
      'an address such as https://host/path, without name and password',
    ),
    '-',
    'Where each alarm and alert is posted to, without name and password.',
    'https://messages.plant/rockhour',
  ),
  secret_file: key(
    z.string().min(1).max(1000),
    '-',
    'File that holds the secret of the signature; relative to this configuration.',
    '/run/secrets/rockhour_webhook',
    'not signed',
  ).optional(),
  secret_env: key(
    worded(
      z
        .string()
        .regex(/^[A-Za-z_][A-Za-z0-9_]*$/)
        .max(200),
      'the name of an environment variable',
    ),
    '-',
    'Environment variable that holds the secret of the signature.',
    'ROCKHOUR_WEBHOOK_SECRET',
    'not signed',
  ).optional(),
  tls: section(
    serverTls.optional(),
    'Certificates for a url that begins with https; TLS 1.2 at least.',
    'the authorities that Node brings along',
  ),
  send: key(
    z.array(z.enum(['alarm', 'alert'])).min(1),
    '-',
    'What is sent: alarms, alerts or both.',
    ['alarm', 'alert'],
  ).default(['alarm', 'alert']),
  least_priority: key(
    z.enum(['high', 'medium', 'low']),
    '-',
    'Nothing less urgent than this is sent.',
    'low',
  ).default('low'),
  timeout_s: key(positive(120), 's', 'An answer is waited for at most this long.', 10).default(10),
  oldest_h: key(
    positive(8760),
    'h',
    'What could not be delivered for this long is left out and counted: it is history by then.',
    24,
  ).default(24),
});

/** Who else is told of alarms and alerts. */
export const notifySchema = z.strictObject({
  webhooks: section(
    z.array(section(webhook, 'A receiver over HTTP.')).max(20).default([]),
    'Receivers over HTTP, each told on its own.',
  ),
});

export type NotifyBlock = z.output<typeof notifySchema>;
