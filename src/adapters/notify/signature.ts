import { createHmac } from 'node:crypto';

/**
 * Headers of the open "Standard Webhooks" specification, by which a receiver knows that a message is
 * ours, unchanged and not an old one sent again: HMAC-SHA256 over `id.timestamp.body`, in base64, as
 * `v1,SIGNATURE`. A secret that begins with `whsec_` holds its key in base64 behind that, any other
 * is the key as it stands (UTF-8).
 *
 * @param time_s time of this attempt [s since 1970]
 */
export function signedHeaders(
  secret: string | null,
  id: string,
  time_s: number,
  body: string,
): Record<string, string> {
  const timestamp = String(Math.floor(time_s));
  const headers = { 'webhook-id': id, 'webhook-timestamp': timestamp };
  if (secret === null) return headers;
  const key = secret.startsWith('whsec_')
    ? Buffer.from(secret.slice('whsec_'.length), 'base64')
    : Buffer.from(secret, 'utf8');
  const signature = createHmac('sha256', key).update(`${id}.${timestamp}.${body}`).digest('base64');
  return { ...headers, 'webhook-signature': `v1,${signature}` };
}
