import { repeatedToken } from '../../access/token.js';
import { staysHere } from '../loopback.js';
import type { SiteBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';

const ADMIT = 'rockhour admit makes a token; its line goes to http.tokens';

/** Who may come in, held against where rockhour listens; certificates against addresses. */
export function accessFaults(site: SiteBlock): CrossFault[] {
  return [...tokenFaults(site), ...openFaults(site), ...tlsFaults(site)];
}

function tokenFaults({ http }: SiteBlock): CrossFault[] {
  const faults: CrossFault[] = [];
  const twice = repeatedToken(http.tokens);
  if (twice !== null) {
    const { index, what } = twice;
    const expected = `a ${what} that no other token has`;
    faults.push(cross(['http', 'tokens', index, what], http.tokens[index]?.[what], expected));
  }
  if (http.login_by_proxy && hasTokens({ http })) {
    const path = ['http', 'login_by_proxy'] as const;
    faults.push(
      cross(path, true, 'false where there are tokens: one of the two does the log-in', {
        others: [
          ['http', 'tokens'],
          ['http', 'tokens_file'],
        ],
      }),
    );
  }
  return faults;
}

const hasTokens = ({ http }: Pick<SiteBlock, 'http'>) =>
  http.tokens.length > 0 || http.tokens_file !== undefined;

/** Beyond this machine nobody comes in unasked. */
function openFaults(site: SiteBlock): CrossFault[] {
  const { http, mqtt } = site;
  if (hasTokens(site)) return [];
  const faults: CrossFault[] = [];
  if (!staysHere(http.host) && !http.login_by_proxy) {
    faults.push(
      cross(['http', 'host'], http.host, '127.0.0.1, or tokens in http.tokens or tokens_file', {
        hint: `${ADMIT}. Where a proxy in front does the log-in, say http.login_by_proxy: true`,
        others: [
          ['http', 'tokens'],
          ['http', 'tokens_file'],
          ['http', 'login_by_proxy'],
        ],
      }),
    );
  }
  if (mqtt.url === undefined && !staysHere(mqtt.embedded_host)) {
    faults.push(
      cross(
        ['mqtt', 'embedded_host'],
        mqtt.embedded_host,
        '127.0.0.1, or tokens in http.tokens or tokens_file',
        {
          hint: `${ADMIT}; gateways log in with its name and the token`,
          others: [
            ['mqtt', 'url'],
            ['http', 'tokens'],
            ['http', 'tokens_file'],
          ],
        },
      ),
    );
  }
  return faults;
}

/** Certificates without encryption, a certificate without its key. */
function tlsFaults({ mqtt, influx, notify }: SiteBlock): CrossFault[] {
  const faults: CrossFault[] = [];
  const { tls } = mqtt;
  if (mqtt.embedded_tls !== undefined && mqtt.url !== undefined) {
    const expected = 'no address, as embedded_tls is for a broker of its own';
    faults.push(cross(['mqtt', 'url'], mqtt.url, expected, { others: [['mqtt', 'embedded_tls']] }));
  }
  if (tls !== undefined && !/^(mqtts|tls|wss):/.test(mqtt.url ?? '')) {
    const expected = 'an address that begins with mqtts://, as mqtt.tls stands beside it';
    faults.push(cross(['mqtt', 'url'], mqtt.url, expected, { others: [['mqtt', 'tls']] }));
  }
  for (const [one, other] of [
    ['cert_file', 'key_file'],
    ['key_file', 'cert_file'],
  ] as const) {
    if (tls?.[one] === undefined || tls[other] !== undefined) continue;
    const expected = `a file beside ${one}: certificate and private key go together`;
    faults.push(
      cross(['mqtt', 'tls', other], undefined, expected, { others: [['mqtt', 'tls', one]] }),
    );
  }
  if (influx?.tls !== undefined && !influx.url.startsWith('https:')) {
    const expected = 'an address that begins with https://, as influx.tls stands beside it';
    faults.push(cross(['influx', 'url'], influx.url, expected, { others: [['influx', 'tls']] }));
  }
  for (const [i, { url, tls: own }] of notify.webhooks.entries()) {
    if (own === undefined || url.startsWith('https:')) continue;
    const at = ['notify', 'webhooks', i];
    const expected = 'an address that begins with https://, as tls stands beside it';
    faults.push(cross([...at, 'url'], url, expected, { others: [[...at, 'tls']] }));
  }
  return faults;
}
