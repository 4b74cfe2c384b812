import { afterEach, describe, expect, it } from 'vitest';
import { acknowledgedSchema, alarmsSchema } from '../../../src/adapters/http/schema/alarms.js';
import {
  countersSchema,
  eventsSchema,
  healthSchema,
  unitHistorySchema,
  unitHoursSchema,
  unitListSchema,
  unitNowSchema,
} from '../../../src/adapters/http/schema/answers.js';
import { unitProfileSchema } from '../../../src/adapters/http/schema/playback.js';
import { unitWorthSchema } from '../../../src/adapters/http/schema/worth.js';
import { testApp } from './httpApp.js';
import { ScriptedPlant } from './scriptedPlant.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;

async function app(options?: Parameters<typeof testApp>[0]): Promise<Built> {
  built = await testApp(options);
  return built;
}

afterEach(async () => {
  await built?.app.close();
  built = null;
});

describe('the good answers, each held against the schema that documents it', () => {
  it('gives the health with 200 while every part is well and 503 with the parts when one is not', async () => {
    const { get, plant } = await app();
    const well = await get('/api/health');
    expect(well.statusCode).toBe(200);
    expect(healthSchema.strict().parse(well.json()).ok).toBe(true);

    plant.parts[1] = { name: 'database', ok: false, detail: 'connection refused' };
    const ill = await get('/api/health');
    expect(ill.statusCode).toBe(503);
    expect(ill.json()).toMatchObject({
      ok: false,
      parts: [{ ok: true }, { name: 'database', ok: false, detail: 'connection refused' }],
    });
  });

  it('lists the units', async () => {
    const { get, plant } = await app();
    const list = unitListSchema.strict().parse((await get('/api/units')).json());
    expect(list.units).toEqual([
      {
        unit: 'north',
        name: 'North unit',
        mode: 'discharge',
        quality: 'good',
        state_of_charge: plant.moment.charged,
        time: plant.time(),
        age_s: 4,
        stale: false,
        flow_kg_s: -12.4,
        power_MW_el: -1.85,
        dispatchable: {
          time: plant.time(-2),
          power_MW: 2,
          hours: plant.moment.charged * 8 * 0.96,
          energy_MWh_el: plant.moment.charged * 8 * 0.96 * 2,
          limited_by: null,
        },
        headroom: null,
        alarms: { high: 0, medium: 0, low: 0 },
        alerts: 0,
        unacknowledged: 0,
        held_back: 0,
      },
    ]);
  });

  it('counts what is shown of a unit, and tells its firm headroom at rated power', async () => {
    const { app: server, get, plant } = await app();
    const alarm = { class: 'alarm', priority: 'high' } as const;
    plant.raise({ kind: 'outlet_near_limit', subject: 'hot', ...alarm });
    plant.raise({ kind: 'front_spread', subject: 'hot' });
    const { id } = plant.raise({ kind: 'front_spread', subject: 'cold' });
    for (const [action, held] of [
      ['acknowledge', plant.raise({ kind: 'data_stale', subject: 'north', ...alarm }).id],
      ['out-of-service', id],
    ]) {
      const payload = { id: held, who: 'night shift', why: 'seen' };
      const url = `/api/alarms/${action}`;
      expect((await server.inject({ method: 'POST', url, payload })).statusCode).toBe(200);
    }
    plant.headroom = { time: plant.time(), powers_MW: [3, 2] };
    const [unit] = unitListSchema.parse((await get('/api/units')).json()).units;
    expect(unit).toMatchObject({
      ...{ alarms: { high: 2, medium: 0, low: 0 }, alerts: 1, unacknowledged: 2, held_back: 1 },
      headroom: { time: plant.time(), power_MW: 2, hours: plant.moment.charged * 8 * 0.96 },
    });
  });

  it('gives a unit now, converted to the units of the edge', async () => {
    const { get, plant } = await app();
    const now = unitNowSchema.strict().parse((await get('/api/units/north')).json());
    const service = plant.now('north')!;
    const hot = now.definition.stores[0]!;
    expect(hot).toMatchObject({
      kind: 'hot',
      charge_inlet_at: 'top',
      length_m: 8,
      reference_hot_degC: 500,
      reference_cold_degC: 25,
      outlet_limit_degC: 430,
    });
    expect(now.definition.rated_power_MW_el).toBe(2);
    expect(now.definition.hours_at_MW_el).toEqual([1, 2]);
    // 768.4 K - 273.15 K
    expect(now.estimate!.stores.hot!.outlet_degC).toBe(495.25);
    expect(now.estimate!.stores.hot!.fronts).toEqual(service.estimate!.stores.hot!.fronts);
    const unlimited = service.dispatch!.answers.map((one) => ({ ...one, limited_by: null }));
    expect(now.dispatch!.answers).toEqual(unlimited);
  });

  it('tells what binds beside the stores, and what hours it limits', async () => {
    const [unit] = new ScriptedPlant().units;
    const span = { power_min_W: 0.5e6, power_max_W: 2.2e6, flow_min_kg_s: 1, flow_max_kg_s: 20 };
    const limits = {
      ...unit!.limits,
      ...{ charge: span, discharge: span, availability: 0.95 },
      operation: {
        ramp_W_s: { charge: 5e3, discharge: null },
        start: {
          warm: { time_s: 300, energy_J: 3.6e7 },
          cold: { time_s: 900, energy_J: 9e7 },
          cold_after_s: 36_000,
        },
        change_over_s: 480,
      },
      connection: {
        time_zone: 'UTC',
        export_max_W: 2e6,
        import_max_W: 2e6,
        // The script begins at 06:00.
        windows: [{ from_min: 420, to_min: 540, export_max_W: 1.5e6, import_max_W: 2e6 }],
      },
      outages: [
        {
          from_ms: Date.UTC(2026, 0, 31, 20),
          to_ms: Date.UTC(2026, 1, 1, 4),
          discharge_max_W: 0,
          charge_max_W: 1e6,
          reason: 'valve',
        },
      ],
    };
    const { get } = await app({ plant: new ScriptedPlant([{ ...unit!, limits }]) });
    const now = unitNowSchema.strict().parse((await get('/api/units/north')).json());
    expect(now.definition.limits).toEqual({
      charge: {
        ...{ power_min_MW_el: 0.5, power_max_MW_el: 2.2, flow_min_kg_s: 1, flow_max_kg_s: 20 },
        ramp_MW_per_min: 0.3,
      },
      discharge: {
        ...{ power_min_MW_el: 0.5, power_max_MW_el: 2.2, flow_min_kg_s: 1, flow_max_kg_s: 20 },
        ramp_MW_per_min: null,
      },
      start: {
        warm: { time_min: 5, energy_kWh_el: 10 },
        cold: { time_min: 15, energy_kWh_el: 25 },
        cold_after_h: 10,
      },
      change_over_min: 8,
      connection: {
        time_zone: 'UTC',
        now: { export_max_MW_el: 2, import_max_MW_el: 2 },
        next_change: {
          ...{ time: '2026-01-31T07:00:00.000Z', export_max_MW_el: 1.5, import_max_MW_el: 2 },
        },
      },
      outages: [
        {
          ...{ from: '2026-01-31T20:00:00.000Z', to: '2026-02-01T04:00:00.000Z' },
          ...{ discharge_max_MW_el: 0, charge_max_MW_el: 1, reason: 'valve' },
        },
      ],
      auxiliaries_running_MW_el: 0.02,
      auxiliaries_standing_MW_el: 0.005,
      availability: 0.95,
    });
    // 0.62 x 16 h at 1 MW, and less at more: the outage comes after 14 h.
    const asked = (await get('/api/units/north/hours?power_MW=0.4,1,1.8,3')).json();
    expect(asked.answers.map((one: { limited_by: string | null }) => one.limited_by)).toEqual([
      'below_least_power',
      null,
      'connection',
      'connection',
    ]);
    const head = (await get('/api/units/north/headroom?power_MW=1')).json();
    expect(head.limits).toEqual(now.definition.limits);
  });

  it('counts the age of the hours from the estimate they were computed from', async () => {
    const { get, plant } = await app();
    plant.step();
    plant.age_s = 7;
    const now = unitNowSchema.parse((await get('/api/units/north')).json());
    // The script computes hours two scans of 30 s before the newest one.
    expect(now.dispatch!.age_s).toBe(67);
  });

  it('gives a unit before its first scan with nulls instead of figures', async () => {
    const { get, plant } = await app();
    plant.started = false;
    const answer = await get('/api/units/north');
    expect(answer.statusCode).toBe(200);
    expect(unitNowSchema.parse(answer.json())).toMatchObject({
      estimate: null,
      dispatch: null,
      age_s: null,
      flow_kg_s: null,
      power_MW_el: null,
    });
  });

  it('gives the profile in degC within half a thousandth of a kelvin', async () => {
    const { get, plant } = await app();
    const profile = unitProfileSchema
      .strict()
      .parse((await get('/api/units/north/profile')).json());
    const kelvin = plant.now('north')!.profile!.stores.cold!;
    const celsius = profile.stores.cold!;
    expect(celsius.x_m).toEqual(kelvin.x_m);
    kelvin.mean_K.forEach((value, i) => {
      expect(Math.abs(celsius.mean_degC[i]! - (value - 273.15))).toBeLessThanOrEqual(0.000_501);
    });
    const open = celsius.readings.find((reading) => reading.verdict === 'open')!;
    expect(open.value_degC).toBeNull();
    expect(profile.age_s).toBe(4);
  });

  it('answers hours at the powers asked, with time and age of the estimate', async () => {
    const { get, plant } = await app();
    const answer = await get('/api/units/north/hours?power_MW=1.2,1.8');
    const hours = unitHoursSchema.strict().parse(answer.json());
    expect(hours.answers.map((one) => one.power_MW)).toEqual([1.2, 1.8]);
    expect(hours.time).toBe(plant.time());
    expect(hours.age_s).toBe(4);
    const { answers } = await plant.hours('north', [1.2, 1.8]);
    expect(hours.answers).toEqual(answers.map((one) => ({ ...one, limited_by: null })));
    const head = (await get('/api/units/north/headroom?power_MW=1')).json();
    for (const key of ['valid_until', 'quality', 'given', 'limits', 'stale']) {
      expect(head[key], key).toBeDefined();
      expect(hours[key as keyof typeof hours], key).toEqual(head[key]);
    }
  });

  it('refuses hours of a stale estimate, or marks them, valid no longer; warns once', async () => {
    const { get, plant, logged } = await app();
    plant.stale = true;
    for (let n = 0; n < 3; n++) {
      const refused = await get('/api/units/north/hours?power_MW=1');
      expect(refused.statusCode).toBe(503);
      expect(refused.json().error).toMatchObject({ code: 'estimate_stale', expected: 'mark' });
    }
    expect(logged).toHaveLength(1);
    const told = JSON.parse(logged[0]!);
    expect([told.level, told.err]).toEqual([40, undefined]);
    for (const path of ['hours', 'headroom']) {
      const marked = (await get(`/api/units/north/${path}?power_MW=1&stale=mark`)).json();
      expect(marked).toMatchObject({ stale: true, time: plant.time(), valid_until: plant.time() });
    }
  });

  it('answers what thermocouples are worth, for the hours ahead unless a day is asked for', async () => {
    const { get, plant } = await app();
    const ask = async (query: string) =>
      unitWorthSchema.strict().parse((await get(`/api/units/north/sensors${query}`)).json());
    const now = await ask('');
    expect(now).toEqual(await ask('?over=now'));
    expect(now).toEqual({ ...(await plant.sensors('north', 'now')), time: plant.time() });
    const day = await ask('?over=day');
    expect(day).toMatchObject({ time: null, over: { kind: 'day', stand_h: 11 } });
    expect(day.stores[0]!.strings[0]!.one_more).toHaveLength(1);
  });

  it('gives the history of the 24 h before the newest estimate unless asked otherwise', async () => {
    const { get, plant } = await app();
    const history = unitHistorySchema
      .strict()
      .parse((await get('/api/units/north/history?points=5')).json());
    expect(history.to).toBe(plant.time());
    expect(Date.parse(history.to) - Date.parse(history.from)).toBe(86_400_000);
    expect(history.rows).toHaveLength(5);
    expect(Object.keys(history.rows[0]!)).toEqual([
      'time',
      ...plant.historySeries().filter((name) => !/\.(min|max)$/.test(name)),
    ]);
    expect(history).toMatchObject({ thinned: false, bucket_s: null });
  });

  it('gives only the series and span asked for', async () => {
    const { get } = await app();
    const answer = await get(
      '/api/units/north/history?from=2026-01-31T02:00:00%2B01:00&to=2026-01-31T04:00:00Z&series=hours_p50_at_2_MW&points=3',
    );
    const { rows, from } = unitHistorySchema.parse(answer.json());
    expect(from).toBe('2026-01-31T01:00:00.000Z');
    expect(Object.keys(rows[0]!)).toEqual(['time', 'hours_p50_at_2_MW']);
  });

  it('gives the history as CSV by format and by Accept, with empty fields for null', async () => {
    const { get, plant } = await app();
    const url = '/api/units/north/history?series=state_of_charge&points=100';
    const byFormat = await get(`${url}&format=csv`);
    const byAccept = await get(url, { accept: 'text/csv' });
    expect(byFormat.headers['content-type']).toMatch(/^text\/csv/);
    expect(byAccept.body).toBe(byFormat.body);
    const lines = byFormat.body.split('\r\n');
    expect(lines[0]).toBe('time,state_of_charge');
    expect(lines).toHaveLength(102); // header, 100 rows, nothing after the last CRLF
    expect(lines[97]).toMatch(/Z,$/); // the script's 97th row is a gap
    const { points: rows } = plant.history(
      'north',
      Date.parse(plant.time()) - 86_400_000,
      Date.parse(plant.time()),
      100,
    );
    expect(lines[1]).toBe(`${rows[0]!.time},${rows[0]!.state_of_charge}`);
  });

  it('lists what stands and what happened, and acknowledges with a name', async () => {
    const { app: server, get, plant } = await app();
    const { id } = plant.raise({ kind: 'front_spread', subject: 'hot' });
    const alarms = alarmsSchema.strict().parse((await get('/api/alarms')).json());
    expect(alarms.standing).toMatchObject([{ id, state: 'unacknowledged', acknowledged_by: null }]);
    const events = eventsSchema.strict().parse((await get('/api/events?unit=north')).json());
    expect(events.events).toMatchObject([{ id, transition: 'raised' }]);

    const answer = await server.inject({
      method: 'POST',
      url: '/api/alarms/acknowledge',
      payload: { id, who: ' night shift ' },
    });
    expect(acknowledgedSchema.strict().parse(answer.json())).toMatchObject({
      id,
      acknowledged_by: 'night shift',
      standing: { state: 'acknowledged' },
    });
    expect(plant.acknowledged).toEqual([{ id, who: 'night shift' }]);
  });

  it('gives the counters, and as Prometheus metrics with the figures of each unit', async () => {
    const { get, plant } = await app();
    plant.raise({ kind: 'front_spread', subject: 'hot' });
    const { counters } = countersSchema.strict().parse((await get('/api/counters')).json());
    expect(counters).toMatchObject({ 'mqtt.messages': 1200, http_non_finite_numbers: 0 });
    const metrics = await get('/metrics');
    expect(metrics.headers['content-type']).toMatch(/^text\/plain/);
    for (const line of [
      '# TYPE rockhour_mqtt_late_messages_total counter',
      'rockhour_mqtt_late_messages_total{counter="mqtt.late-messages"} 3',
      'rockhour_state_of_charge_ratio{unit="north"} 0.62',
      'rockhour_part_ok{part="database"} 1',
      'rockhour_standing{unit="north",class="alert",state="unacknowledged"} 1',
    ]) {
      expect(metrics.body.split('\n')).toContain(line);
    }
  });

  it('tells of a unit and in the metrics what became of the readings in the newest scan', async () => {
    const { get, plant } = await app();
    const unit = async () => unitNowSchema.strict().parse((await get('/api/units/north')).json());
    expect((await unit()).counts).toBeNull();
    const hot = { thermocouples: 42, used: 38, rejected: 2, left_out: 1, missing: 1 };
    const implausible = [{ channel: 'hot_top', kind: 'gas_temperature' }] as const;
    const mode = { mode_disagrees: true, mode_disagreements: 3 };
    plant.counts = { stores: { hot }, surprise: { hot: 1.25 }, implausible, ...mode };
    expect((await unit()).counts).toEqual(plant.counts);
    const lines = (await get('/metrics')).body.split('\n');
    const { thermocouples: _all, ...by } = hot;
    for (const [state, count] of Object.entries(by)) {
      const labels = `unit="north",store="hot",state="${state}"`;
      expect(lines).toContain(`rockhour_thermocouples{${labels}} ${count}`);
    }
    const labels = 'unit="north",channel="hot_top",kind="gas_temperature"';
    expect(lines).toContain(`rockhour_implausible_reading{${labels}} 1`);
    expect(lines).toContain('rockhour_mode_disagrees{unit="north"} 1');
    expect(lines).toContain('rockhour_innovation_ratio{unit="north",store="hot"} 1.25');
    expect(lines).toContain('rockhour_backlog{to="influxdb"} 12');
    const heap = lines.find((line) => line.startsWith('nodejs_heap_size_used_bytes '))!;
    expect(Number(heap.split(' ')[1])).toBeGreaterThan(1e6);
  });

  it('writes a number that is not finite as null, and counts it', async () => {
    const { get, plant } = await app();
    plant.moment = { charged: Number.NaN, mode: 'stand' };
    const list = (await get('/api/units')).json();
    expect(list.units[0].state_of_charge).toBeNull();
    expect((await get('/api/counters')).json().counters.http_non_finite_numbers).toBe(3);
  });

  it('describes every route in an OpenAPI document', async () => {
    const { get } = await app();
    const document = (await get('/api/openapi.json')).json();
    expect(document.openapi).toBe('3.1.0');
    expect(Object.keys(document.paths).sort()).toEqual([
      '/api/alarms',
      '/api/alarms/acknowledge',
      '/api/alarms/figures',
      '/api/alarms/out-of-service',
      '/api/alarms/reset',
      '/api/alarms/return-to-service',
      '/api/alarms/shelve',
      '/api/alarms/transitions',
      '/api/alarms/unshelve',
      '/api/counters',
      '/api/events',
      '/api/health',
      '/api/live',
      '/api/login',
      '/api/logout',
      '/api/ready',
      '/api/stream',
      '/api/units',
      '/api/units/{unit}',
      '/api/units/{unit}/backup',
      '/api/units/{unit}/balance',
      '/api/units/{unit}/capability',
      '/api/units/{unit}/cycles',
      '/api/units/{unit}/headroom',
      '/api/units/{unit}/history',
      '/api/units/{unit}/hours',
      '/api/units/{unit}/offers',
      '/api/units/{unit}/offers/history',
      '/api/units/{unit}/offers/history/{no}',
      '/api/units/{unit}/offers/report',
      '/api/units/{unit}/profile',
      '/api/units/{unit}/profiles',
      '/api/units/{unit}/report',
      '/api/units/{unit}/rewinds',
      '/api/units/{unit}/schedule',
      '/api/units/{unit}/sensors',
      '/api/units/{unit}/watch',
      '/api/units/{unit}/watch/history',
      '/metrics',
    ]);
    const hours = document.paths['/api/units/{unit}/hours'].get;
    expect(hours.parameters.map((parameter: { name: string }) => parameter.name).sort()).toEqual([
      'power_MW',
      'stale',
      'unit',
    ]);
    expect(
      hours.responses['200'].content['application/json'].schema.properties.answers,
    ).toBeDefined();
  });
});

