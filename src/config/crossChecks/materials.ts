import type { Path } from '../faults.js';
import { resolveSolid } from '../resolveStore.js';
import type { StoreBlock } from '../schema/store.js';
import { type CrossFault, cross, firstNotAscending } from './cross.js';

/** Data of a solid of one's own. */
export function solidFaults(solid: StoreBlock['bed']['solid'], path: Path): CrossFault[] {
  if (typeof solid === 'string') return [];
  const faults: CrossFault[] = [];
  if (solid.given_as === 'table') {
    const temperatures: Path = [...path, 'temperature_degC'];
    const capacities: Path = [...path, 'heat_capacity_J_kgK'];
    const at = firstNotAscending(solid.temperature_degC);
    if (at >= 0) {
      faults.push(
        cross(
          [...temperatures, at],
          solid.temperature_degC[at],
          `a temperature above the one before it (${solid.temperature_degC[at - 1]} degC)`,
        ),
      );
    }
    if (solid.heat_capacity_J_kgK.length !== solid.temperature_degC.length) {
      faults.push(
        cross(
          capacities,
          solid.heat_capacity_J_kgK,
          `as many values as temperature_degC has (${solid.temperature_degC.length})`,
          { others: [temperatures] },
        ),
      );
    }
  } else if (solid.valid_to_degC <= solid.valid_from_degC) {
    faults.push(
      cross(
        [...path, 'valid_to_degC'],
        solid.valid_to_degC,
        `more than valid_from_degC (${solid.valid_from_degC})`,
        {
          others: [[...path, 'valid_from_degC']],
        },
      ),
    );
  }
  return faults.length > 0 ? faults : impossible(solid, path);
}

/** What only the core can tell: a fit that falls to zero or below somewhere. */
function impossible(solid: StoreBlock['bed']['solid'], path: Path): CrossFault[] {
  try {
    resolveSolid(solid);
    return [];
  } catch (error) {
    if (!(error instanceof RangeError)) throw error;
    return [cross(path, solid, `data that can be: ${error.message}`)];
  }
}
