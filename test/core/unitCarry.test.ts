import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { advance, saveUnit, startUnit, type UnitSnapshot } from '../../src/core/unit.js';
import { carryUnit } from '../../src/core/unitCarry.js';
import { shapeOf } from '../../src/core/unitShape.js';
import { startBaseline } from '../../src/core/watch/baseline.js';
import { lostToVersion } from '../../src/core/watch/carry.js';
import { INDICATOR_KINDS, type IndicatorKind } from '../../src/core/watch/indicator.js';
import { mulberry } from '../support/random.js';
import { frontedScan } from './track/fronted.js';
import { channelOf, coldStore, hotBed, hotStore, unitOf } from './track/plants.js';

const unit = unitOf();
const NONE = { hours_at_W: [], profile: false };
const PERIOD_MS = unit.scan_period_s * 1000;

/** Scans of a charge, from the n-th to before the m-th, of any unit with these stores. */
function scansOf(of: UnitDefinition, n: number, m: number) {
  const random = mulberry(5 + n);
  return Array.from({ length: m - n }, (_, i) => {
    const front = 0.2 + 0.0012 * (n + i);
    const gas = { hot_top: 733, hot_bottom: 299, cold_bottom: 144.5, cold_top: 297 };
    const others = { ...gas, flow: 0.9, mode: 1, power: 90e3, ambient: 283 };
    const noise = () => random() - 0.5;
    return frontedScan(of, (n + i) * PERIOD_MS, { hot: front, cold: front }, others, noise);
  });
}

const SAVED_AT = 240;

/** A unit that has charged for four hours, with an alert of the hot store and one of a channel. */
const saved: UnitSnapshot = (() => {
  const state = startUnit(unit);
  for (const scan of scansOf(unit, 0, SAVED_AT)) advance(unit, state, scan, NONE);
  const condition = { raised: true, pending_ms: null, last_ms: state.time_ms };
  for (const key of ['heat_transfer_low/hot', 'heat_transfer_low/cold', 'energy_lost/u'])
    state.watch.conditions[key] = { ...condition };
  state.watch.conditions['gas_temperature_off/hot_top'] = { ...condition };
  return saveUnit(state);
})();

const carried = (to: UnitDefinition, from = saved) =>
  carryUnit(to, startUnit(to), from, shapeOf(unit));

/** State of one store's heat transfer. */
const transferOf = ({ watch }: UnitSnapshot['state'], store: string) =>
  (watch.indicators as Partial<Record<IndicatorKind, Record<string, unknown>>>).heat_transfer?.[
    store
  ];

describe('the shape of a unit', () => {
  const { limits, watch, estimator } = unit;
  it.each<[string, Partial<UnitDefinition>]>([
    ['its name', { name: 'Another' }],
    ['limits and outages', { limits: { ...limits, hot_outlet_min_K: 600, outages: [] } }],
    ['watch rules', { watch: { ...watch, data_age_s: { ...watch.data_age_s, limit: 900 } } }],
    ['asked powers', { hours_at_W: [1], hours_every_s: 60 }],
    ['priors of the estimator', { estimator: { ...estimator, reading_sigma_K: 1 } }],
  ])('does not change with %s', (_, change) => {
    expect(shapeOf({ ...unit, ...change })).toEqual(shapeOf(unit));
  });

  it.each<[string, Partial<UnitDefinition>]>([
    ['the cells', { estimator: { ...estimator, cells: 31 } }],
    ['a bed', { stores: [hotStore(), coldStore({ bed: hotBed({ void_fraction: 0.35 }) })] }],
    ['a channel', { channels: unit.channels.slice(1) }],
    ['the machine', { machine: { ...unit.machine, work_factor: { charge: 1.1, discharge: 1 } } }],
    ['the scan period', { scan_period_s: 30 }],
  ])('changes with %s', (_, change) => {
    expect(shapeOf({ ...unit, ...change })).not.toEqual(shapeOf(unit));
  });
});

