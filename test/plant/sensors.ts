import type { Bed } from './bed.js';
import { groupError, type PlantDraw, type ThermocoupleDraw } from './draws.js';
import { type StoreGeometry, topEnd } from './geometry.js';
import type { RandomStream } from './random.js';

/** White noise of one reading, 1 sigma. */
export const NOISE = {
  thermocouple_K: 0.15,
  gas_K: 0.2,
  flow: 0.004,
  power: 0.002,
  ambient_K: 0.2,
  pressure: 0.001,
  pressure_drop: 0.01,
} as const;

interface Place {
  readonly id: string;
  readonly group: string | null;
  readonly draw: ThermocoupleDraw;
  /** The two cells of each of two rings that it lies between, and their weights. */
  readonly cells: readonly [number, number, number, number];
  readonly weights: readonly [number, number, number, number];
  /** Below the bed's top [m]. */
  readonly depth_m: number;
}

/** Thermocouples of one store: each sees a mixture of gas and rock, late by its thermowell. */
export class ThermocoupleArray {
  private readonly places: readonly Place[];
  /** Temperature of each junction [K]; NaN before the first step. */
  readonly junction: Float64Array;
  /** Thermocouples this close to the bed's top hang in the gas above it [m]. */
  uncovered_m = 0;

  constructor(
    store: StoreGeometry,
    bed: Bed,
    private readonly draw: PlantDraw,
    from?: ThermocoupleArray,
  ) {
    this.places = from ? from.places : placesOf(store, bed, draw);
    this.junction = from
      ? from.junction.slice()
      : new Float64Array(this.places.length).fill(Number.NaN);
    this.uncovered_m = from?.uncovered_m ?? 0;
  }

  /** @param topGas_K gas above the bed */
  follow(bed: Bed, dt_s: number, topGas_K: number): void {
    const { gas, surface } = bed;
    for (let j = 0; j < this.places.length; j++) {
      const { cells, weights, draw, depth_m } = this.places[j]!;
      let seen = 0;
      if (depth_m < this.uncovered_m) seen = topGas_K;
      else {
        for (let c = 0; c < 4; c++) {
          const k = cells[c]!;
          seen += weights[c]! * (draw.gas_share * gas[k]! + (1 - draw.gas_share) * surface[k]!);
        }
      }
      const was = this.junction[j]!;
      this.junction[j] = Number.isNaN(was)
        ? seen
        : seen + (was - seen) * Math.exp(-dt_s / draw.lag_s);
    }
  }

  read(time_s: number, noise: RandomStream, into: Record<string, number>): void {
    this.places.forEach((place, j) => {
      const T = this.junction[j]!;
      const group = place.group === null ? undefined : this.draw.groups[place.group];
      into[place.id] =
        T +
        place.draw.offset_K +
        place.draw.gain * (T - 273.15) +
        (group === undefined ? 0 : groupError(group, time_s)) +
        noise.normal(0, NOISE.thermocouple_K);
    });
  }
}

function placesOf(store: StoreGeometry, bed: Bed, draw: PlantDraw): Place[] {
  const { cells } = bed.p;
  const { rings, ringMiddle_m } = bed.c;
  return store.strings.flatMap((string) => {
    // Between the radii that halve each ring's area; nearer the axis or the wall the ring itself.
    let ring = 0;
    while (ring < rings - 2 && string.radius_m > ringMiddle_m[ring + 1]!) ring++;
    const outer = Math.min(ring + 1, rings - 1);
    const span = ringMiddle_m[outer]! - ringMiddle_m[ring]!;
    const across =
      span > 0 ? Math.min(Math.max((string.radius_m - ringMiddle_m[ring]!) / span, 0), 1) : 0;
    return string.thermocouples.map((t): Place => {
      const own = draw.thermocouples[t.id]!;
      const position_m = t.position_m + own.position_error_m;
      const x = position_m / bed.c.cellLength_m - 0.5;
      const held = Math.min(Math.max(x, 0), cells - 1);
      const cell = Math.min(Math.floor(held), cells - 2);
      const along = held - cell;
      const a = ring * cells + cell;
      const b = outer * cells + cell;
      return {
        id: t.id,
        group: t.group,
        draw: own,
        cells: [a, a + 1, b, b + 1],
        depth_m: topEnd(store) === 0 ? position_m : store.length_m - position_m,
        weights: [
          (1 - across) * (1 - along),
          (1 - across) * along,
          across * (1 - along),
          across * along,
        ],
      };
    });
  });
}
