import type { EstimatorDefinition, StringDefinition } from '../definitions.js';

/**
 * Where each state of a tube's filter stands in its vector and in its covariance (row-major,
 * size x size): the cell temperatures [K] first, then
 *   flow      ln(true flow of the tube / metered flow)
 *   transfer  ln(phi_h), on top of the configured factor
 *   share     share of the gas temperature that the junctions see, net of their lag [-]
 *   inlet     offset of the gas temperature measured at either end [K]
 *   leak      mass flux through a valve that leaks while the unit stands, unmetered, + = charge [kg/m2s]
 *   offset    one per thermocouple [K]
 *   position  error of each thermocouple's position [m]
 *   group     offset common to each group that shares a card, cable or cold junction [K]
 */
export interface TubeLayout {
  readonly cells: number;
  readonly size: number;
  readonly flow: number;
  readonly transfer: number;
  readonly share: number;
  readonly inlet: Readonly<Record<'charge_inlet' | 'discharge_inlet', number>>;
  readonly leak: number;
  readonly offset: number;
  readonly position: number;
  readonly group: number;
  readonly sensors: number;
  readonly groups: readonly string[];
  /** Group index of each thermocouple, -1 = none. */
  readonly groupOf: readonly number[];
}

/** Layout for a string: `cells` + 6 states, two per thermocouple, one per group that it names. */
export function layoutOf(string: StringDefinition, estimator: EstimatorDefinition): TubeLayout {
  const groups: string[] = [];
  const groupOf = string.thermocouples.map((sensor) => {
    if (sensor.group === null) return -1;
    const known = groups.indexOf(sensor.group);
    return known >= 0 ? known : groups.push(sensor.group) - 1;
  });
  const cells = estimator.cells;
  const sensors = string.thermocouples.length;
  const offset = cells + 6;
  return {
    cells,
    flow: cells,
    transfer: cells + 1,
    share: cells + 2,
    inlet: { charge_inlet: cells + 3, discharge_inlet: cells + 4 },
    leak: cells + 5,
    offset,
    position: offset + sensors,
    group: offset + 2 * sensors,
    size: offset + 2 * sensors + groups.length,
    sensors,
    groups,
    groupOf,
  };
}
