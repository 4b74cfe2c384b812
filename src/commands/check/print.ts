import type { SiteConfig } from '../../config/site.js';
import type { HalfCycle, HalfEnd } from '../../core/cycle/settledCycle.js';
import type { DirectionLimitFacts } from './limitFacts.js';
import { siteNotes } from './siteNotes.js';
import type { StoreFacts } from './storeFacts.js';
import type { DirectionFacts, UnitFacts } from './unitFacts.js';

const WIDTH = 100;

/** The facts of a site as a person reads them. */
export function factsAsText(file: string, site: SiteConfig, units: readonly UnitFacts[]): string {
  const channels = units.reduce((sum, unit) => sum + unit.channels, 0);
  const head = [
    `${file} is sound.`,
    `${site.name}: ${count(units.length, 'unit')}, ${count(channels, 'channel')} from ${count(site.sources.length, 'topic')}`,
    `MQTT     ${site.mqtt.url ?? ownBroker(site.mqtt)}`,
    ...(site.mqtt.url === null ? [] : [brokerText(site)]),
    `Influx   ${site.influx === null ? 'none: the local store alone serves' : `${site.influx.url}, database ${site.influx.database}`}`,
    `Store    ${site.store.folder}`,
    `Page     http${site.http.tls ? 's' : ''}://${site.http.host}:${site.http.port}${site.http.path_prefix}`,
  ];
  const open = notesText(siteNotes(site));
  return [head.join('\n'), ...(open === '' ? [] : [open]), ...units.map(unitText)].join('\n\n');
}

const ownBroker = ({ embedded_host, embedded_port, embedded_tls }: SiteConfig['mqtt']) =>
  `its own broker on ${embedded_host}:${embedded_port}${embedded_tls ? ', by TLS' : ''}`;

/** What mosquitto keeps of itself for a subscriber that is away [messages]. */
const QUEUED = 1000;

/** How soon a broker with its own limits drops what comes while rockhour is away. */
function brokerText(site: SiteConfig): string {
  const per_s = site.units.reduce((sum, unit) => {
    const own = site.sources.filter((source) => source.unit === unit.id).length;
    return sum + own / unit.scan_period_s;
  }, 0);
  const within_min = QUEUED / per_s / 60;
  return (
    `Broker   keeps what comes while rockhour is away: mosquitto of itself ${QUEUED} messages, here ` +
    `${within_min.toPrecision(2)} min of all channels; raise max_queued_messages, set persistence true`
  );
}

function unitText(unit: UnitFacts): string {
  const parts = [
    heading(unit.name === unit.id ? `Unit ${unit.id}` : `Unit ${unit.id}: ${unit.name}`),
    machineText(unit),
    hoursText(unit),
    limitsText(unit),
    storesText(unit.stores),
    watchText(unit),
    missingText(unit),
    missingLimitsText(unit),
    notesText(unit.notes),
  ];
  return parts.filter((part) => part !== '').join('\n\n');
}

function heading(text: string): string {
  return `${text}\n${'='.repeat(text.length)}`;
}

type Row = readonly [label: string, unit: string, ...values: string[]];

/** Numbers to the right in their columns, the unit behind them. */
function rows(header: readonly string[], body: readonly Row[]): string {
  const columns = header.length;
  const all = [['', '', ...header], ...body];
  const labelWidth = Math.max(...all.map((row) => row[0]!.length));
  const widths = header.map((_, i) => Math.max(12, ...all.map((row) => row[i + 2]?.length ?? 0)));
  return all
    .map((row) => {
      const values = Array.from({ length: columns }, (_, i) =>
        (row[i + 2] ?? '').padStart(widths[i]!),
      );
      return `${row[0]!.padEnd(labelWidth)}  ${values.join('  ')}  ${row[1]}`.trimEnd();
    })
    .join('\n');
}

/** Three figures of weight: as many as a hand calculation carries. */
function figure(value: number | null): string {
  if (value === null) return '-';
  if (!Number.isFinite(value)) return String(value);
  const size = Math.abs(value);
  if (size !== 0 && size < 0.01) return value.toPrecision(2);
  if (size >= 100) return value.toFixed(0);
  return size >= 10 ? value.toFixed(1) : value.toFixed(2);
}

function machineText(unit: UnitFacts): string {
  const both = (pick: (d: DirectionFacts) => number | null): [string, string] => [
    figure(pick(unit.charge)),
    figure(pick(unit.discharge)),
  ];
  const body: Row[] = [
    ['Power', 'MW_el', ...both((d) => d.power_MW_el)],
    ['Specific work', 'kJ_el/kg', ...both((d) => d.specific_work_kJ_kg)],
    ['Flow at that power', 'kg/s', ...both((d) => d.flow_kg_s)],
    ['Sends into the hot store', 'degC', ...both((d) => d.hot_inlet_degC)],
  ];
  if (unit.discharge.cold_inlet_degC !== null) {
    body.push(['Sends into the cold store', 'degC', ...both((d) => d.cold_inlet_degC)]);
  }
  return `Machine, stores at their references\n${rows(['charge', 'discharge'], body)}`;
}

