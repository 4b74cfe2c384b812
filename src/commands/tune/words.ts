import type {
  Tunable,
  TuneConfigure,
  TuneReason,
  TuneRefusal,
  TuneResult,
  TuneRow,
} from '../../core/tune/result.js';

export const NAMES: Readonly<Record<Tunable, string>> = {
  true_over_metered_flow: 'true over metered flow',
  work_charge: 'work per metered kg, charging',
  work_discharge: 'work per metered kg, discharging',
  heat_transfer: 'heat transfer',
  conductivity: 'bed conductivity',
  loss: 'heat losses',
  heat_capacity: 'heat capacity',
  gas_share: 'gas share of thermocouples',
  front_travel: 'front travel per metered kg',
};

/** Why a value is not determined, and what would. */
export const REASONS: Readonly<Record<TuneReason, string>> = {
  meter_or_heat_capacity:
    'a meter that reads wrong throughout and another heat capacity move the fronts alike; the ' +
    "plant's power and the machine model tell them apart too weakly or not at all",
  no_string_near_wall:
    'no string stands near enough to the wall for its heat to arrive within the recording',
  no_standing: 'less than 4 h of standing: record a night at rest',
  no_steep_front_standing:
    'no steep front stood between thermocouples for 4 h: stop a charge halfway and let it rest',
  front_too_still: 'the fronts moved by less than half a metre',
  no_power_that_way: 'no half hour of steady running that way with power, flow and outlets read',
  tells_less_than_known: 'the recording tells less than what is known beforehand',
  moves_with_another: 'it cannot be told from another value',
};

export const REFUSALS: Readonly<Record<TuneRefusal, readonly [message: string, advice: string]>> = {
  no_rows: [
    'holds no stretch of known flow',
    'Tuning needs rows with times, thermocouples and flow; see the counts above.',
  ],
  too_short: [
    'holds less than 3 h without a gap in time or flow',
    'Take at least a charge and a discharge, better two days with a rest of some hours.',
  ],
  no_flow: [
    'holds less than 1 h of flow: nothing moves that could be tuned',
    'Take a recording in which the unit charges and discharges; check the flow channel.',
  ],
  no_thermocouples: [
    'begins without a reading of any thermocouple on one of the strings',
    'Begin it with --from where the strings are read.',
  ],
  cannot_follow: [
    'cannot be followed by the bed model at all',
    'Check units, positions and charge_inlet_at with rockhour check.',
  ],
};

export const percent = (share: number): string => {
  const value = 100 * share;
  return value < 0.95 ? value.toFixed(1) : value.toFixed(value < 10 ? 1 : 0);
};

export function labelOf(row: TuneRow): string {
  return row.store === null ? NAMES[row.name] : `${row.store}: ${NAMES[row.name]}`;
}

export function reasonOf(row: TuneRow, rows: readonly TuneRow[]): string {
  if (row.reason === 'moves_with_another' && row.with !== null) {
    const other = rows[row.with.row] as TuneRow;
    return `it cannot be told from ${labelOf(other)} (correlation ${row.with.correlation.toFixed(2)})`;
  }
  return row.reason === null ? '' : REASONS[row.reason];
}

const sigmaText = (row: TuneRow): string =>
  row.sigma === null
    ? ''
    : row.name === 'gas_share'
      ? `+/- ${row.sigma.toFixed(2)}`
      : `+/- ${percent(row.sigma)} %`;

/** The fragment of a site file, each value with its standard error, and why others are missing. */
export function fragmentText(result: TuneResult, source: string): string {
  const row = (store: string | null, name: Tunable) =>
    result.rows.find((one) => one.store === store && one.name === name) as TuneRow;
  const line = (indent: string, key: string, value: number | null, one: TuneRow): string =>
    value === null
      ? `${indent}# ${key}: ${one.determined ? unsaid(result) : `not determined: ${reasonOf(one, result.rows)}`}`
      : `${indent}${key}: ${Number(value.toPrecision(4))} # ${sigmaText(one)} (1 sigma)`;
  const { work_factor, stores } = result.configure;
  const anyWork = work_factor.charge !== null || work_factor.discharge !== null;
  const lines = [
    `# Tuned by rockhour to ${source}, ${result.from} to ${result.to}.`,
    '# Lay these keys over the site file: units and stores are found by their id. They belong together:',
    '# the work factors hold with these heat capacities, so take all of a unit or none.',
    'units:',
    `  - id: ${result.unit}`,
    ...(anyWork ? ['    machine:'] : []),
    line(
      anyWork ? '      ' : '    ',
      'work_factor_charge',
      work_factor.charge,
      row(null, 'work_charge'),
    ),
    line(
      anyWork ? '      ' : '    ',
      'work_factor_discharge',
      work_factor.discharge,
      row(null, 'work_discharge'),
    ),
    '    stores:',
  ];
  for (const store of stores) {
    const fit = result.fits.find((one) => one.store === store.id);
    lines.push(`      - id: ${store.id}`);
    for (const { id, residual_K } of fit?.left_out ?? []) {
      lines.push(
        `        # fitted without ${id}, which the model misses by ${residual_K.toFixed(1)} K`,
      );
    }
    if (fit?.converged === false) {
      lines.push('        # no factors: the search has not settled, its values are rough');
      continue;
    }
    const keys = FACTORS.map((key) => [key, store[key], row(store.id, key)] as const);
    const any = keys.some(([, value]) => value !== null);
    if (any) lines.push('        factors:');
    const indent = any ? '          ' : '        ';
    for (const [key, value, one] of keys) lines.push(line(indent, key, value, one));
  }
  return `${lines.join('\n')}\n`;
}

/** Why a work factor is left out although the work is known: what it has to be divided by is not. */
function unsaid({ fits, rows }: TuneResult): string {
  const rough = fits.filter((fit) => !fit.converged).map((fit) => fit.store);
  if (rough.length > 0) return `left out: the search has not settled for ${rough.join(', ')}`;
  const open = rows.filter((row) => row.name === 'front_travel' && !row.determined);
  return `left out: not determined is ${open.map(labelOf).join(', ')}`;
}

type FactorKey = Exclude<keyof TuneConfigure['stores'][number], 'id'>;
const FACTORS: readonly FactorKey[] = [
  'heat_transfer',
  'conductivity',
  'loss',
  'heat_capacity',
  'gas_share',
];
