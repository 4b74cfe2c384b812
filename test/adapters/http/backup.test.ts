import { afterEach, describe, expect, it } from 'vitest';
import { FAULT_CODES } from '../../../src/adapters/http/faults.js';
import { Counters } from '../../../src/daemon/counters.js';
import { ERRORS, RockhourError } from '../../../src/errors.js';
import { holders } from '../../access/holders.js';
import { testApp } from './httpApp.js';

const { access, tokens } = holders();
let built: Awaited<ReturnType<typeof testApp>>;
afterEach(() => built?.app.close());
const url = '/api/units/north/backup';
const type = { 'content-type': 'application/gzip' };

describe('a backup over HTTP', () => {
  it('is a file, and comes back with the name of whoever did it', async () => {
    built = await testApp({ access });
    const authorization = `Bearer ${tokens.configure}`;
    const file = await built.app.inject({ url, headers: { authorization } });
    expect(file.headers['content-type']).toBe('application/gzip');
    expect(file.headers['content-disposition']).toContain('north.backup.gz');
    const put = (payload: Buffer | undefined, query = '') =>
      built.app.inject({
        ...{ method: 'PUT', url: `${url}${query}`, headers: { authorization, ...type } },
        ...(payload === undefined ? {} : { payload }),
      });
    const done = await put(file.rawPayload, '?who=Ada');
    expect(done.json()).toMatchObject({ unit: 'north', who: 'a_configure (Ada)', scans: 3 });
    const bad = await put(Buffer.from('another'));
    expect([bad.statusCode, bad.json().error.code]).toEqual([400, 'unusable_backup']);
    expect(bad.json().error.message).toBe('the file is no backup of a unit');
    expect((await put(undefined)).json().error.code).toBe('unusable_backup');
    expect((await put(Buffer.alloc(33 * 1024 * 1024))).statusCode).toBe(413);
    // The large body is this route's alone.
    const other = await built.app.inject({
      ...{ method: 'POST', url: '/api/alarms/acknowledge', payload: Buffer.alloc(20_000) },
      headers: { authorization, ...type },
    });
    expect(other.statusCode).toBe(413);
  });

  it('tells a machine whether it is ready, and why not only whoever may look', async () => {
    built = await testApp({ access });
    const ask = (headers = {}) => built.app.inject({ url: '/api/ready', headers });
    expect((await ask()).json()).toEqual({ ready: true });
    built.plant.missing = ['the journal cannot be written'];
    const no = await ask();
    expect([no.statusCode, no.json()]).toEqual([503, { ready: false }]);
    const told = await ask({ authorization: `Bearer ${tokens.view}` });
    expect(told.json()).toEqual({ ready: false, reasons: ['the journal cannot be written'] });
  });
});

describe('errors by code', () => {
  it('are in the metrics, all codes of the closed lists, each counted where it is answered', async () => {
    built = await testApp({ access });
    const headers = { authorization: `Bearer ${tokens.view}` };
    for (const path of ['/api/units/none', '/api/nothing', '/api/units/none']) {
      await built.app.inject({ url: path, headers });
    }
    await built.app.inject({ url: '/api/units' });
    const { body } = await built.app.inject({ url: '/metrics', headers });
    const counted = (metric: string): Record<string, number> =>
      Object.fromEntries(
        [...body.matchAll(new RegExp(`^${metric}\\{code="(\\w+)"\\} (\\d+)$`, 'gm'))].map(
          ([, code, count]) => [code, Number(count)],
        ),
      );
    const faults = counted('rockhour_http_faults_total');
    expect(Object.keys(faults)).toEqual([...FAULT_CODES]);
    expect(Object.entries(faults).filter(([, count]) => count > 0)).toEqual([
      ['not_logged_in', 1],
      ['unknown_unit', 2],
      ['unknown_route', 1],
    ]);
    expect(counted('rockhour_errors_total')).toEqual(built.plant.errors());
  });

  it('of the daemon are those of its catalogue, what has no code is its own fault', () => {
    const counters = new Counters();
    counters.failed(new RockhourError('STORE_FAILED', 'no room'));
    counters.failed(new RangeError('unexpected'));
    counters.failed('text');
    const told = Object.entries(counters.errors()).filter(([, count]) => count > 0);
    expect(told).toEqual([
      ['STORE_FAILED', 1],
      ['INTERNAL', 2],
    ]);
    expect(Object.keys(counters.errors())).toEqual(Object.keys(ERRORS));
  });
});
