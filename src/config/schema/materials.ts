import { z } from 'zod';
import { FLUID_NAMES } from '../../core/bed/fluids.js';
import { SOLID_NAMES } from '../../core/bed/solids.js';
import { key, positive, temperature_degC } from './key.js';

const solidBasics = {
  name: key(z.string().min(1).max(80), '-', 'Name of the material.', 'crushed diabase'),
  source: key(
    z.string().max(400),
    '-',
    'Where the numbers come from: laboratory, report, publication.',
    'own calorimetry, report 2024-03',
  ).default('given in the configuration'),
  density_kg_m3: key(
    positive(20000).min(200),
    'kg/m3',
    'Density of a piece of the solid, without the voids between the pieces.',
    2900,
  ),
  conductivity_W_mK: key(
    positive(500).min(0.01),
    'W/mK',
    'Thermal conductivity of a piece of the solid.',
    2.2,
  ),
  emissivity: key(
    z.number().min(0.01).max(1),
    '-',
    'Emissivity of the surface, for radiation from piece to piece.',
    0.85,
  ).default(0.85),
  below_range: key(
    z.enum(['end_value', 'silicate', 'close_packed_oxide']),
    '-',
    'How c_s goes on below the data: it stays, or falls as the lattice of a silicate rock or of a close-packed oxide does.',
    'silicate',
  ).default('end_value'),
};

const tableSolid = z.strictObject({
  given_as: key(z.literal('table'), '-', 'Heat capacity as a table.', 'table'),
  ...solidBasics,
  temperature_degC: key(
    z.array(temperature_degC()).min(2).max(500),
    'degC',
    'Temperatures of the table, ascending.',
    [-100, 25, 200, 400, 600],
  ),
  heat_capacity_J_kgK: key(
    z.array(z.number().min(20).max(10000)).min(2).max(500),
    'J/kgK',
    'Specific heat capacity at these temperatures; straight lines between them.',
    [520, 740, 930, 1020, 1090],
  ),
});

const polynomialSolid = z.strictObject({
  given_as: key(
    z.literal('polynomial'),
    '-',
    'Heat capacity as a polynomial in kelvin.',
    'polynomial',
  ),
  ...solidBasics,
  coefficients: key(
    z.array(z.number()).min(1).max(8),
    'J/kgK per K^i',
    'c_s(T) = a0 + a1 T + a2 T^2 + ... with T in kelvin.',
    [560, 0.9],
  ),
  valid_from_degC: key(temperature_degC(), 'degC', 'Lower end of the fit; see below_range.', 20),
  valid_to_degC: key(temperature_degC(), 'degC', 'Upper end of the fit; above it c_s stays.', 600),
});

/** A solid by name, or with its own heat capacity. */
export const solidSchema = key(
  z.union([z.enum(SOLID_NAMES), z.discriminatedUnion('given_as', [tableSolid, polynomialSolid])]),
  '-',
  'The filler: one of the known names, or a block with its own data.',
  SOLID_NAMES[0],
);

const liquid = z.strictObject({
  given_as: key(z.literal('liquid'), '-', 'A liquid of constant properties.', 'liquid'),
  name: key(z.string().min(1).max(80), '-', 'Name of the liquid.', 'thermal oil'),
  source: key(
    z.string().max(400),
    '-',
    'Where the numbers come from.',
    'data sheet, 300 degC',
  ).default('given in the configuration'),
  density_kg_m3: key(positive(20000).min(100), 'kg/m3', 'Density.', 780),
  heat_capacity_J_kgK: key(positive(10000).min(100), 'J/kgK', 'Specific heat capacity.', 2350),
  viscosity_mPa_s: key(positive(10000).min(0.01), 'mPa s', 'Dynamic viscosity.', 0.4),
  conductivity_W_mK: key(positive(200).min(0.01), 'W/mK', 'Thermal conductivity.', 0.1),
});

/** A fluid by name, or a liquid of constant properties. */
export const fluidSchema = key(
  z.union([z.enum(FLUID_NAMES), liquid]),
  '-',
  'The heat carrier: one of the known names, or a block with the constant properties of a liquid.',
  FLUID_NAMES[0],
);
