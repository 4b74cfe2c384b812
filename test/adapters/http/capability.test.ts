import { afterEach, describe, expect, it } from 'vitest';
import { balanceSchema } from '../../../src/adapters/http/schema/balance.js';
import { capabilitySchema } from '../../../src/adapters/http/schema/capability.js';
import { answerPlan, type PlanQuestion } from '../../../src/core/plan/ask.js';
import type { UnitState } from '../../../src/core/unit.js';
import { watchedUnit } from '../../core/dispatch/fullUnit.js';
import { engineUnit } from '../../core/plan/units.js';
import { unitOf } from '../../core/track/plants.js';
import { testApp } from './httpApp.js';
import { ScriptedPlant } from './scriptedPlant.js';

const two = { ...unitOf(), id: 'two' };
const one = { ...engineUnit(), id: 'one' };
const FRONTS = { hot: 0.55, cold: 0.5 };
const states = new Map<string, UnitState>([
  ['two', watchedUnit(two, FRONTS)],
  ['one', watchedUnit(one, FRONTS)],
]);
const open: { close(): Promise<void> }[] = [];
afterEach(async () => {
  while (open.length > 0) await open.pop()?.close();
});

/** A scripted plant of a unit with two stores and one with one, whose plans the core answers. */
async function app() {
  const plant = new ScriptedPlant([two, one]);
  const asked: PlanQuestion[] = [];
  const plan = async (id: string, question: PlanQuestion) => {
    asked.push(question);
    const unit = id === 'two' ? two : one;
    const answer = answerPlan(unit, states.get(id) as UnitState, question);
    return { time: plant.time(), answer };
  };
  const made = await testApp({ plant: Object.assign(plant, { plan }) });
  open.push(made.app);
  return { ...made, asked };
}

describe('GET /api/units/{unit}/capability', () => {
  it('answers with curves of both directions, and with the head of what lies ahead', async () => {
    const { get, plant } = await app();
    const answer = capabilitySchema.strict().parse((await get('/api/units/two/capability')).json());
    expect(answer).toMatchObject({ unit: 'two', time: plant.time(), stale: false, age_s: 4 });
    expect(Date.parse(answer.valid_until)).toBeGreaterThan(Date.parse(answer.time));
    expect(answer.discharge.points[0]?.state_of_charge).toBe(0);
    expect(Object.keys(answer.charge.points[0]?.stored_MWh_th ?? {})).toEqual(['hot', 'cold']);
    expect(answer.cycle?.round_trip).toBeGreaterThan(0.3);
  });

  it('gives the points as CSV by format and by Accept', async () => {
    const { get } = await app();
    const url = '/api/units/one/capability';
    const byFormat = await get(`${url}?format=csv`);
    const byAccept = await get(url, { accept: 'text/csv' });
    expect(byFormat.headers['content-type']).toMatch(/^text\/csv/);
    expect(byAccept.body).toBe(byFormat.body);
    const lines = byFormat.body.trimEnd().split('\r\n');
    expect(lines[0]).toBe(
      'unit,time,age_s,valid_until,stale,quality,direction,state_of_charge,power_MW_el,limited_by,energy_MWh_el,hot_stored_MWh_th,largest_error_MW_el',
    );
    const { discharge, charge } = capabilitySchema.parse((await get(url)).json());
    expect(lines).toHaveLength(1 + discharge.points.length + charge.points.length);
    const [first] = discharge.points;
    const head = (await get(url)).json();
    expect(lines[1]?.split(',').slice(0, 9)).toEqual([
      ...['one', head.time, '4', head.valid_until, 'false', head.quality],
      'discharge',
      String(first?.state_of_charge),
      String(first?.power_MW_el),
    ]);
  });

  it('asks with the tolerance given, and refuses one that is none', async () => {
    const { get, asked } = await app();
    expect((await get('/api/units/one/capability?tolerance=0.05')).statusCode).toBe(200);
    expect(asked).toEqual([{ kind: 'capability', ask: { tolerance: 0.05 } }]);
    const wrong = (await get('/api/units/one/capability?tolerance=0.5')).json();
    expect(wrong.error).toMatchObject({
      field: 'tolerance',
      value: '0.5',
      expected: 'a share of rated power from 0.0005 to 0.2, as in 0.01',
    });
    expect((await get('/api/units/one/capability?curve=x')).statusCode).toBe(400);
    expect((await get('/api/units/three/capability')).statusCode).toBe(404);
  });

  it('refuses a stale estimate, or marks it where that is asked', async () => {
    const { get, plant } = await app();
    plant.stale = true;
    const refused = await get('/api/units/one/capability');
    expect(refused.statusCode).toBe(503);
    expect(refused.json().error).toMatchObject({ code: 'estimate_stale', expected: 'mark' });
    const marked = await get('/api/units/one/capability?stale=mark');
    expect(marked.statusCode).toBe(200);
    expect(marked.json()).toMatchObject({ stale: true });
  });
});

