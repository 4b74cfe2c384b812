import { isIP } from 'node:net';

/** Whether what listens at this host can be reached from this machine alone. */
export function staysHere(host: string): boolean {
  return host === 'localhost' || host === '::1' || (isIP(host) === 4 && host.startsWith('127.'));
}
