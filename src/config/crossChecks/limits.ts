import type { Path } from '../faults.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';
import { watchFaults } from './watch.js';

export function limitFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const at: Path = [...path, 'limits'];
  return [
    ...(['charge', 'discharge'] as const).flatMap((direction) => [
      ...rangeFaults(unit.limits[direction], 'power_min_MW_el', 'power_max_MW_el', [
        ...at,
        direction,
      ]),
      ...rangeFaults(unit.limits[direction], 'flow_min_kg_s', 'flow_max_kg_s', [...at, direction]),
    ]),
    ...powerFaults(unit, path),
    ...outletFaults(unit, path),
    ...standFaults(unit, path),
    ...watchFaults(unit, path),
  ];
}

function rangeFaults<K extends string>(
  block: Readonly<Record<K, number>>,
  low: K,
  high: K,
  path: Path,
): CrossFault[] {
  if (block[low] <= block[high]) return [];
  return [
    cross([...path, low], block[low], `at most ${high} (${block[high]})`, {
      others: [[...path, high]],
    }),
  ];
}

function powerFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const { power_min_MW_el: min, power_max_MW_el: max } = unit.limits.discharge;
  const others: Path[] = [
    [...path, 'limits', 'discharge', 'power_min_MW_el'],
    [...path, 'limits', 'discharge', 'power_max_MW_el'],
  ];
  const powers: { path: Path; value: number }[] = [
    { path: [...path, 'rated_power_MW_el'], value: unit.rated_power_MW_el },
    ...(unit.hours_at_MW_el ?? []).map((value, i) => ({
      path: [...path, 'hours_at_MW_el', i],
      value,
    })),
  ];
  if (min > max) return [];
  return powers.flatMap((p) =>
    p.value >= min && p.value <= max
      ? []
      : [
          cross(p.path, p.value, `a power within limits.discharge, from ${min} to ${max} MW_el`, {
            others,
          }),
        ],
  );
}

/** Each stop rule, the store it belongs to, and which end of it is the charged state. */
const RULES = [
  { key: 'hot_outlet_min_degC', kind: 'hot' },
  { key: 'cold_outlet_max_degC', kind: 'cold' },
  { key: 'charge_hot_outlet_max_degC', kind: 'hot' },
  { key: 'charge_cold_outlet_min_degC', kind: 'cold' },
] as const;

function outletFaults(unit: UnitBlock, path: Path): CrossFault[] {
  return RULES.flatMap(({ key, kind }) => {
    const value = unit.limits[key];
    if (value === undefined) return [];
    const at: Path = [...path, 'limits', key];
    const s = unit.stores.findIndex((store) => store.kind === kind);
    const store = unit.stores[s];
    if (store === undefined) {
      return [
        cross(at, value, `no such limit: the unit has no ${kind} store`, {
          others: unit.stores.map((_, i): Path => [...path, 'stores', i, 'kind']),
        }),
      ];
    }
    const { reference_cold_degC: low, reference_hot_degC: high } = store;
    if (low >= high || (value > low && value < high)) return [];
    return [
      cross(
        at,
        value,
        `a temperature between the references of the ${kind} store, ${low} and ${high} degC`,
        {
          others: [
            [...path, 'stores', s, 'reference_cold_degC'],
            [...path, 'stores', s, 'reference_hot_degC'],
            [...path, 'stores', s, 'kind'],
          ],
          hint: outletHint(key, value, low, high),
        },
      ),
    ];
  });
}

function outletHint(
  key: (typeof RULES)[number]['key'],
  value: number,
  low: number,
  high: number,
): string {
  switch (key) {
    case 'hot_outlet_min_degC':
      return value >= high
        ? 'every discharge would end at once'
        : 'no discharge would ever end by this rule';
    case 'cold_outlet_max_degC':
      return value <= low
        ? 'every discharge would end at once'
        : 'no discharge would ever end by this rule';
    case 'charge_hot_outlet_max_degC':
      return value <= low
        ? 'every charge would end at once'
        : 'no charge would ever end by this rule';
    case 'charge_cold_outlet_min_degC':
      return value >= high
        ? 'every charge would end at once'
        : 'no charge would ever end by this rule';
  }
}

function standFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const stand = unit.estimator.stand_flow_kg_s;
  if (stand === undefined) return [];
  return (['charge', 'discharge'] as const).flatMap((direction) => {
    const { flow_min_kg_s: min, flow_max_kg_s: max } = unit.limits[direction];
    const bound = min > 0 ? min : max;
    const key = min > 0 ? 'flow_min_kg_s' : 'flow_max_kg_s';
    if (stand < bound) return [];
    return [
      cross(
        [...path, 'estimator', 'stand_flow_kg_s'],
        stand,
        `less than limits.${direction}.${key} (${bound}): the unit would seem to stand while it runs`,
        { others: [[...path, 'limits', direction, key]] },
      ),
    ];
  });
}
