import { readFileSync } from 'node:fs';

const UNIT = new URL('../../config/rockhour.service', import.meta.url);

/** The environment that the systemd unit gives the daemon; a test holds the image's against it. */
export function shippedEnvironment(): Record<string, string> {
  const lines = readFileSync(UNIT, 'utf8').matchAll(/^Environment=(\w+)=(\S+)$/gm);
  return Object.fromEntries([...lines].map(([, name, value]) => [name!, value!]));
}
