import type {
  Direction,
  Solid,
  StoreDefinition,
  StoreEnd,
  UnitDefinition,
} from '../../src/core/definitions.js';

/** Points along a bed between which heat is summed; the lines themselves stay exact. */
const POINTS = 300;
/** Least discharge from which a heat rate is taken, as time at rated power [s]. */
const LEARN_S = 1800;
/** A reading this far beyond the reference temperatures is no temperature of the bed [K]. */
const BEYOND_K = 80;
/** Above this share of the greatest flow the unit runs. */
const RUNNING_SHARE = 0.02;

interface Store {
  readonly definition: StoreDefinition;
  readonly strings: readonly {
    readonly share: number;
    readonly channels: readonly number[];
    readonly positions_m: readonly number[];
  }[];
  readonly gas: Readonly<Record<StoreEnd, number>>;
  /** Specific enthalpy of the rock over temperature, every kelvin from `tableFrom_K` [J/kg]. */
  readonly enthalpy: Float64Array;
  readonly tableFrom_K: number;
  readonly full_J: number;
  soc: number;
  /** Heat given since the present discharge began [J], and per joule of electricity, once learned. */
  dischargeFrom: number;
  learned: number | null;
}

/**
 * What a plant man reckons without a model of the bed: straight lines between the thermocouples of a
 * string, on to the gas at both ends while it flows, without readings that no bed can have; heat by the table of the rock; hours as heat over
 * heat rate. The rate at a power is what the last discharge took of heat per unit of electricity, and
 * before the first that of the plant's rating: a full store lasts the rated hours at rated power.
 */
export class StraightLines {
  private readonly stores: Store[];
  private readonly flow: number;
  private readonly power: number;
  private readonly running_kg_s: number;
  /** Electricity of the present discharge [J]. */
  private sold_J = 0;
  private mode: Direction | 'stand' = 'stand';

  constructor(private readonly unit: UnitDefinition) {
    const index = new Map(unit.channels.map((c, i) => [c.id, i]));
    const find = (kind: string) => unit.channels.findIndex((c) => c.role.kind === kind);
    this.flow = find('flow');
    this.power = find('power');
    this.running_kg_s = RUNNING_SHARE * unit.limits.discharge.flow_max_kg_s;
    this.stores = unit.stores.map((definition): Store => {
      const gas = (end: StoreEnd) =>
        unit.channels.findIndex(
          (c) =>
            c.role.kind === 'gas_temperature' &&
            c.role.store === definition.id &&
            c.role.end === end,
        );
      const { solid, void_fraction, area_m2, length_m } = definition.bed;
      const { reference_hot_K, reference_cold_K } = definition;
      const swing = solid.enthalpy(reference_hot_K) - solid.enthalpy(reference_cold_K);
      const tableFrom_K = Math.floor(reference_cold_K) - 100;
      const count = Math.ceil(reference_hot_K) + 200 - tableFrom_K;
      return {
        definition,
        strings: definition.strings.map((s) => ({
          share: s.area_share,
          channels: s.thermocouples.map((t) => index.get(t.id)!),
          positions_m: s.thermocouples.map((t) => t.position_m),
        })),
        gas: { charge_inlet: gas('charge_inlet'), discharge_inlet: gas('discharge_inlet') },
        enthalpy: tableOf(solid, tableFrom_K, count),
        tableFrom_K,
        full_J: (1 - void_fraction) * solid.density_kg_m3 * area_m2 * length_m * swing,
        soc: Number.NaN,
        dischargeFrom: Number.NaN,
        learned: null,
      };
    });
  }

  /** State of charge of a store by the last scan; NaN before the first with readings. */
  soc(id: string): number {
    return this.stores.find((s) => s.definition.id === id)!.soc;
  }

