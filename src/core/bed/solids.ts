import type { Solid } from '../definitions.js';
import { type BelowRange, solidFromPolynomial, solidFromTable } from './solidsBuild.js';
import { MAGNETITE_HEAT_CAPACITY, MAGNETITE_TEMPERATURES_K } from './solidsMagnetite.js';

export {
  type BelowRange,
  type PolynomialFacts,
  type SolidFacts,
  solidFromPolynomial,
  solidFromTable,
  type TableFacts,
} from './solidsBuild.js';

/**
 * Density, conductivity and emissivity of a fresh, dry piece. Unlike the heat capacities they are
 * common practice without a source, except where a comment names one: a plant that has measured
 * its rock gives its own.
 */
const COMMON = 'density, conductivity and emissivity: common practice, no source';
const USGS = 'Robertson & Hemingway, USGS OFR 95-622';
/** Emissivity of most rough, oxidised mineral surfaces in the thermal infrared, common practice. */
const ROUGH_ROCK = 0.85;

interface MineralFacts {
  readonly source: string;
  /** a1 + a2 T + a3/T^2 + a4/sqrt(T) + a5 T^2 in J/molK, with the molar mass M in g/mol. */
  readonly a: readonly [number, number, number, number, number];
  readonly M: number;
  readonly high_K: number;
  readonly density: number;
  readonly conductivity: number | ((temperature_K: number) => number);
  readonly shape: 'silicate' | 'close_packed_oxide';
}

function mineral(name: string, f: MineralFacts): Solid {
  const [a1, a2, a3, a4, a5] = f.a;
  const perKg = 1000 / f.M;
  return solidFromPolynomial({
    name,
    source: `${f.source}; ${COMMON}`,
    range_K: [298.15, f.high_K],
    coefficients: [a1 * perKg, a2 * perKg, a5 * perKg],
    inverse_square: a3 * perKg,
    inverse_root: a4 * perKg,
    density_kg_m3: f.density,
    conductivity_W_mK: f.conductivity,
    emissivity: ROUGH_ROCK,
    below: f.shape,
  });
}

interface RockFacts {
  readonly source: string;
  /** 1000 (a1 + a2 1e-4 T + a3 1e4/T^2 + a4/sqrt(T)) in J/kgK. */
  readonly a: readonly [number, number, number, number];
  readonly high_K: number;
  readonly density: number;
  readonly conductivity: number;
  /** Default `silicate`. */
  readonly below?: BelowRange;
}

function rock(name: string, f: RockFacts): Solid {
  const [a1, a2, a3, a4] = f.a;
  return solidFromPolynomial({
    name,
    source: `${f.source}; ${COMMON}`,
    range_K: [298.15, f.high_K],
    coefficients: [1e3 * a1, 0.1 * a2],
    inverse_square: 1e7 * a3,
    inverse_root: 1e3 * a4,
    density_kg_m3: f.density,
    conductivity_W_mK: f.conductivity,
    emissivity: ROUGH_ROCK,
    below: f.below ?? 'silicate',
  });
}

/** k(T) = k_298 * 298.15/T: heat in a crystal is carried by phonons that scatter on each other. */
const crystal = (at298: number) => (temperature_K: number) => (at298 * 298.15) / temperature_K;

const QUARTZ = {
  source: `${USGS} and Bull. 2131 (a2 is 1.828e-2; a public copy with 1.828e-3 is wrong)`,
  a: [81.45, 0.01828, -181000, -698.5, 5.406e-6],
  M: 60.084,
  high_K: 844,
  shape: 'silicate',
} as const;

