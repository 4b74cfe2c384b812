import type { Direction } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';
import { STORE_PARAMETERS, type StoreFit } from './fitTypes.js';
import { inverse, solve } from './linear.js';
import type { MachineWork } from './machineWork.js';
import { NUISANCE, type TunePriors } from './priors.js';

/** What a unit's recording tells together: values and their covariance. */
export interface Combined {
  /** ln(true/metered flow), ln work per true kilogram over the model's while charging, discharging, then per store: */
  readonly values: Float64Array;
  readonly covariance: Float64Array;
  readonly size: number;
}

/** Places: of the unit's own, and of a store's within its block of five. */
export const UNIT = { meter: 0, charge: 1, discharge: 2, size: 3 } as const;
export const STORE = {
  transfer: 0,
  conductivity: 1,
  loss: 2,
  share: 3,
  capacity: 4,
  size: 5,
} as const;
/** First place of store s in the combined values. */
export const placeOfStore = (s: number): number => UNIT.size + s * STORE.size;

/** ln hv by ln G, and hv/C [1/s], of a store's bed at the mean flow: means over its front. */
export interface BedLaws {
  readonly exponent: number;
  readonly perSecond: number;
}

const FRONT_POINTS = 9;

/** @param flow_kg_s mean of |flow| while flowing */
export function bedLaws(store: StoreModel, flow_kg_s: number): BedLaws {
  const { tables } = store;
  const { bed, reference_cold_K: low, reference_hot_K: high } = store.store;
  const flux06 = (flow_kg_s / bed.area_m2) ** 0.6;
  let exponent = 0;
  let perSecond = 0;
  for (let i = 0; i < FRONT_POINTS; i++) {
    const T = low + ((i + 0.5) * (high - low)) / FRONT_POINTS;
    let s = 0;
    while (s < tables.segments - 1 && (tables.temperature_K[s + 1] as number) < T) s++;
    const flowing = (tables.filmFlow[s] as number) * flux06;
    const film = (tables.filmStill[s] as number) + flowing;
    const inside = 1 + film * (tables.particleResistance[s] as number);
    const hv = (tables.surface_m2_m3 * bed.heat_transfer_factor * film) / inside;
    exponent += (0.6 * flowing) / film / inside / FRONT_POINTS;
    perSecond += hv / (tables.heatCapacity[s] as number) / FRONT_POINTS;
  }
  return { exponent, perSecond };
}

/** Area share for which each string's flow stands, and what its sampling leaves open in the mean. */
function meanFlow(store: StoreModel): { weights: number[]; sigma: number } {
  const weights = store.store.strings.map((string) => string.area_share);
  const squares = weights.reduce((sum, w) => sum + w * w, 0);
  return { weights, sigma: NUISANCE.stringFlow * Math.sqrt(squares) };
}

/**
 * Puts the stores' fits, the machine's and the priors of what is common together.
 *
 * A store is fitted at the configured heat capacity. Were it c times that (ln, as all here), the same
 * readings would come from flow, conductivity and losses c times as large, and from a transfer that
 * grows by 1 - n, n = d ln hv/d ln G. So a fit tells (phi - (1 - n) c, k - c, loss - c, M - c) and not
 * c: the front's way per metered kilogram is M - c, M = ln(true/metered flow). Power tells M + kappa,
 * kappa the machine's own factor. Only the priors of M, c and kappa part them.
 *
 * The gas share is given net of the thermowells' lag: g - tau hv/C.
 */
