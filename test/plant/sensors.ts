import type { Bed } from './bed.js';
import { groupError, type PlantDraw, type ThermocoupleDraw } from './draws.js';
import type { StoreGeometry } from './geometry.js';
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
}

/** Thermocouples of one store: each sees a mixture of gas and rock, late by its thermowell. */
export class ThermocoupleArray {
  private readonly places: readonly Place[];
  /** Temperature of each junction [K]; NaN before the first step. */
  readonly junction: Float64Array;

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
  }

  follow(bed: Bed, dt_s: number): void {
    const { gas, surface } = bed;
    for (let j = 0; j < this.places.length; j++) {
      const { cells, weights, draw } = this.places[j]!;
      let seen = 0;
      for (let c = 0; c < 4; c++) {
        const k = cells[c]!;
        seen += weights[c]! * (draw.gas_share * gas[k]! + (1 - draw.gas_share) * surface[k]!);
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
  const { rings, cells } = bed.p;
  const radius = store.diameter_m / 2;
  return store.strings.flatMap((string) => {
    // Ring with the centroid radius sqrt((r+1/2)/R) R0: position among the rings, straight between them.
    const at = (string.radius_m / radius) ** 2 * rings - 0.5;
    const [ring, across] = between(at, rings);
    return string.thermocouples.map((t): Place => {
      const own = draw.thermocouples[t.id]!;
      const x = (t.position_m + own.position_error_m) / bed.cellLength_m - 0.5;
      const [cell, along] = between(x, cells);
      const inner = ring * cells + cell;
      const outer = (rings > 1 ? inner + cells : inner) | 0;
      const next = cells > 1 ? 1 : 0;
      return {
        id: t.id,
        group: t.group,
        draw: own,
        cells: [inner, inner + next, outer, outer + next],
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

/** Lower neighbour and share of the upper one for a fractional index, held within the ends. */
function between(index: number, count: number): [number, number] {
  const held = Math.min(Math.max(index, 0), count - 1);
  const low = Math.min(Math.floor(held), Math.max(count - 2, 0));
  return [low, held - low];
}
