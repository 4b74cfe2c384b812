import type { Path } from '../faults.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';

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

function watchFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const at: Path = [...path, 'watch'];
  const { spread_ratio, data_age_s } = unit.watch;
  const faults: CrossFault[] = [];
  if (spread_ratio.limit - spread_ratio.deadband < 1) {
    faults.push(
      cross(
        [...at, 'spread_ratio', 'deadband'],
        spread_ratio.deadband,
        `at most limit - 1 (${Number((spread_ratio.limit - 1).toFixed(3))}): a healthy front has a ratio of 1 and must let the alert return`,
        { others: [[...at, 'spread_ratio', 'limit']] },
      ),
    );
  }
  if (data_age_s.limit !== undefined) {
    const limit: Path = [...at, 'data_age_s', 'limit'];
    if (data_age_s.limit <= unit.scan_period_s) {
      faults.push(
        cross(limit, data_age_s.limit, `more than the scan period (${unit.scan_period_s} s)`, {
          others: [[...path, 'scan_period_s']],
        }),
      );
    }
    if (data_age_s.deadband >= data_age_s.limit) {
      faults.push(
        cross(
          [...at, 'data_age_s', 'deadband'],
          data_age_s.deadband,
          `less than limit (${data_age_s.limit})`,
          {
            others: [limit],
          },
        ),
      );
    }
  }
  return faults;
}
