import { thermocoupleRange_degC } from '../../core/thermocouple/its90.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import { dewPoint_K } from '../dewPoint.js';
import { expandString } from '../expand.js';
import { type Path, pathText } from '../faults.js';
import { resolveFluid } from '../resolveStore.js';
import type { StringBlock } from '../schema/channels.js';
import { ID_PATTERN } from '../schema/key.js';
import type { StoreBlock } from '../schema/store.js';
import { type CrossFault, cross, repeated } from './cross.js';
import { solidFaults } from './materials.js';
import { rawUnitFaults } from './rawUnit.js';

/** Explicit shares may miss 1 by this much from rounding; they are then scaled to 1. */
const SHARE_TOLERANCE = 0.005;

export function storeFaults(store: StoreBlock, path: Path): CrossFault[] {
  const strings: Path = [...path, 'strings'];
  return [
    ...geometryFaults(store, path),
    ...referenceFaults(store, path),
    ...solidFaults(store.bed.solid, [...path, 'bed', 'solid']),
    ...repeated(
      store.strings.map((s, i) => ({ name: s.id, path: [...strings, i, 'id'] })),
      'another name than every other string of the store',
      pathText,
    ),
    ...shareFaults(store, path),
    ...store.strings.flatMap((s, i) => stringFaults(store, s, path, i)),
  ];
}

function geometryFaults(store: StoreBlock, path: Path): CrossFault[] {
  const { particle_diameter_mm, diameter_m } = store.bed;
  const most_mm = 250 * diameter_m;
  if (particle_diameter_mm <= most_mm) return [];
  return [
    cross(
      [...path, 'bed', 'particle_diameter_mm'],
      particle_diameter_mm,
      `at most a quarter of the bed's diameter (${most_mm} mm): fewer pieces across are no packed bed`,
      { others: [[...path, 'bed', 'diameter_m']] },
    ),
  ];
}

function referenceFaults(store: StoreBlock, path: Path): CrossFault[] {
  const hotPath: Path = [...path, 'reference_hot_degC'];
  const coldPath: Path = [...path, 'reference_cold_degC'];
  const faults: CrossFault[] = [];
  if (store.reference_cold_degC >= store.reference_hot_degC) {
    faults.push(
      cross(
        coldPath,
        store.reference_cold_degC,
        `less than reference_hot_degC (${store.reference_hot_degC})`,
        { others: [hotPath], hint: 'the hot reference is the upper one in a cold store too' },
      ),
    );
  }
  const dew = dewPoint_K(resolveFluid(store.bed.fluid), store.pressure_bar * 1e5);
  const lowest_K = Math.min(store.reference_cold_degC, store.reference_hot_degC) + ZERO_CELSIUS_K;
  if (dew !== null && lowest_K <= dew) {
    faults.push(
      cross(
        coldPath,
        store.reference_cold_degC,
        `above the dew point of the gas at ${store.pressure_bar} bar, ${(dew - ZERO_CELSIUS_K).toFixed(1)} degC`,
        {
          others: [hotPath, [...path, 'pressure_bar'], [...path, 'bed', 'fluid']],
          hint:
            'HAZARD: the gas would turn liquid in the bed, and pooled liquid boils off with a steep rise ' +
            'of pressure; lower the pressure of this store or raise its lowest temperature',
        },
      ),
    );
  }
  return faults;
}

function shareFaults(store: StoreBlock, path: Path): CrossFault[] {
  const sharePath = (i: number): Path => [...path, 'strings', i, 'area_share'];
  const given = store.strings.filter((s) => s.area_share !== undefined).length;
  if (given === 0) return [];
  const all = store.strings.map((_, i) => sharePath(i));
  if (given < store.strings.length) {
    return store.strings.flatMap((s, i) =>
      s.area_share === undefined
        ? [
            cross(sharePath(i), undefined, 'a share for every string of the store, or for none', {
              others: all,
              hint: 'without shares each string stands for the ring between its mid-radii',
            }),
          ]
        : [],
    );
  }
  const total = store.strings.reduce((sum, s) => sum + s.area_share!, 0);
  if (Math.abs(total - 1) <= SHARE_TOLERANCE) return [];
  return [
    cross([...path, 'strings'], undefined, 'area shares that add up to 1', { others: all }),
  ].map((fault) => ({ ...fault, found: `area shares that add up to ${Number(total.toFixed(4))}` }));
}