  /** Takes one scan of the unit's channels, `dt_s` after the last. */
  take(values: Float64Array, dt_s: number): void {
    const flow = values[this.flow]!;
    const mode = Math.abs(flow) < this.running_kg_s ? 'stand' : flow > 0 ? 'charge' : 'discharge';
    for (const store of this.stores) {
      const soc = this.sum(store, values, mode !== 'stand' && Number.isFinite(flow));
      if (Number.isFinite(soc)) store.soc = soc;
    }
    if (!Number.isFinite(flow)) return;
    if (mode === 'discharge') {
      if (this.mode !== 'discharge') {
        this.sold_J = 0;
        for (const store of this.stores) store.dischargeFrom = store.soc;
      } else if (Number.isFinite(values[this.power]!)) {
        this.sold_J += Math.abs(values[this.power]!) * dt_s;
      }
      if (this.sold_J > LEARN_S * this.unit.rated_power_W) {
        for (const store of this.stores) {
          store.learned = ((store.dischargeFrom - store.soc) * store.full_J) / this.sold_J;
        }
      }
    }
    this.mode = mode;
  }

  /** Heat over heat rate, of the store that is empty first [h]. */
  hours(power_W: number): number {
    return Math.min(
      ...this.stores.map((store) => {
        const perJoule = store.learned ?? this.nominal(store);
        return Math.max(0, (store.soc * store.full_J) / (perJoule * power_W)) / 3600;
      }),
    );
  }

  /** Heat per electricity by the rating. */
  private nominal(store: Store): number {
    return store.full_J / (this.unit.rated_power_W * this.unit.rated_hours * 3600);
  }

  /** Share of the heat between the references that straight lines hold; NaN without any reading. */
  private sum(store: Store, values: Float64Array, flowing: boolean): number {
    const { length_m } = store.definition.bed;
    const { reference_hot_K, reference_cold_K } = store.definition;
    const possible = (T: number) =>
      T > reference_cold_K - BEYOND_K && T < reference_hot_K + BEYOND_K;
    const ends = (['charge_inlet', 'discharge_inlet'] as const).map((end) => {
      const read = flowing && store.gas[end] >= 0 ? values[store.gas[end]]! : Number.NaN;
      return { x: end === 'charge_inlet' ? 0 : length_m, T: read };
    });
    let total = 0;
    let shares = 0;
    for (const string of store.strings) {
      const inside = string.channels.map((c, i) => ({ x: string.positions_m[i]!, T: values[c]! }));
      const points = [ends[0]!, ...inside, ends[1]!].filter((p) => possible(p.T));
      if (!inside.some((p) => possible(p.T))) continue;
      total += string.share * this.charged(store, points);
      shares += string.share;
    }
    return total / shares;
  }

  private charged(store: Store, points: readonly { x: number; T: number }[]): number {
    const { kind, reference_hot_K, reference_cold_K, bed } = store.definition;
    const [empty, full] =
      kind === 'hot' ? [reference_cold_K, reference_hot_K] : [reference_hot_K, reference_cold_K];
    const zero = enthalpyAt(store, empty);
    const span = enthalpyAt(store, full) - zero;
    let sum = 0;
    let right = 0;
    for (let i = 0; i < POINTS; i++) {
      const x = ((i + 0.5) * bed.length_m) / POINTS;
      while (right < points.length && points[right]!.x < x) right++;
      const b = points[Math.min(right, points.length - 1)]!;
      const a = points[Math.max(right - 1, 0)]!;
      const T = a === b || b.x === a.x ? b.T : a.T + ((x - a.x) / (b.x - a.x)) * (b.T - a.T);
      sum += enthalpyAt(store, T) - zero;
    }
    return sum / POINTS / span;
  }
}

function tableOf(solid: Solid, from_K: number, count: number): Float64Array {
  return Float64Array.from({ length: count }, (_, i) => solid.enthalpy(from_K + i));
}

function enthalpyAt(store: Store, T: number): number {
  const at = Math.min(Math.max(T - store.tableFrom_K, 0), store.enthalpy.length - 2);
  const i = Math.floor(at);
  const a = store.enthalpy[i]!;
  return a + (at - i) * (store.enthalpy[i + 1]! - a);
}