export function combine(
  stores: readonly StoreModel[],
  fits: readonly StoreFit[],
  laws: readonly BedLaws[],
  work: Readonly<Record<Direction, MachineWork | null>>,
  priors: TunePriors,
): Combined {
  const size = placeOfStore(stores.length);
  const information = new Float64Array(size * size);
  const right = new Float64Array(size);
  const observe = (rows: readonly Row[], y: Float64Array, covariance: Float64Array) => {
    addObservation(information, right, size, rows, y, covariance);
  };
  const alone = (row: Row, value: number, sigma: number) => {
    observe([row], Float64Array.of(value), Float64Array.of(Math.max(1e-6, sigma) ** 2));
  };
  alone([[UNIT.meter, 1]], 0, priors.meter);
  alone([[UNIT.charge, 1]], 0, priors.machine);
  alone([[UNIT.discharge, 1]], 0, priors.machine);
  for (const direction of ['charge', 'discharge'] as const) {
    const one = work[direction];
    if (one !== null)
      alone(
        [
          [UNIT.meter, 1],
          [UNIT[direction], 1],
        ],
        one.log,
        one.sigma,
      );
  }
  stores.forEach((store, s) => {
    const at = placeOfStore(s);
    const { exponent } = laws[s] as BedLaws;
    alone([[at + STORE.capacity, 1]], 0, priors.capacity);
    const told = storeTells(store, fits[s] as StoreFit, laws[s] as BedLaws);
    const less = (place: number, by: number): Row => [
      [at + place, 1],
      [at + STORE.capacity, -by],
    ];
    const rows: Row[] = [
      less(STORE.transfer, 1 - exponent),
      less(STORE.conductivity, 1),
      less(STORE.loss, 1),
      [[at + STORE.share, 1]],
      [
        [UNIT.meter, 1],
        [at + STORE.capacity, -1],
      ],
    ];
    observe(rows, told.values, told.covariance);
  });
  return {
    values: solve(information, size, right),
    covariance: inverse(information, size),
    size,
  };
}

type Row = readonly (readonly [place: number, factor: number])[];

/** Adds y = A u with its covariance, A sparse, to normal equations. */
function addObservation(
  information: Float64Array,
  right: Float64Array,
  size: number,
  rows: readonly Row[],
  y: Float64Array,
  covariance: Float64Array,
): void {
  const n = rows.length;
  const W = inverse(covariance, n);
  rows.forEach((a, i) => {
    rows.forEach((b, j) => {
      const w = W[i * n + j] as number;
      for (const [p, f] of a) {
        right[p] = (right[p] as number) + f * w * (y[j] as number);
        for (const [q, g] of b) {
          information[p * size + q] = (information[p * size + q] as number) + f * w * g;
        }
      }
    });
  });
}

/** (transfer, conductivity, loss, net share, way per metered kilogram) of one fit. */
export function storeTells(
  store: StoreModel,
  fit: StoreFit,
  laws: BedLaws,
): { values: Float64Array; covariance: Float64Array } {
  const place = (name: (typeof STORE_PARAMETERS)[number]) => STORE_PARAMETERS.indexOf(name);
  const { weights, sigma } = meanFlow(store);
  const transfer = fit.values[place('transfer')] as number;
  const net = -laws.perSecond * Math.exp(transfer);
  const lag_s = fit.values[place('lag_s')] as number;
  const rows: Row[] = [
    [[place('transfer'), 1]],
    [[place('conductivity'), 1]],
    [[place('loss'), 1]],
    // d(g - tau hv/C): hv moves with its factor.
    [
      [place('share'), 1],
      [place('lag_s'), net],
      [place('transfer'), net * lag_s],
    ],
    weights.map((w, k) => [STORE_PARAMETERS.length + k, w] as const),
  ];
  const values = Float64Array.from(rows, (row) =>
    row.reduce((sum, [p, f]) => sum + f * (fit.values[p] as number), 0),
  );
  // The third term is a derivative alone.
  values[3] = (fit.values[place('share')] as number) + net * lag_s;
  const n = rows.length;
  const covariance = new Float64Array(n * n);
  rows.forEach((a, i) => {
    rows.forEach((b, j) => {
      for (const [p, f] of a) {
        for (const [q, g] of b) {
          covariance[i * n + j] =
            (covariance[i * n + j] as number) +
            f * g * (fit.covariance[p * fit.size + q] as number);
        }
      }
    });
  });
  const add = (i: number, s: number) => {
    covariance[i * n + i] = (covariance[i * n + i] as number) + s * s;
  };
  add(2, NUISANCE.lossModel);
  add(4, sigma);
  return { values, covariance };
}
