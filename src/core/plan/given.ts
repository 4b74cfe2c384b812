/** What every figure about what lies ahead takes for granted. */
export const GIVEN =
  'the machine runs: outages that are not in the configuration are left out; all MWh_el at the connection point';