describe('a state under another definition', () => {
  const more = unitOf({
    roles: {},
    channels: [...unit.channels, channelOf('shell', { kind: 'auxiliary_power' })],
  });

  it('goes on whole, to the bit, where only a channel was added', () => {
    const { state, anew, lost } = carried(more);
    expect({ anew, lost }).toEqual({ anew: [], lost: [] });
    expect(state).toEqual(saved.state);
    const sound = structuredClone(saved.state);
    const two = scansOf(unit, SAVED_AT, SAVED_AT + 3).map((scan) =>
      advance(unit, sound, scan, NONE),
    );
    const own = scansOf(more, SAVED_AT, SAVED_AT + 3).map((scan) =>
      advance(more, state, scan, NONE),
    );
    expect(own.map(({ estimate }) => estimate)).toEqual(two.map(({ estimate }) => estimate));
  });

  it('loses of a changed store what was its own, and of the whole unit; the other goes on to the bit', () => {
    const to = unitOf({
      stores: [hotStore({ bed: hotBed({ void_fraction: 0.37 }) }), coldStore()],
    });
    const { state, anew, lost, fits } = carried(to);
    expect(anew).toEqual(['hot']);
    expect(lost).toEqual(
      expect.arrayContaining([
        ...['heat_transfer/hot', 'string_flow/hot/h', 'pressure_drop/hot', 'standing_loss/hot'],
        ...['energy_lost/u', 'store_mismatch/u', 'gas_inventory/u'],
      ]),
    );
    expect(lost.filter((name) => name.includes('cold'))).toEqual([]);
    expect(transferOf(saved.state, 'cold')).toMatchObject({ now: expect.anything() });
    expect(transferOf(state, 'cold')).toEqual(transferOf(saved.state, 'cold'));
    expect(transferOf(state, 'hot')).toBeUndefined();
    expect(state.stores[1]).toEqual(saved.state.stores[1]);
    expect(state.views[1]).toEqual(saved.state.views[1]);
    expect(state.stores[0]?.started).toBe(false);
    expect(state.factors).toEqual(saved.state.factors);
    // Alerts of what was lost go, the others stand.
    expect(
      Object.keys(state.watch.conditions).filter((key) => state.watch.conditions[key]?.raised),
    ).toEqual(['heat_transfer_low/cold', 'gas_temperature_off/hot_top']);
    expect(fits('heat_transfer_low/hot')).toBe(false);
    expect(fits('sensor_rejected/h_1')).toBe(true);
    expect(fits('sensor_rejected/gone')).toBe(false);
    // It takes scans, and the changed store begins from its readings.
    for (const scan of scansOf(to, SAVED_AT, SAVED_AT + 5)) advance(to, state, scan, NONE);
    expect(state.stores[0]?.started).toBe(true);
    expect(state.watch.indicators?.heat_transfer).toHaveProperty(
      'hot.follow.baseline',
      startBaseline(),
    );
  });

  it('follows stores that change places', () => {
    const to = unitOf({ stores: [coldStore(), hotStore()] });
    const { state, lost } = carried(to);
    expect(state.stores).toEqual(saved.state.stores.toReversed());
    expect(lost).toEqual(['gas_inventory/u', 'store_mismatch/u', 'energy_lost/u']);
    const drops = ({ watch }: UnitSnapshot['state']) =>
      (watch.indicators as { pressure_drop: { stores: unknown[] } }).pressure_drop.stores;
    expect(drops(state)).toEqual(drops(saved.state).toReversed());
    for (const scan of scansOf(to, SAVED_AT, SAVED_AT + 3)) advance(to, state, scan, NONE);
  });

  it('loses of another machine its factors and what is held against its model', () => {
    const machine = { ...unit.machine, work_factor: { charge: 1.05, discharge: 1 } };
    const { state, anew, lost } = carried({ ...unit, machine });
    expect(anew).toEqual([]);
    expect(lost).toEqual(['plateau/hot', 'plateau/cold', 'energy_lost/u']);
    expect(state.stores).toEqual(saved.state.stores);
    expect(saved.state.factors.charge.variance).not.toBeNull();
    expect(state.factors.charge.variance).toBeNull();
  });

  it('of another build of the indicators loses them all, by name', () => {
    const old = structuredClone(saved);
    old.state.watch.indicators_version = 0;
    expect(lostToVersion(saved.state.watch)).toEqual([]);
    const names = lostToVersion(old.state.watch);
    expect(names).toEqual([...INDICATOR_KINDS]);
    expect(carried(more, old).lost).toEqual(names);
    expect(carried(more, old).fits('heat_transfer_low/cold')).toBe(false);
  });

  it('of another shape than told, or of another version, is refused', () => {
    const { state } = saved;
    expect(() => carried(more, { version: 0, state })).toThrow(/version 0/);
    const stores = state.stores.map((store) => ({ ...store, tubes: [] }));
    expect(() => carried(more, { ...saved, state: { ...state, stores } })).toThrow(/0 strings/);
  });
});