const SOLIDS: readonly Solid[] = [
  rock('granite', {
    source: `Westerly granite, ${USGS}`,
    a: [2.29354, -1.9986, 2.0526, -29.3049],
    high_K: 1000,
    density: 2640,
    conductivity: 2.5,
  }),
  rock('granite_rockville', {
    source: `Rockville granite, ${USGS}`,
    a: [2.43251, -4.286, -0.22667, -26.7659],
    high_K: 844,
    density: 2650,
    conductivity: 2.5,
  }),
  rock('basalt', {
    source: USGS,
    a: [1.65291, -0.9541, -0.89296, -13.5666],
    high_K: 1000,
    density: 2900,
    conductivity: 2,
    below: 'mafic_rock',
  }),
  solidFromPolynomial({
    name: 'basalt_nahhas',
    source: 'Nahhas et al. 2019, with density and conductivity; emissivity: common practice',
    range_K: [293, 973],
    coefficients: [989, 0.0658],
    inverse_square: -2.74e7,
    density_kg_m3: 2960,
    conductivity_W_mK: (temperature_K) => 1 / (0.4 - 2.68e-5 * Math.min(temperature_K, 973)),
    emissivity: ROUGH_ROCK,
    below: 'mafic_rock',
  }),
  rock('andesite', {
    source: USGS,
    a: [1.61648, -0.47131, -0.68382, -13.546],
    high_K: 1000,
    density: 2650,
    conductivity: 2,
  }),
  rock('peridotite', {
    source: USGS,
    a: [3.99066, -9.9989, 4.54157, -57.6564],
    high_K: 650,
    density: 3200,
    conductivity: 3,
  }),
  solidFromPolynomial({
    name: 'alpine_rock',
    source: `mixed Swiss alpine rocks, Zanganeh et al., Solar Energy 86 (2012) 3084; ${COMMON}`,
    range_K: [293, 923],
    zero_K: 273.15,
    coefficients: [747.0995, 0.5676],
    density_kg_m3: 2680,
    conductivity_W_mK: 2.5,
    emissivity: ROUGH_ROCK,
    below: 'silicate',
  }),
  mineral('quartz', { ...QUARTZ, density: 2648, conductivity: crystal(7.7) }),
  // Quartzite is nearly pure quartz; density of the tank of Pacheco et al. 2002.
  mineral('quartzite', { ...QUARTZ, density: 2640, conductivity: crystal(5.5) }),
  mineral('corundum', {
    source: USGS,
    a: [161.2, -0.001353, -1815000, -1059, 5.38e-7],
    M: 101.961,
    high_K: 2250,
    density: 3980,
    conductivity: crystal(30),
    shape: 'close_packed_oxide',
  }),
  mineral('hematite', {
    source: USGS,
    a: [837.8, -0.6656, 4989000, -10750, 0.0003487],
    M: 159.692,
    high_K: 950,
    density: 5260,
    conductivity: crystal(11),
    shape: 'close_packed_oxide',
  }),
  mineral('periclase', {
    source: USGS,
    a: [66.53, -0.006143, -609300, -359.2, 2.451e-6],
    M: 40.304,
    high_K: 2500,
    density: 3580,
    conductivity: crystal(45),
    shape: 'close_packed_oxide',
  }),
  solidFromTable({
    name: 'magnetite',
    source:
      'property table of the open NREL solar-PTES model, with density 5175 kg/m3 and k 5 W/mK; the Verwey ' +
      'transition (120 K) and the Curie peak (850 K) are not in it; emissivity: common practice',
    temperatures_K: MAGNETITE_TEMPERATURES_K,
    heatCapacities_J_kgK: MAGNETITE_HEAT_CAPACITY,
    density_kg_m3: 5175,
    conductivity_W_mK: 5,
    emissivity: ROUGH_ROCK,
  }),
  solidFromPolynomial({
    name: 'magnetite_nist',
    source:
      'Shomate equation of NIST SRD 69 / Chase 1998; density 5175 kg/m3 and k 5 W/mK of the NREL table; ' +
      'emissivity: common practice',
    range_K: [298.15, 900],
    coefficients: [104.2096, 178.5108e-3, 10.6151e-6, 1.132534e-9].map((c) => c / 0.231533),
    inverse_square: -0.994202e6 / 0.231533,
    density_kg_m3: 5175,
    conductivity_W_mK: 5,
    emissivity: ROUGH_ROCK,
    below: 'silicate',
  }),
];

const BY_NAME: ReadonlyMap<string, Solid> = new Map(SOLIDS.map((solid) => [solid.name, solid]));

/** Names that `solidByName` knows. */
export const SOLID_NAMES: readonly string[] = Object.freeze([...BY_NAME.keys()]);

/**
 * Named filler of a bed. `range_K` is what its data cover. Above it c_s keeps its end value. Below
 * 298 K no published fit is valid: c_s follows the vibrations of the lattice from the fit's value
 * at its lower end (`lowTemperatureForm`); magnetite has a table of its own down to 100 K.
 *
 * @throws RangeError for a name that is not in SOLID_NAMES
 */
export function solidByName(name: string): Solid {
  const solid = BY_NAME.get(name);
  if (!solid) {
    throw new RangeError(`name must be one of ${SOLID_NAMES.join(', ')}, got ${name}`);
  }
  return solid;
}
