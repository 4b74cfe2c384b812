import type { ChannelDefinition, UnitDefinition } from '../definitions.js';
import type { Scan } from '../scan/scan.js';

/**
 * What a channel other than a thermocouple in the bed may read. A failed transmitter sends a code
 * (-9999, 1e9) as if it were a value, and one such gas temperature or flow would be carried into the
 * bed as heat. The ranges are wide: whatever a plant can really do lies inside. Thermocouples in the
 * bed are not looked at here: they are judged one by one (see judge).
 */
type Range = readonly [low: number, high: number];

/** Beyond the references by their span, and by 200 K at least. */
const GAS_LEAST_MARGIN_K = 200;
const LEAST_GAS_K = 20;
/** Air at ground has been measured from 184 K to 330 K (WMO archive of weather extremes). */
const AMBIENT_K: Range = [180, 340];
/** Multiples of the greatest flow and power of the limits. */
const FLOW_MOST = 3;
const POWER_MOST = 5;
/** Multiple of the store's own pressure; a gauge may read somewhat below 0. */
const PRESSURE_MOST = 5;
const PRESSURE_LEAST_PA = -5e4;
/** Multiple of the greatest pressure drop allowed; without one it cannot exceed the store's pressure. */
const DROP_MOST = 20;

/** Kinds of channels that have such a range: why a reading of theirs is none. */
export const IMPLAUSIBLE_KINDS = [
  'gas_temperature',
  'flow',
  'power',
  'ambient_temperature',
  'pressure',
  'pressure_drop',
] as const;
export type ImplausibleKind = (typeof IMPLAUSIBLE_KINDS)[number];

/** A reading that no plant produces: missing to the estimate. */
export interface ImplausibleReading {
  readonly channel: string;
  readonly kind: ImplausibleKind;
}

/** One range per channel of the unit, in SI; null where every finite value may be. */
export function plausibleRanges(unit: UnitDefinition): readonly (Range | null)[] {
  const { charge, discharge } = unit.limits;
  const flow = FLOW_MOST * Math.max(charge.flow_max_kg_s, discharge.flow_max_kg_s);
  const power = POWER_MOST * Math.max(charge.power_max_W, discharge.power_max_W);
  return unit.channels.map(({ role }: ChannelDefinition): Range | null => {
    if (role.kind === 'flow') return [-flow, flow];
    if (role.kind === 'power') return [-power, power];
    if (role.kind === 'ambient_temperature') return AMBIENT_K;
    if (!('store' in role) || role.kind === 'thermocouple') return null;
    const store = unit.stores.find((s) => s.id === role.store);
    if (store === undefined) return null;
    const { pressure_Pa } = store.bed;
    if (role.kind === 'pressure') return [PRESSURE_LEAST_PA, PRESSURE_MOST * pressure_Pa];
    if (role.kind === 'pressure_drop') {
      const allowed = unit.limits.pressure_drop_max_Pa;
      const most = allowed === null ? pressure_Pa : Math.min(pressure_Pa, DROP_MOST * allowed);
      return [-most, most];
    }
    if (role.kind !== 'gas_temperature') return null;
    const { reference_hot_K: hot, reference_cold_K: cold } = store;
    const margin = Math.max(GAS_LEAST_MARGIN_K, hot - cold);
    return [Math.max(LEAST_GAS_K, cold - margin), hot + margin];
  });
}

/** A scan in which readings beyond their range are missing ones, and the channels of those. */
export function withoutImplausible(
  ranges: readonly (Range | null)[],
  scan: Scan,
): { readonly scan: Scan; readonly dropped: readonly number[] } {
  let values = scan.values;
  const dropped: number[] = [];
  ranges.forEach((range, i) => {
    const value = scan.values[i] as number;
    if (range === null || Number.isNaN(value)) return;
    if (value >= range[0] && value <= range[1]) return;
    if (dropped.length === 0) values = Float64Array.from(values);
    values[i] = Number.NaN;
    dropped.push(i);
  });
  return dropped.length === 0 ? { scan, dropped } : { scan: { ...scan, values }, dropped };
}

/** Whether any of these channels is one that the beds are estimated from. */
export function touchesEstimate(unit: UnitDefinition, dropped: readonly number[]): boolean {
  return dropped.some((i) => {
    const kind = unit.channels[i]?.role.kind;
    return kind !== 'pressure' && kind !== 'pressure_drop';
  });
}

/** Channels by their index as readings that no plant produces, each with its kind. */
export function implausibleReadings(
  unit: UnitDefinition,
  dropped: readonly number[],
): ImplausibleReading[] {
  return dropped.flatMap((i) => {
    const { id, role } = unit.channels[i] as ChannelDefinition;
    const kind = IMPLAUSIBLE_KINDS.find((one) => one === role.kind);
    return kind === undefined ? [] : [{ channel: id, kind }];
  });
}
