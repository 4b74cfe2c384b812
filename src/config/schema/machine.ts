import { z } from 'zod';
import { key, positive, temperature_degC } from './key.js';
import { fluidSchema } from './materials.js';

const auxiliaries = {
  auxiliary_running_kW: key(
    z.number().min(0).max(1e5),
    'kW',
    'Power of the auxiliaries while running.',
    40,
  ).default(0),
  auxiliary_standing_kW: key(
    z.number().min(0).max(1e5),
    'kW',
    'Power of the auxiliaries while standing.',
    8,
  ).default(0),
  work_factor_charge: key(
    z.number().min(0.3).max(3),
    '-',
    'Power per kilogram while charging, tuned: the plant over this model.',
    1,
  ).default(1),
  work_factor_discharge: key(
    z.number().min(0.3).max(3),
    '-',
    'Power per kilogram while discharging, tuned: the plant over this model.',
    1,
  ).default(1),
};
const efficiency = () => z.number().gt(0).max(1);

const gasCycle = z.strictObject({
  kind: key(
    z.literal('gas_cycle'),
    '-',
    'A closed gas cycle between a hot and a cold store.',
    'gas_cycle',
  ),
  gas: fluidSchema,
  high_pressure_bar: key(positive(400), 'bar', 'Absolute pressure of the high side.', 7.9),
  low_pressure_bar: key(positive(400), 'bar', 'Absolute pressure of the low side.', 1.04),
  compressor_polytropic_efficiency: key(efficiency(), '-', 'Polytropic efficiency.', 0.9),
  expander_polytropic_efficiency: key(efficiency(), '-', 'Polytropic efficiency.', 0.91),
  loop_pressure_loss: key(
    z.number().min(0).max(0.5),
    '-',
    'Pressure loss of the whole loop as a share of the pressure, half of it on each side.',
    0.03,
  ),
  loss_follows_flow: key(
    z.number().min(0).max(1),
    '-',
    'Share of that loss that follows the square of the flow, the loss being that at rated flow.',
    0.6,
    'not known, and sigma grows at part load',
  ).optional(),
  cooler_approach_K: key(z.number().min(0).max(100), 'K', 'Outlet of a cooler above ambient.', 15),
  motor_efficiency: key(efficiency(), '-', 'Shaft over electrical power while charging.', 0.96),
  generator_efficiency: key(
    efficiency(),
    '-',
    'Electrical over shaft power while discharging.',
    0.96,
  ),
  ...auxiliaries,
});

const efficiencyTable = z.strictObject({
  kind: key(
    z.literal('efficiency_table'),
    '-',
    'A single hot store with a heater and an engine described by a table.',
    'efficiency_table',
  ),
  fluid: fluidSchema,
  outlet_degC: key(
    z.array(temperature_degC()).min(2).max(200),
    'degC',
    'Outlet temperatures of the store, ascending.',
    [400, 500, 600],
  ),
  efficiency: key(
    z.array(z.number().min(0).max(1)).min(2).max(200),
    '-',
    'Net electrical over thermal power at these outlet temperatures.',
    [0.2, 0.26, 0.3],
  ),
  return_degC: key(
    temperature_degC(),
    'degC',
    'Temperature at which the fluid returns to the store while discharging.',
    180,
  ),
  charge_inlet_degC: key(temperature_degC(), 'degC', 'Temperature that the heater delivers.', 620),
  charge_efficiency: key(
    z.number().gt(0).max(10),
    '-',
    'Heat over electricity while charging; above 1 for a heat pump.',
    0.97,
  ),
  ...auxiliaries,
});

/** The machine between grid and stores. */
export const machineSchema = z.discriminatedUnion('kind', [gasCycle, efficiencyTable]);
export type MachineBlock = z.output<typeof machineSchema>;