const END_WORDS: Readonly<Record<HalfEnd, string>> = {
  hot_outlet: 'hot outlet',
  cold_outlet: 'cold outlet',
  flow: 'flow limit',
  pressure_drop: 'pressure drop',
  empty: 'no work left',
  time: 'time',
};

function hoursText(unit: UnitFacts): string {
  const { charge, discharge } = unit.cycle;
  const both = (pick: (half: HalfCycle) => string): [string, string] => [
    pick(charge),
    pick(discharge),
  ];
  const body: Row[] = [
    ['Hours', 'h', ...both((half) => figure(half.hours))],
    ['Energy', 'MWh_el', ...both((half) => figure(half.energy_MWh_el))],
    ['Ended by', '', ...both((half) => END_WORDS[half.ends_by])],
  ];
  const spare = discharge.hours / unit.rated_hours_h - 1;
  const verdict =
    spare >= 0
      ? `${(100 * spare).toFixed(0)} % more than the rated ${unit.rated_hours_h} h`
      : `${(-100 * spare).toFixed(0)} % less than the rated ${unit.rated_hours_h} h`;
  return [
    'Settled cycle: charge at greatest, discharge at rated power, each to its limit (models of bed and machine)',
    rows(['charge', 'discharge'], body),
    `Discharge: ${verdict}. Round trip ${(100 * unit.round_trip).toFixed(1)} % of electricity.`,
    `Were the fronts sharp, full stores would last ${Object.entries(unit.plug_flow_hours)
      .map(([id, hours]) => `${figure(hours)} h (${id})`)
      .join(' and ')}.`,
  ].join('\n');
}

function limitsText(unit: UnitFacts): string {
  const { charge, discharge, cold_after_h, standing_MWh_el_d, time_zone } = unit.limits;
  const row = (
    label: string,
    unit: string,
    pick: (d: DirectionLimitFacts) => number | null,
  ): Row => [label, unit, figure(pick(charge)), figure(pick(discharge))];
  const cold = cold_after_h === null ? '' : `, stood ${figure(cold_after_h)} h`;
  const body: Row[] = [
    row('Least power', 'MW_el', (d) => d.power_min_MW_el),
    row('Greatest power', 'MW_el', (d) => d.power_max_MW_el),
    row('Command to power, warm', 'min', (d) => d.from_warm_min),
    row(`Command to power, cold${cold}`, 'min', (d) => d.from_cold_min),
    row('Command to power, out of the other', 'min', (d) => d.from_other_direction_min),
    row('Power to none', 'min', (d) => d.ramp_down_min),
    row('First hour lacks, warm', 'MWh_el', (d) => d.first_hour_lacks_warm_MWh_el),
    row('First hour lacks, cold', 'MWh_el', (d) => d.first_hour_lacks_cold_MWh_el),
    row('Connected for that power', 'h/d', (d) => d.connected_h_d),
  ];
  const told = [
    `Standing draws ${figure(standing_MWh_el_d)} MWh_el a day`,
    time_zone === null ? 'blocks begin by UTC' : `blocks begin by the clocks of ${time_zone}`,
    unit.limits.outages === 0 ? 'no outage planned' : count(unit.limits.outages, 'outage'),
    ...(unit.limits.availability === null
      ? []
      : [`available ${figure(100 * unit.limits.availability)} % of the time`]),
  ];
  const powers = `${figure(unit.charge.power_MW_el)} and ${figure(unit.discharge.power_MW_el)} MW_el`;
  return [
    `Limits of what can be sold, at the powers of the cycle (${powers})`,
    rows(['charge', 'discharge'], body),
    ...wrap(`${told.join('; ')}.`, 0),
  ].join('\n');
}

