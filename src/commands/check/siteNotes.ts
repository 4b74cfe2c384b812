import { statSync } from 'node:fs';
import { staysHere } from '../../config/loopback.js';
import type { SecretFile, SiteConfig } from '../../config/site.js';
import { certificatesOf } from '../../config/tlsFiles.js';

/** A certificate that ends sooner than this is told [ms]. */
const SOON_MS = 30 * 86_400_000;

/** What a person should look at who opens a site to a network; not faults. */
export function siteNotes(site: SiteConfig, now_ms = Date.now()): string[] {
  const { http, mqtt, influx, notify } = site;
  const notes: string[] = [];
  const hasTokens = (http.tokens ?? []).length > 0;
  if (!staysHere(http.host) && http.login_by_proxy) {
    notes.push(
      `http.host ${http.host}: rockhour asks nobody who they are (http.login_by_proxy); whoever reaches that address past the proxy sees all and may acknowledge alarms`,
    );
  }
  if (!staysHere(http.host) && hasTokens && (http.tls ?? null) === null) {
    notes.push(
      `http.host ${http.host}: without http.tls tokens and figures cross the network in the clear`,
    );
  }
  if (mqtt.url === null && !staysHere(mqtt.embedded_host) && !mqtt.embedded_tls) {
    notes.push(
      `mqtt.embedded_host ${mqtt.embedded_host}: without mqtt.embedded_tls tokens and readings cross the network in the clear`,
    );
  }
  const plain = (url: string | null | undefined) => /^(mqtt|tcp|ws|http):/.test(url ?? '');
  if (mqtt.password !== null && plain(mqtt.url)) {
    notes.push('mqtt.url is not encrypted: the password crosses the network in the clear');
  }
  if (influx !== null && influx.password !== null && plain(influx.url)) {
    notes.push('influx.url is not encrypted: the password crosses the network in the clear');
  }
  return [
    ...notes,
    ...certificateNotes('http.tls.cert_file', http.tls?.cert, now_ms),
    ...certificateNotes('mqtt.embedded_tls.cert_file', mqtt.embedded_tls?.cert, now_ms),
    ...certificateNotes('mqtt.tls.cert_file', mqtt.tls?.cert, now_ms),
    ...certificateNotes('mqtt.tls.ca_file', mqtt.tls?.ca, now_ms),
    ...certificateNotes('influx.tls.ca_file', influx?.tls?.ca, now_ms),
    ...(notify?.webhooks ?? []).flatMap(({ tls }, i) =>
      certificateNotes(`notify.webhooks[${i}].tls.ca_file`, tls?.ca, now_ms),
    ),
    ...(site.secret_files ?? []).flatMap(openFileNotes),
  ];
}

/** A certificate that is no longer, not yet or not for long believed by others. */
function certificateNotes(path: string, pem: string | null | undefined, now_ms: number): string[] {
  const day = (text: string) => new Date(text).toISOString().slice(0, 10);
  return (certificatesOf(pem ?? '') ?? []).flatMap(({ validFrom, validTo }) => {
    if (Date.parse(validTo) < now_ms) return [`${path}: a certificate ended on ${day(validTo)}`];
    if (Date.parse(validFrom) > now_ms) {
      return [`${path}: a certificate only begins on ${day(validFrom)}`];
    }
    const ends = Date.parse(validTo) - now_ms < SOON_MS;
    return ends ? [`${path}: a certificate ends on ${day(validTo)}`] : [];
  });
}

/** A secret that every user of the machine may read. */
function openFileNotes({ path, file }: SecretFile): string[] {
  try {
    const mode = statSync(file).mode & 0o777;
    if ((mode & 0o004) === 0) return [];
    const rights = mode.toString(8).padStart(3, '0');
    return [`${path}: every user of this machine may read the file (${rights}; 600 is meant)`];
  } catch {
    // It was read a moment ago; what is gone now is a fault of the next look.
    return [];
  }
}
