import { isIP } from 'node:net';
import type { SiteConfig } from '../../config/site.js';

/** What a person should look at who opens a site to a network; not faults. */
export function siteNotes(site: SiteConfig): string[] {
  const notes: string[] = [];
  if (!staysHere(site.http.host)) {
    notes.push(
      `http.host ${site.http.host}: page and API have no log-in; whoever reaches that address sees all and may acknowledge alarms`,
    );
  }
  if (site.mqtt.url === null && !staysHere(site.mqtt.embedded_host)) {
    notes.push(
      `mqtt.embedded_host ${site.mqtt.embedded_host}: its own broker asks nobody who they are; whoever reaches it may send readings`,
    );
  }
  const plain = (url: string | null | undefined) => /^(mqtt|tcp|ws|http):/.test(url ?? '');
  if (site.mqtt.password !== null && plain(site.mqtt.url)) {
    notes.push('mqtt.url is not encrypted: the password crosses the network in the clear');
  }
  if (site.influx !== null && site.influx.password !== null && plain(site.influx.url)) {
    notes.push('influx.url is not encrypted: the password crosses the network in the clear');
  }
  return notes;
}

function staysHere(host: string): boolean {
  return host === 'localhost' || host === '::1' || (isIP(host) === 4 && host.startsWith('127.'));
}
