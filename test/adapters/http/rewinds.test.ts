import { afterEach, describe, expect, it } from 'vitest';
import { rewindsSchema } from '../../../src/adapters/http/schema/rewinds.js';
import type { RewindRecord } from '../../../src/core/scan/rewindRecord.js';
import { testApp } from './httpApp.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;
afterEach(async () => {
  await built?.app.close();
  built = null;
});

const record: RewindRecord = {
  ...{ unit: 'north', done: '2026-01-31T05:00:00.000Z', scans: 60, late_used: 14, revised: 58 },
  ...{ from: '2026-01-31T04:00:00.000Z', to: '2026-01-31T04:59:30.000Z', revision: 2 },
  differences: [
    {
      ...{ id: 'north/data_stale/unit', kind: 'data_stale', transition: 'raised' },
      ...{ time: '2026-01-31T04:10:00.000Z', told: true },
    },
  ],
  differences_left_out: 0,
};

describe('GET /api/units/{unit}/rewinds', () => {
  it('gives rewinds that reach into the span, and answers carry the revision', async () => {
    built = await testApp();
    const { app, plant } = built;
    plant.rewound.push(record, { ...record, unit: 'south' });
    const get = (query = '') => app.inject({ url: `/api/units/north/rewinds${query}` });
    const body = rewindsSchema.strict().parse((await get()).json());
    expect(body.rewinds).toEqual([record]);
    expect(body.older_left_out).toBe(false);
    const before = await get('?from=2026-01-30T00:00:00Z&to=2026-01-31T03:00:00Z');
    expect(before.json().rewinds).toEqual([]);
    expect((await get('?most=3')).statusCode).toBe(400);
    plant.revision = 2;
    expect((await app.inject({ url: '/api/units/north' })).json().estimate.revision).toBe(2);
  });
});