describe('under a path prefix', () => {
  it.each(['/plant/rock', 'plant/rock/'])(
    'serves everything below %s and nothing beside it',
    async (prefix) => {
      const { get } = await app({ prefix });
      expect((await get('/plant/rock/api/units/north')).statusCode).toBe(200);
      expect((await get('/plant/rock/metrics')).statusCode).toBe(200);
      expect((await get('/plant/rock/')).body).toContain('<title>page</title>');
      const bare = await get('/plant/rock');
      expect([bare.statusCode, bare.headers.location]).toEqual([308, '/plant/rock/']);
      expect((await get('/api/units')).statusCode).toBe(404);
      const document = (await get('/plant/rock/api/openapi.json')).json();
      expect(document.servers).toEqual([{ url: '/plant/rock' }]);
      expect(document.paths['/api/units']).toBeDefined();
    },
  );
});

describe('headers', () => {
  it('lets the page load nothing from elsewhere and run nothing inline', async () => {
    const { get } = await app();
    const page = await get('/');
    const policy = String(page.headers['content-security-policy']);
    expect(policy).toContain("default-src 'none'");
    expect(policy).toContain("script-src 'self'");
    expect(policy).not.toMatch(/unsafe|https?:|\*/);
    expect(page.headers['cache-control']).toBe('no-cache');
    expect((await get('/api/units')).headers['cache-control']).toBe('no-store');
  });
});
