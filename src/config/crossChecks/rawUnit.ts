import type { Path } from '../faults.js';
import { type CrossFault, cross } from './cross.js';

export interface RawUnit {
  readonly unit: string;
  readonly thermocouple_type?: string | undefined;
  readonly cold_junction?: string | undefined;
  readonly cold_junction_degC?: number | undefined;
}

/** Raw millivolts need a type and exactly one cold junction; anything else needs no junction. */
export function rawUnitFaults(block: RawUnit, path: Path): CrossFault[] {
  const unit: Path = [...path, 'unit'];
  const type: Path = [...path, 'thermocouple_type'];
  const channel: Path = [...path, 'cold_junction'];
  const fixed: Path = [...path, 'cold_junction_degC'];
  const faults: CrossFault[] = [];
  const named = block.cold_junction !== undefined;
  const stated = block.cold_junction_degC !== undefined;
  if (block.unit === 'mV') {
    if (block.thermocouple_type === undefined) {
      faults.push(
        cross(type, undefined, 'the thermocouple type, since the unit is mV', { others: [unit] }),
      );
    }
    if (!named && !stated) {
      faults.push(
        cross(
          channel,
          undefined,
          'a cold junction, since the unit is mV: cold_junction or cold_junction_degC',
          {
            others: [unit, fixed],
          },
        ),
      );
    }
    if (named && stated) {
      faults.push(
        cross(
          fixed,
          block.cold_junction_degC,
          'one cold junction: cold_junction or cold_junction_degC',
          {
            others: [channel],
          },
        ),
      );
    }
  } else if (named || stated) {
    faults.push(
      cross(
        named ? channel : fixed,
        named ? block.cold_junction : block.cold_junction_degC,
        `no cold junction, since the unit is ${block.unit} and no raw voltage`,
        { others: [unit] },
      ),
    );
  }
  return faults;
}