function stringFaults(
  store: StoreBlock,
  string: StringBlock,
  storePath: Path,
  i: number,
): CrossFault[] {
  const path: Path = [...storePath, 'strings', i];
  return [
    ...placeFaults(store, string, storePath, path),
    ...nameFaults(store, string, path),
    ...rawUnitFaults(string, path),
    ...typeFaults(store, string, storePath, path),
  ];
}

function placeFaults(
  store: StoreBlock,
  string: StringBlock,
  storePath: Path,
  path: Path,
): CrossFault[] {
  const faults: CrossFault[] = [];
  const { height_m, diameter_m } = store.bed;
  if (string.radius_m > diameter_m / 2) {
    faults.push(
      cross(
        [...path, 'radius_m'],
        string.radius_m,
        `at most the bed's radius (${diameter_m / 2} m)`,
        {
          others: [[...storePath, 'bed', 'diameter_m']],
        },
      ),
    );
  }
  const p = string.positions_m;
  const falling = p.length > 1 && p[1]! < p[0]!;
  p.forEach((position, k) => {
    const at: Path = [...path, 'positions_m', k];
    if (position > height_m) {
      faults.push(
        cross(at, position, `a place inside the bed, from 0 to ${height_m} m`, {
          others: [[...storePath, 'bed', 'height_m']],
          hint: 'thermocouples outside the bed are channels of their own (gas_temperature)',
        }),
      );
    }
    const before = p[k - 1];
    if (before === undefined || (falling ? position < before : position > before)) return;
    faults.push(
      cross(
        at,
        position,
        `positions that run in one direction, so ${falling ? 'below' : 'above'} ${before}`,
        {
          others: [
            [...path, 'positions_m', k - 1],
            [...path, 'positions_m', 0],
            [...path, 'positions_m', 1],
          ],
        },
      ),
    );
  });
  return faults;
}

function nameFaults(store: StoreBlock, string: StringBlock, path: Path): CrossFault[] {
  const count = string.positions_m.length;
  const ids: Path = [...path, 'ids'];
  const positions: Path = [...path, 'positions_m'];
  const faults: CrossFault[] = [];
  if (Array.isArray(string.ids)) {
    if (string.ids.length !== count) {
      faults.push(
        cross(ids, string.ids, `as many ids as positions_m has entries (${count})`, {
          others: [positions],
        }),
      );
    }
  } else {
    if (count > 1 && !string.ids.includes('{n}')) {
      faults.push(
        cross(
          ids,
          string.ids,
          'a pattern with {n}, so that every thermocouple has a name of its own',
          {
            others: [positions],
          },
        ),
      );
    }
    const bad = expandString('', store, string, '').ids.find((id) => !ID_PATTERN.test(id));
    if (bad !== undefined) {
      faults.push(
        cross(
          ids,
          string.ids,
          'a pattern that gives names of letters, digits, _ . -, beginning with a letter',
          {
            hint: `it gives ${bad.slice(0, 60)}; known words are {store}, {string} and {n}`,
          },
        ),
      );
    }
  }
  if (string.topic !== undefined) {
    const single = /\{(id|n)\}/.test(string.topic);
    if (string.payload === 'value' && count > 1 && !single) {
      faults.push(
        cross(
          [...path, 'topic'],
          string.topic,
          'a topic with {id} or {n}: payload value has one per thermocouple',
          {
            others: [[...path, 'payload'], positions],
          },
        ),
      );
    }
    if (string.payload === 'array' && single) {
      faults.push(
        cross(
          [...path, 'topic'],
          string.topic,
          'one topic without {id} or {n}: payload array is one message',
          {
            others: [[...path, 'payload']],
          },
        ),
      );
    }
  }
  return faults;
}

/** A type whose reference function does not reach the store's temperatures is the wrong letter. */
function typeFaults(
  store: StoreBlock,
  string: StringBlock,
  storePath: Path,
  path: Path,
): CrossFault[] {
  const type = string.thermocouple_type;
  if (type === undefined || string.unit !== 'mV') return [];
  const [low, high] = thermocoupleRange_degC(type);
  if (store.reference_cold_degC >= low && store.reference_hot_degC <= high) return [];
  return [
    cross(
      [...path, 'thermocouple_type'],
      type,
      `a type that covers the store, ${store.reference_cold_degC} to ${store.reference_hot_degC} degC; type ${type} covers ${low} to ${high} degC`,
      {
        others: [
          [...storePath, 'reference_cold_degC'],
          [...storePath, 'reference_hot_degC'],
          [...path, 'unit'],
        ],
      },
    ),
  ];
}