function storesText(stores: readonly StoreFacts[]): string {
  const each = (label: string, unit: string, pick: (s: StoreFacts) => string): Row => [
    label,
    unit,
    ...stores.map(pick),
  ];
  const num = (label: string, unit: string, pick: (s: StoreFacts) => number | null) =>
    each(label, unit, (s) => figure(pick(s)));
  const body: Row[] = [
    num('Volume', 'm3', (s) => s.volume_m3),
    num('Mass of the solid', 't', (s) => s.solid_t),
    num('Capacity between the references', 'MWh_th', (s) => s.capacity_MWh_th),
    num('Heat capacity of the bed', 'kJ/m3K', (s) => s.heat_capacity_kJ_m3K),
    num('Flow per area', 'kg/m2s', (s) => s.mass_flux_kg_m2s),
    num('Re', '-', (s) => s.reynolds),
    num('Pr', '-', (s) => s.prandtl),
    num('Bi', '-', (s) => s.biot),
    num('Heat transfer hv', 'kW/m3K', (s) => s.heat_transfer_kW_m3K),
    num('NTU', '-', (s) => s.ntu),
    num('Conductivity without flow, cold', 'W/mK', (s) => s.stagnant_conductivity_W_mK[0]),
    num('Conductivity without flow, hot', 'W/mK', (s) => s.stagnant_conductivity_W_mK[1]),
    num('Front speed', 'm/h', (s) => s.front_speed_m_h),
    num('End to end', 'h', (s) => s.full_charge_h),
    num('Front width (sigma) by then', 'm', (s) => s.front_width_m),
    num('  of it by heat transfer', 'm', (s) => s.front_width_by_transfer_m),
    num('  of it by conduction, mixing', 'm', (s) => s.front_width_by_conduction_m),
    num('Greatest thermocouple spacing', 'm', (s) => s.spacing_m),
    num('Thermocouples per front', '-', (s) => s.thermocouples_per_front),
    num('Pressure drop, charged', 'kPa', (s) => s.pressure_drop_charged_kPa),
    num('Pressure drop, discharged', 'kPa', (s) => s.pressure_drop_discharged_kPa),
    num('Standing loss when full', 'kW_th', (s) => s.standing_loss_kW),
    num('  of the capacity', '%/d', (s) => s.standing_loss_percent_d),
    num('Coldest fluid', 'degC', (s) => s.coldest_degC),
    num('Dew point of the gas', 'degC', (s) => s.dew_point_degC),
    each('Strings x thermocouples', '', (s) => layoutWords(s)),
    each('Area shares', '', (s) => s.strings.map((q) => q.area_share.toFixed(2)).join(' + ')),
  ];
  const flow = stores[0] === undefined ? '' : ` at ${figure(stores[0].flow_kg_s)} kg/s`;
  return `Stores${flow}, properties at the mean of the references\n${rows(
    stores.map((s) => s.id),
    body,
  )}\nThermocouples per front: those between its 16 and 84 % crossings, 2 sigma apart.`;
}

function layoutWords(store: StoreFacts): string {
  const counts = store.strings.map((q) => q.thermocouples);
  return counts.every((n) => n === counts[0])
    ? `${counts.length} x ${counts[0]}`
    : counts.join(' + ');
}

function watchText({ watch }: UnitFacts): string {
  const { indicators, each_d, unit_d } = watch;
  const told =
    `${count(indicators, 'indicator')} raise alerts. In the mean, a healthy one is called degraded at ` +
    `most once in ${figure(each_d)} days, so a healthy unit at most once in ${figure(unit_d)} days ` +
    '(bounds, at the edge of what counts as healthy).';
  return ['Watching', ...wrap(told, 0)].join('\n');
}

function missingText(unit: UnitFacts): string {
  if (unit.missing.length === 0) return 'No channel is missing.';
  const lines = unit.missing.flatMap((m) => [
    `  ${m.channel}`,
    ...wrap(`instead: ${m.stands_in}`, 4),
    ...wrap(`costs: ${m.costs}`, 4),
  ]);
  return `Channels that are not there\n${lines.join('\n')}`;
}

function missingLimitsText(unit: UnitFacts): string {
  if (unit.missing_limits.length === 0) return '';
  const lines = unit.missing_limits.flatMap((m) => [
    `  ${m.limit}`,
    ...wrap(`instead: ${m.stands_in}`, 4),
    ...wrap(`costs: ${m.costs}`, 4),
  ]);
  return `Limits that are not there\n${lines.join('\n')}`;
}

function notesText(notes: readonly string[]): string {
  if (notes.length === 0) return '';
  return `To look at\n${notes.flatMap((note) => wrap(`- ${note}`, 2)).join('\n')}`;
}

/** Lines of at most WIDTH, the later ones indented two more. */
function wrap(text: string, indent: number): string[] {
  const lines: string[] = [];
  let line = ' '.repeat(indent);
  let empty = true;
  for (const word of text.split(' ')) {
    if (!empty && line.length + 1 + word.length > WIDTH) {
      lines.push(line);
      line = ' '.repeat(indent + 2);
      empty = true;
    }
    line += empty ? word : ` ${word}`;
    empty = false;
  }
  lines.push(line);
  return lines;
}

function count(n: number, word: string): string {
  return `${n} ${word}${n === 1 ? '' : 's'}`;
}
