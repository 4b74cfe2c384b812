import type { RejectedSensor } from '../../core/estimate.js';
import type { Spread } from '../../core/worth/spread.js';
import type { SensorWorth, StoreWorth } from '../../core/worth/storeWorth.js';
import type { UnitWorth, WorthOver } from '../../core/worth/unitWorth.js';
import { table } from '../table.js';

/** Below this rise of sigma a thermocouple is hardly missed. */
const HARDLY = 0.01;
/** So many are listed even where none is missed much. */
const LISTED = 5;
const WIDTH = 100;
/** Change of the store's sigma, and that sigma with the change. */
const SIGMA = ['sigma %', 'charge +/-%', 'worst +/-%'];
const DOING = { charge: 'charging', discharge: 'discharging', stand: 'standing' } as const;

/**
 * The answer as maintenance reads it.
 * @param all lists every thermocouple, also those that are hardly missed
 */
export function sensorsText(answer: UnitWorth, all: boolean): string {
  const stores = answer.stores.map((store) => storeText(store, answer, all));
  return [head(answer), ...stores].join('\n\n');
}

function head({ unit, over }: UnitWorth): string {
  const counted =
    over.kind === 'now'
      ? ' Losses are counted from now on.'
      : ' A loss is counted once what was known before has left the bed: at first it costs less.';
  return [
    `${unit}: what its thermocouples are worth, over`,
    along(over),
    ...wrapped(
      `+/- is sigma, one standard deviation of the estimate, rms over that time; sigma % is by how much that of the store's state of charge (charge) would change.${counted}`,
      '',
    ),
  ].join('\n');
}

function along(over: WorthOver): string {
  switch (over.kind) {
    case 'recording':
      return `the second half of ${over.recording} (${over.covered_h.toFixed(1)} h)`;
    case 'now':
      return `the next ${over.hours.toFixed(1)} h, ${DOING[over.mode]}, from the present state`;
    case 'day':
      return `a settled day: ${over.charge_h.toFixed(1)} h charging, ${over.discharge_h.toFixed(1)} h discharging at rated power, ${over.stand_h.toFixed(1)} h standing`;
  }
}

const percent = (share: number, digits = 2): string => (share * 100).toFixed(digits);
const centimetres = (m: number | null): string => (m === null ? '-' : (m * 100).toFixed(1));
const signed = (share: number): string => `${share > 0 ? '+' : ''}${percent(share, 1)}`;

function storeText(store: StoreWorth, answer: UnitWorth, all: boolean): string {
  const inUse = store.sensors.filter((s) => s.in_use);
  const out = store.sensors.filter((s) => !s.in_use);
  const title = `Store ${store.store}`;
  const parts = [
    `${title}\n${'-'.repeat(title.length)}`,
    now(store, inUse.length, answer.full_hours),
    losses(store, inUse, all),
    ...(out.length === 0 ? [] : [repairs(out, answer.rejected)]),
    wholes(store, answer.full_hours),
    ...(store.strings.some((string) => string.one_more.length > 0) ? [oneMore(store)] : []),
  ];
  return parts.join('\n\n');
}

function now(store: StoreWorth, inUse: number, full_hours: number): string {
  const { soc_sigma_rms, soc_sigma_worst, position_sigma_rms_m, position_sigma_worst_m } =
    store.all;
  const count = store.strings.length;
  return table(
    [`+/- with all ${inUse} on ${count} ${count === 1 ? 'string' : 'strings'}`, 'rms', 'worst'],
    [
      ['state of charge %', percent(soc_sigma_rms), percent(soc_sigma_worst)],
      ['front position cm', centimetres(position_sigma_rms_m), centimetres(position_sigma_worst_m)],
      [
        'hours at rated power, where this store ends them',
        (soc_sigma_rms * full_hours).toFixed(3),
        (soc_sigma_worst * full_hours).toFixed(3),
      ],
    ],
  );
}

