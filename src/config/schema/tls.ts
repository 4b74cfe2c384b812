import { z } from 'zod';
import { key, worded } from './key.js';

/** A file that the site names. */
export const file = (what: string, example: string, otherwise: string) =>
  key(
    z.string().min(1).max(1000),
    '-',
    `${what}; relative to this configuration.`,
    example,
    otherwise,
  );
export const ca_file = file(
  'PEM file of the authorities whose certificates are believed',
  '/etc/rockhour/ca.pem',
  'those that Node brings along',
).optional();
export const server_name = key(
  worded(
    z
      .string()
      .regex(/^[A-Za-z0-9.-]+$/)
      .max(253),
    'a host name',
  ),
  '-',
  "Name that the server's certificate has to be for.",
  'broker.plant',
  'the host of the url',
).optional();

/** How a server that rockhour asks is known by its certificate. */
export const serverTls = z.strictObject({ ca_file, server_name });

/** Certificate of a server of rockhour's own. */
export const ownCertificate = z.strictObject({
  cert_file: file(
    "PEM file of the server's certificate and those that vouch for it",
    '/etc/rockhour/server.pem',
    'required',
  ),
  key_file: file(
    'PEM file of the private key to cert_file, without a passphrase',
    '/etc/rockhour/server.key',
    'required',
  ),
});