describe('GET /api/units/{unit}/balance', () => {
  it('answers with flush and mismatch of two stores, money where there are prices', async () => {
    const { get, asked } = await app();
    const query = 'power_MW=0.05&charge_MWh_el=0.3&price_per_MWh_el=100';
    const url = `/api/units/two/balance?${query}&charging_price_per_MWh_el=-20.5`;
    const answer = balanceSchema.strict().parse((await get(url)).json());
    expect(asked).toEqual([
      {
        kind: 'balance',
        ask: {
          power_W: 0.05e6,
          charge_J: 0.3 * 3.6e9,
          prices: { price_per_MWh_el: 100, charging_price_per_MWh_el: -20.5 },
        },
      },
    ]);
    expect(answer.usual).toMatchObject({ charge_from: 'asked', discharging_MW_el: 0.05 });
    expect(answer.flush.ways.map(({ money }) => money === null)).toEqual([false, false]);
    expect(Object.keys(answer.mismatch?.alone ?? {})).toEqual(['hot', 'cold']);
    expect(answer.mismatch_reason).toBeNull();
  });

  it('says of one store that there is no mismatch', async () => {
    const { get } = await app();
    const answer = balanceSchema.strict().parse((await get('/api/units/one/balance')).json());
    expect(answer.mismatch).toBeNull();
    expect(answer.mismatch_reason).toBe('no mismatch: one store');
    expect(answer.flush.ways[0]?.money).toBeNull();
  });

  it.each([
    ['power_MW=0.2', 'power_MW', '0.015 to 0.09 MW, as the unit discharges'],
    ['power_MW=-1', 'power_MW', 'a power in MW above 0, of the discharge'],
    ['charge_MWh_el=0', 'charge_MWh_el', 'MWh_el above 0 that a usual charge takes'],
    ['price_per_MWh_el=dear', 'price_per_MWh_el', 'a price of energy given, 0 or more'],
    ['charging_price_per_MWh_el=3', 'charging_price_per_MWh_el', 'price_per_MWh_el beside it'],
    [
      'price_per_MWh_el=3&charging_price_per_MWh_el=1e3',
      'charging_price_per_MWh_el',
      'a price of energy taken, of any sign',
    ],
    ['price_per_MWh_el=-3', 'price_per_MWh_el', 'a price of energy given, 0 or more'],
  ])('refuses %s with what would be right', async (query, field, expected) => {
    const { get, asked } = await app();
    const answer = await get(`/api/units/two/balance?${query}`);
    expect(answer.statusCode).toBe(400);
    expect(answer.json().error).toMatchObject({ field, expected });
    expect(asked).toEqual([]);
  });

  it('says why a unit that cannot charge has no answer', async () => {
    const { get, plant } = await app();
    const connection = { time_zone: 'UTC', import_max_W: 0, export_max_W: 1e6, windows: [] };
    plant.units[0] = { ...two, limits: { ...two.limits, connection } };
    const answer = await get('/api/units/two/balance');
    expect(answer.statusCode).toBe(503);
    expect(answer.json().error.message).toBe(
      'unit two cannot charge: its connection takes in 0 MW_el at most',
    );
  });
});
