import type { UnitDefinition } from '../../src/core/definitions.js';
import { STORE_TUNABLES, type Tunable, type TuneRow } from '../../src/core/tune/result.js';

const VALUES: Readonly<Record<Tunable, number>> = {
  true_over_metered_flow: 1.03,
  work_charge: 0.9,
  work_discharge: 1.1,
  heat_transfer: 1.2,
  conductivity: 1.3,
  loss: 0.8,
  heat_capacity: 1.05,
  gas_share: 0.4,
  front_travel: 0.98,
};

/** Rows of a unit as tuning gives them, everything determined to 1 %. */
export function tuneRows(unit: UnitDefinition): TuneRow[] {
  const row = (store: string | null, name: Tunable): TuneRow => ({
    store,
    name,
    value: VALUES[name],
    sigma: 0.01,
    prior_sigma: 0.1,
    determined: true,
    reason: null,
    with: null,
  });
  return [
    row(null, 'true_over_metered_flow'),
    row(null, 'work_charge'),
    row(null, 'work_discharge'),
    ...unit.stores.flatMap(({ id }) => STORE_TUNABLES.map((name) => row(id, name))),
  ];
}
