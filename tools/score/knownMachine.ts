import type { UnitDefinition } from '../../src/core/definitions.js';

/**
 * The unit as its operator would describe a machine that was measured at its acceptance: specific
 * work known to 0.2 % at every load, so that the loop's loss is known not to follow the flow. To be
 * used where the plant's machine is that of the configuration.
 */
export function withKnownMachine(unit: UnitDefinition): UnitDefinition {
  const { machine } = unit;
  return {
    ...unit,
    machine: machine.kind === 'gas_cycle' ? { ...machine, loss_follows_flow: 0 } : machine,
    estimator: { ...unit.estimator, machine_factor_sigma: 0.002 },
  };
}
