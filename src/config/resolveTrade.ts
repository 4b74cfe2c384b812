import type {
  ConnectionDefinition,
  LimitsDefinition,
  OperationDefinition,
  OutageDefinition,
  StartUpDefinition,
} from '../core/definitions.js';
import type { LimitsBlock } from './schema/operation.js';
import type { ConnectionBlock, OperationBlock, OutageBlock } from './schema/trade.js';

const MINUTE_S = 60;
const HOUR_S = 3600;
const W_PER_MW = 1e6;
const J_PER_KWH = 3.6e6;

/**
 * What binds beside the stores, with absent keys left out.
 *
 * @param standing_W auxiliaries while standing, which a start-up without an energy of its own draws
 */
export function resolveTrade(
  block: LimitsBlock,
  standing_W: number,
): Pick<LimitsDefinition, 'operation' | 'connection' | 'outages' | 'availability'> {
  const { operation, connection, outages, availability } = block;
  return {
    ...(operation === undefined ? {} : { operation: resolveRunning(operation, standing_W) }),
    ...(connection === undefined ? {} : { connection: resolveConnection(connection) }),
    ...(outages.length === 0 ? {} : { outages: outages.map(resolveOutage) }),
    ...(availability === undefined ? {} : { availability }),
  };
}

function resolveRunning(block: OperationBlock, standing_W: number): OperationDefinition {
  const { ramp_MW_per_min: ramp, start, change_over_min } = block;
  const rate = (value: number | undefined): number | null =>
    value === undefined ? null : (value * W_PER_MW) / MINUTE_S;
  const startUp = (own: OperationBlock['start']['warm']): StartUpDefinition => {
    const time_s = (own?.time_min ?? 0) * MINUTE_S;
    const energy = own?.energy_kWh_el;
    return { time_s, energy_J: energy === undefined ? standing_W * time_s : energy * J_PER_KWH };
  };
  return {
    ramp_W_s: { charge: rate(ramp.charge), discharge: rate(ramp.discharge) },
    start: {
      warm: startUp(start.warm),
      cold: startUp(start.cold ?? start.warm),
      cold_after_s:
        start.cold_after_h === undefined ? Number.POSITIVE_INFINITY : start.cold_after_h * HOUR_S,
    },
    change_over_s: change_over_min * MINUTE_S,
  };
}

function resolveConnection(block: ConnectionBlock): ConnectionDefinition {
  const export_max_W = block.export_max_MW_el * W_PER_MW;
  const import_max_W = block.import_max_MW_el * W_PER_MW;
  return {
    time_zone: block.time_zone,
    export_max_W,
    import_max_W,
    windows: block.windows.map((window) => ({
      from_min: minutesOf(window.from),
      to_min: minutesOf(window.to),
      export_max_W: (window.export_max_MW_el ?? block.export_max_MW_el) * W_PER_MW,
      import_max_W: (window.import_max_MW_el ?? block.import_max_MW_el) * W_PER_MW,
    })),
  };
}

function resolveOutage(block: OutageBlock): OutageDefinition {
  return {
    from_ms: Date.parse(block.from),
    to_ms: Date.parse(block.to),
    discharge_max_W: block.discharge_max_MW_el * W_PER_MW,
    charge_max_W: block.charge_max_MW_el * W_PER_MW,
    reason: block.reason,
  };
}

/** Minutes after midnight of a clock time such as 07:30. */
export function minutesOf(clock: string): number {
  const [hours, minutes] = clock.split(':').map(Number) as [number, number];
  return hours * 60 + minutes;
}
