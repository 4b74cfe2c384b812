import { fluidByName } from '../../../src/core/bed/fluids.js';
import { type BedWork, createBedWork, stepBed } from '../../../src/core/bed/kernel.js';
import { solidByName } from '../../../src/core/bed/solids.js';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import type { EstimatorDefinition } from '../../../src/core/definitions.js';
import type { StoreModel, StoreState } from '../../../src/core/track/storeTracker.js';
import type { TubeDrive } from '../../../src/core/track/tube.js';
import { coldStore, hotBed, hotStore, modelOf, stringOf } from './plants.js';

export type Random = () => number;

const pick = <T>(random: Random, of: readonly T[]): T => of[Math.floor(random() * of.length)] as T;
const between = (random: Random, a: number, b: number): number => a + (b - a) * random();

/** A store drawn at random: rock, gas, sizes, strings, groups, and sigmas of which some are zero. */
export function randomStore(random: Random): StoreModel {
  const length_m = between(random, 1, 12);
  const area_m2 = between(random, 0.5, 40);
  const bed = hotBed({
    length_m,
    area_m2,
    diameter_m: Math.sqrt((4 * area_m2) / Math.PI),
    particle_diameter_m: between(random, 0.005, 0.06),
    void_fraction: between(random, 0.33, 0.48),
    solid: solidByName(pick(random, ['granite', 'basalt', 'magnetite'])),
    fluid: fluidByName(pick(random, ['argon', 'air', 'nitrogen'])),
    particle_shape: pick(random, ['crushed', 'sphere']),
    heat_transfer_factor: between(random, 0.2, 2),
    wall_loss_W_m2K: between(random, 0, 1),
    wall_capacity_J_m2K: pick(random, [0, 40e3]),
  });
  const count = pick(random, [1, 2, 3]);
  const shares = Array.from({ length: count }, () => between(random, 0.2, 1));
  const total = shares.reduce((a, b) => a + b, 0);
  const strings = shares.map((share, k) =>
    stringOf(`s${k}`, pick(random, [2, 5, 9]), length_m, {
      radius_m: 0.3 * k,
      area_share: share / total,
      groups: pick(random, [[null], [`card${k}`], ['one', 'two'], ['one', null]]),
    }),
  );
  const orNone = (value: number): number => (random() < 0.15 ? 0 : value);
  const estimator: Partial<EstimatorDefinition> = {
    cells: pick(random, [20, 31, 40]),
    offset_sigma_K: orNone(1),
    group_offset_sigma_K: orNone(0.5),
    position_sigma_m: orNone(0.01),
    flow_factor_sigma: orNone(0.1),
    heat_transfer_factor_sigma: orNone(0.5),
    gas_share_sigma: orNone(0.3),
    inlet_sigma_K: orNone(2),
  };
  const define = random() < 0.5 ? hotStore : coldStore;
  return modelOf(define({ bed, strings }), estimator, pick(random, [0, 0, 0.5]));
}

/** A bed that the store's thermocouples stand in: the kernel with factors of its own, one profile. */
export class Bed {
  private readonly enthalpy: Float64Array;
  private readonly work: BedWork;
  private readonly transfer: number;
  private readonly flow: number;

  constructor(
    private readonly model: StoreModel,
    private readonly random: Random,
    middle = random(),
  ) {
    const { tables, store } = model;
    const { reference_hot_K: hot, reference_cold_K: cold } = store;
    this.enthalpy = Float64Array.from({ length: 40 }, (_, i) => {
      const step = 0.5 - 0.5 * Math.tanh(((i + 0.5) / 40 - middle) / 0.1);
      return enthalpyAt(tables, cold + (hot - cold) * step);
    });
    this.work = createBedWork(40);
    this.transfer = Math.exp(between(random, -0.4, 0.4));
    this.flow = between(random, 0.93, 1.07);
  }

  step(drive: TubeDrive): void {
    stepBed(
      this.model.tables,
      this.enthalpy,
      {
        ...drive,
        massFlux_kg_m2s: drive.massFlux_kg_m2s * this.flow,
        heatTransferFactor: this.transfer,
        wallLoss_W_m3K: 0,
      },
      this.work,
    );
  }

  /** What all thermocouples read, with noise. */
  readings(): Float64Array {
    const dx = this.model.store.bed.length_m / 40;
    const temperatures = this.model.tubes.flatMap((tube) =>
      tube.string.thermocouples.map(({ position_m }) => {
        const cell = Math.min(39, Math.floor(position_m / dx));
        return temperatureAt(this.model.tables, this.enthalpy[cell] as number);
      }),
    );
    return Float64Array.from(temperatures, (t) => t + between(this.random, -0.8, 0.8));
  }
}

/** Conditions of a while: flow of either sign or none, inlet within the references, odd step lengths. */
export function randomDrive(model: StoreModel, random: Random): TubeDrive {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const flux = pick(random, [0, 1, -1, 1, -1]) * between(random, 0.001, 0.8);
  const charged = model.store.kind === 'hot' ? hot : cold;
  const discharged = model.store.kind === 'hot' ? cold : hot;
  return {
    massFlux_kg_m2s: flux,
    inlet_K: (flux > 0 ? charged : discharged) + between(random, -20, 20),
    inletSigma_K: pick(random, [0, 0, 15]),
    ambient_K: between(random, 250, 310),
    dt_s: pick(random, [5, 30, 60, 60, 300]),
    travelSigma_m: pick(random, [0, 0, 0, 0.05]),
  };
}

/**
 * What must hold of a store's state after every scan, as the first thing that does not: nothing but
 * finite numbers, covariances symmetric to the bit, no variance below zero. null = all holds.
 */
export function faultOf(model: StoreModel, state: StoreState): string | null {
  for (const [k, tube] of state.tubes.entries()) {
    const { size } = model.tubes[k]?.layout ?? { size: 0 };
    const { covariance: p } = tube;
    for (const name of ['enthalpy', 'further', 'covariance', 'gasLag_m'] as const) {
      const at = tube[name].findIndex((v) => !Number.isFinite(v));
      if (at >= 0) return `tube ${k}: ${name}[${at}] is ${tube[name][at]}`;
    }
    if (!Number.isFinite(tube.surprise)) return `tube ${k}: surprise is ${tube.surprise}`;
    for (let i = 0; i < size; i++) {
      if ((p[i * size + i] as number) < 0) return `tube ${k}: variance ${i} is ${p[i * size + i]}`;
      for (let j = 0; j < i; j++) {
        if (p[i * size + j] !== p[j * size + i]) return `tube ${k}: asymmetric at ${i}, ${j}`;
      }
    }
  }
  const wall =
    state.wall === null
      ? []
      : [...state.wall.enthalpy.flatMap((l) => [...l]), ...state.wall.steel_K];
  if (wall.some((v) => !Number.isFinite(v))) return 'wall: not finite';
  return null;
}