function losses(store: StoreWorth, inUse: readonly SensorWorth[], all: boolean): string {
  const missed = inUse.filter((s) => s.rise >= HARDLY).length;
  const shown = inUse.slice(0, all ? inUse.length : Math.max(LISTED, missed));
  const rest = inUse.slice(shown.length);
  const strings = new Map(store.strings.map((string) => [string.id, string.all]));
  const rows = shown.map((s) => [
    s.id,
    s.string_id,
    s.position_m.toFixed(2),
    signed(s.rise),
    percent(s.store.soc_sigma_rms),
    percent(s.store.soc_sigma_worst),
    `${centimetres(strings.get(s.string_id)?.position_sigma_rms_m ?? null)} -> ${centimetres(s.string.position_sigma_rms_m)}`,
    s.most_in === null ? '-' : DOING[s.most_in],
  ]);
  const header = ['one lost', 'string', 'x m', ...SIGMA];
  const share = percent(HARDLY, 0);
  const lines = [
    missed === 0
      ? `Any one of them can be lost: sigma rises by less than ${share} % of itself.`
      : `${missed} would be missed: without ${missed === 1 ? 'it' : 'any one of them'} sigma rises by ${share} % of itself or more.`,
    'The most precious first:',
    table([...header, "string's front +/-cm", 'felt most'], rows),
  ];
  const [most] = rest;
  if (most !== undefined) {
    const names = rest.map((s) => s.id).join(', ');
    const text = `Hardly missed, one at a time (${signed(most.rise)} % at most): ${names}`;
    lines.push(...wrapped(text, '  '));
  }
  return lines.join('\n');
}

function repairs(out: readonly SensorWorth[], rejected: readonly RejectedSensor[]): string {
  const verdicts = new Map(rejected.map(({ id, verdict }) => [id, verdict]));
  const rows = out.map((s) => [
    s.id,
    s.string_id,
    s.position_m.toFixed(2),
    verdicts.get(s.id) ?? '-',
    signed(s.rise),
    percent(s.store.soc_sigma_rms),
  ]);
  return [
    'Rejected and not counted above; what repair would do:',
    table(['repaired', 'string', 'x m', 'now', ...SIGMA.slice(0, 2)], rows),
  ].join('\n');
}

/** Cards and strings; a card that is all of a string makes the string's row needless. */
function wholes(store: StoreWorth, full_hours: number): string {
  const row = (name: string, of: { readonly store: Spread; readonly rise: number }) => [
    name,
    signed(of.rise),
    percent(of.store.soc_sigma_rms),
    percent(of.store.soc_sigma_worst),
    centimetres(of.store.position_sigma_rms_m),
    (of.store.soc_sigma_rms * full_hours).toFixed(3),
  ];
  const counts = new Map(store.strings.map((string) => [string.id, string.thermocouples]));
  const covered = new Set<string>();
  const groups = store.groups.map((group) => {
    const [only] = group.strings;
    const whole = group.strings.length === 1 && counts.get(only as string) === group.thermocouples;
    if (whole) covered.add(only as string);
    const what = whole ? `all of ${only}` : `of ${group.strings.join(', ')}`;
    return row(`group ${group.id}: ${group.thermocouples}, ${what}`, group);
  });
  const strings = store.strings
    .filter(({ id }) => !covered.has(id))
    .map((string) => row(`string ${string.id}: ${string.thermocouples}`, string));
  const header = ['all of these lost', ...SIGMA, 'front +/-cm', 'hours +/-'];
  return table(header, [...groups, ...strings]);
}

/** The best place on each string, and the change of sigma by place. */
function oneMore(store: StoreWorth): string {
  const best = store.strings.map((string) => {
    const place = string.one_more.reduce((a, b) => (b.rise < a.rise ? b : a));
    return [
      string.id,
      place.position_m.toFixed(2),
      signed(place.rise),
      percent(place.store.soc_sigma_rms),
      `${centimetres(string.all.position_sigma_rms_m)} -> ${centimetres(place.string.position_sigma_rms_m)}`,
    ];
  });
  const places = store.strings[0]?.one_more ?? [];
  const rows = places.map(({ position_m }, i) => [
    position_m.toFixed(2),
    ...store.strings.map((string) => signed(string.one_more[i]?.rise ?? 0)),
  ]);
  const header = ['best on', 'x m', ...SIGMA.slice(0, 2), "string's front +/-cm"];
  return [
    'One thermocouple more, on a card of its own:',
    table(header, best),
    '',
    'sigma % by its place and string:',
    table(['x m', ...store.strings.map((s) => s.id)], rows),
  ].join('\n');
}

/** Lines of at most WIDTH characters; all but the first begin with the indent. */
function wrapped(text: string, indent: string): string[] {
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(' ')) {
    if (line !== '' && line.length + word.length + 1 > WIDTH) {
      lines.push(line);
      line = indent + word;
    } else line = line === '' ? word : `${line} ${word}`;
  }
  return [...lines, line];
}
