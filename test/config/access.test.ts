import { chmodSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { stringify } from 'yaml';
import { hashOf, makeToken } from '../../src/access/token.js';
import { siteNotes } from '../../src/commands/check/siteNotes.js';
import { faultsAsText } from '../../src/config/faults.js';
import { parseSite } from '../../src/config/load.js';
import { makeCertificates } from '../support/certificates.js';
import { temporaryFolder } from '../support/folders.js';
import { requireProgram } from '../support/requirements.js';
import { type Block, CONFIG_FOLDER, exampleData } from './sites.js';

const hash = hashOf('1');
const token = { name: 'control_room', role: 'acknowledge', hash };

/** What is wrong with a changed example, path and what was found; its site where nothing is. */
function parsed(change: (data: Block) => void, folder = CONFIG_FOLDER) {
  const data = exampleData('demo');
  change(data);
  const { site, faults = [] } = parseSite(stringify(data), folder, {});
  return { site, faults, places: faults.map((one) => one.path) };
}

describe('tokens', () => {
  it('come from the configuration and from a file beside it', () => {
    const folder = temporaryFolder('tokens');
    writeFileSync(join(folder, 'tokens'), `gate feed ${hashOf('2')}\n`);
    const { site } = parsed((d) => {
      d.http = { host: '0.0.0.0', tokens: [token], tokens_file: 'tokens' };
    }, folder);
    expect(site?.http.tokens).toEqual([token, { name: 'gate', role: 'feed', hash: hashOf('2') }]);
    expect(site?.http.tokens_file).toBe(join(folder, 'tokens'));
  });

  it('in the clear are refused in words, and never shown', () => {
    const secret = makeToken();
    for (const http of [
      { tokens: [secret] },
      { tokens: [{ ...token, hash: secret }] },
      { tokens: [{ ...token, name: secret }] },
      { tokens: [{ name: 'a', role: 'view', token: secret }] },
      { token: secret },
      { tokens: secret },
      { password: secret },
    ]) {
      const { faults } = parsed((d) => {
        d.http = http;
      });
      expect(faults.length).toBeGreaterThan(0);
      const said = faultsAsText('plant.yaml', faults) + JSON.stringify(faults);
      expect(said).not.toContain(secret);
      if ('token' in http || 'password' in http) {
        expect(said).toContain('rockhour admit makes a token, of which the hash alone stands');
      }
    }
    const { faults } = parsed((d) => {
      d.http = { tokens: [{ ...token, hash: secret }] };
    });
    expect(faults[0]?.expected).toMatch(/^sha256: and 64 hexadecimal digits.*never the token/);
  });

  it.each([
    [{ tokens: [token, { ...token, hash: hashOf('2') }] }, ['http.tokens[1].name']],
    [{ tokens: [token, { ...token, name: 'b' }] }, ['http.tokens[1].hash']],
    [{ tokens: [{ ...token, role: 'owner' }] }, ['http.tokens[0].role']],
    [{ tokens: [token], login_by_proxy: true }, ['http.login_by_proxy']],
    [{ tokens_file: 'nowhere' }, ['http.tokens_file']],
  ])('%j is refused', (http, places) => {
    expect(
      parsed((d) => {
        d.http = http;
      }).places,
    ).toEqual(places);
  });

  it('that stand in both places are refused', () => {
    const folder = temporaryFolder('tokens');
    writeFileSync(join(folder, 'tokens'), `control_room view ${hashOf('2')}\n`);
    const { faults } = parsed((d) => {
      d.http = { tokens: [token], tokens_file: 'tokens' };
    }, folder);
    expect(faults.map(({ path, found }) => [path, found])).toEqual([
      ['http.tokens_file', 'a file with a name that http.tokens has as well'],
    ]);
  });
});

describe('an address beyond this machine', () => {
  it('is refused without tokens, for page and own broker, unless a proxy does the log-in', () => {
    const open = (http: Block, embedded?: string) =>
      parsed((d) => {
        d.http = http;
        if (embedded !== undefined) d.mqtt.embedded_host = embedded;
      });
    expect(open({ host: '0.0.0.0' }).places).toEqual(['http.host']);
    expect(open({ host: '0.0.0.0' }).faults[0]?.hint).toMatch(/login_by_proxy: true/);
    expect(open({ host: '0.0.0.0', login_by_proxy: true }).faults).toEqual([]);
    expect(open({ host: '0.0.0.0', tokens: [token] }).faults).toEqual([]);
    expect(open({}, '0.0.0.0').places).toEqual(['mqtt.embedded_host']);
    // The proxy before the page knows nothing of the broker.
    expect(open({ login_by_proxy: true }, '0.0.0.0').places).toEqual(['mqtt.embedded_host']);
    expect(open({ tokens: [token] }, '0.0.0.0').faults).toEqual([]);
    for (const host of ['127.0.0.1', '127.0.0.9', '::1', 'localhost']) {
      expect(open({ host }, host).faults).toEqual([]);
    }
  });
});

describe.skipIf(!requireProgram('openssl'))('certificates', () => {
  const made = makeCertificates();
  const server = made.make('server', ['127.0.0.1']);
  const other = made.make('other', ['127.0.0.1']);
  const ended = made.make('ended', ['127.0.0.1'], true);
  const folder = temporaryFolder('tls');
  writeFileSync(join(folder, 'none'), 'nothing of the kind');

  it('are read with the configuration', () => {
    const { site, faults } = parsed((d) => {
      d.mqtt = {
        url: 'mqtts://broker:8883',
        tls: { ca_file: made.ca, cert_file: server.cert, key_file: server.key, server_name: 'b' },
      };
      d.influx = { url: 'https://database:8086', tls: { ca_file: made.ca } };
      d.http = { tls: { cert_file: server.cert, key_file: server.key } };
      d.notify = { webhooks: [{ id: 'w', url: 'https://w/', tls: { ca_file: made.ca } }] };
    });
    expect(faults).toEqual([]);
    expect(site?.notify?.webhooks[0]?.tls).toMatchObject({ ca: readFileSync(made.ca, 'utf8') });
    expect(site?.mqtt.tls).toMatchObject({ server_name: 'b' });
    for (const pem of [site?.mqtt.tls?.ca, site?.influx?.tls?.ca, site?.http.tls?.cert]) {
      expect(pem).toContain('BEGIN CERTIFICATE');
    }
    expect(site?.influx?.tls?.cert).toBeNull();
    expect(site?.http.tls?.key).toContain('PRIVATE KEY');
  });

  it.each([
    [{ cert_file: 'nowhere', key_file: server.key }, 'cert_file', /nowhere.*ENOENT/],
    [
      { cert_file: 'none', key_file: server.key },
      'cert_file',
      /none, a file without a certificate/,
    ],
    [
      { cert_file: server.cert, key_file: 'none' },
      'key_file',
      /none, a file without a private key/,
    ],
    [{ cert_file: server.cert, key_file: other.key }, 'key_file', /other.key, another private key/],
    [{ cert_file: server.cert }, 'key_file', /nothing/],
  ])('%# that do not serve are named with key and file', (tls, key, found) => {
    const { faults } = parsed((d) => {
      d.http = { tls };
    }, folder);
    expect(faults.map(({ path }) => path)).toEqual([`http.tls.${key}`]);
    expect(faults[0]?.found).toMatch(found);
    expect(JSON.stringify(faults)).not.toContain('BEGIN PRIVATE KEY-----\n');
  });

  it.each([
    ['nowhere', /^nowhere, no file that can be read \(ENOENT\)$/],
    ['none', /^none, a file without a certificate$/],
    ['server.key', /^server\.key, a file without a certificate$/],
  ])('of the authority of a webhook: %s does not serve', (ca_file, found) => {
    writeFileSync(join(folder, 'server.key'), readFileSync(server.key));
    const { faults } = parsed((d) => {
      const tls = { ca_file };
      d.notify = {
        webhooks: [
          { id: 'plain', url: 'http://w/' },
          { id: 'w', url: 'https://w/', tls },
        ],
      };
    }, folder);
    expect(faults).toHaveLength(1);
    expect(faults[0]).toMatchObject({ path: 'notify.webhooks[1].tls.ca_file' });
    expect(faults[0]?.line).toBeGreaterThan(0);
    expect(faults[0]?.found).toMatch(found);
    expect(faults[0]?.expected).toMatch(/^a certificate in PEM, which begins with -----BEGIN/);
    expect(JSON.stringify(faults)).not.toContain('BEGIN PRIVATE KEY');
  });

  it('of its own broker are read, and are for no broker of the site', () => {
    const embedded_tls = { cert_file: server.cert, key_file: server.key };
    const { site, faults } = parsed((d) => {
      d.mqtt = { embedded_tls };
    });
    expect(faults).toEqual([]);
    expect(site?.mqtt.embedded_tls?.key).toContain('PRIVATE KEY');
    expect(site?.mqtt.embedded_packet_max_bytes).toBe(1_200_000);
    expect(site?.secret_files?.map(({ path }) => path)).toEqual(['mqtt.embedded_tls.key_file']);
    const { places } = parsed((d) => {
      d.mqtt = { url: 'mqtts://broker', embedded_tls };
    });
    expect(places).toEqual(['mqtt.url']);
    const unlike = parsed((d) => {
      d.mqtt = { embedded_tls: { cert_file: server.cert, key_file: other.key } };
    });
    expect(unlike.places).toEqual(['mqtt.embedded_tls.key_file']);
    // TLS alone asks nobody who they are.
    const open = parsed((d) => {
      d.mqtt = { embedded_host: '0.0.0.0', embedded_tls };
    });
    expect(open.places).toEqual(['mqtt.embedded_host']);
    const clear = (mqtt: object) =>
      siteNotes(
        parsed((d) => {
          d.http = { tokens: [token] };
          d.mqtt = { embedded_host: '0.0.0.0', ...mqtt };
        }).site!,
      ).filter((note) => note.startsWith('mqtt.embedded_host'));
    expect(clear({})).toHaveLength(1);
    expect(clear({})[0]).toMatch(/in the clear/);
    expect(clear({ embedded_tls })).toEqual([]);
  });

  it('need an address with TLS, and a key beside each certificate', () => {
    const { places } = parsed((d) => {
      d.notify = { webhooks: [{ id: 'w', url: 'http://w/', tls: { ca_file: made.ca } }] };
      d.mqtt = { url: 'mqtt://broker', tls: { cert_file: server.cert } };
      d.influx = { url: 'http://database:8086', tls: { ca_file: made.ca } };
    });
    expect(places.sort()).toEqual([
      ...['influx.url', 'mqtt.tls.key_file', 'mqtt.url', 'notify.webhooks[0].url'],
    ]);
    const own = parsed((d) => {
      d.mqtt.tls = { ca_file: made.ca };
    });
    expect(own.places).toEqual(['mqtt.url']);
  });

  it('that have ended, and secrets that everybody may read, are told by check', () => {
    writeFileSync(join(folder, 'password'), 'x');
    chmodSync(join(folder, 'password'), 0o644);
    chmodSync(ended.key, 0o600);
    const { site } = parsed((d) => {
      d.mqtt = { url: 'mqtts://broker', username: 'a', password_file: 'password' };
      d.http = { tls: { cert_file: ended.cert, key_file: ended.key } };
    }, folder);
    expect(siteNotes(site!)).toEqual([
      'http.tls.cert_file: a certificate ended on 2020-01-02',
      'mqtt.password_file: every user of this machine may read the file (644; 600 is meant)',
    ]);
    chmodSync(join(folder, 'password'), 0o640);
    expect(siteNotes(site!, Date.UTC(2020, 0, 1, 12))).toEqual([
      'http.tls.cert_file: a certificate ends on 2020-01-02',
    ]);
    expect(siteNotes(site!, Date.UTC(2019, 0, 1))).toEqual([
      'http.tls.cert_file: a certificate only begins on 2020-01-01',
    ]);
  });
});
