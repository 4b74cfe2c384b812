import type { RejectedSensor } from '../../core/estimate.js';
import type { SensorWorth, StoreWorth, StringWorth } from '../../core/worth/sensorWorth.js';
import { table } from '../table.js';

/** What `rockhour sensors` answers; with --json as it is. */
export interface SensorsAnswer {
  readonly unit: string;
  /** What the sigmas were followed along. */
  readonly over:
    | {
        readonly kind: 'cycle';
        readonly charge_h: number;
        readonly discharge_h: number;
        readonly stand_h: number;
      }
    | { readonly kind: 'recording'; readonly recording: string; readonly covered_h: number };
  /** Hours at rated power from full stores: turns a state of charge into hours [h]. */
  readonly full_hours: number;
  /** Rejected at the recording's end: counted as out of use. */
  readonly rejected: readonly RejectedSensor[];
  readonly stores: readonly StoreWorth[];
}

/** Below this rise of sigma a thermocouple is hardly missed. */
const HARDLY = 0.01;
/** So many are listed even where none is missed much. */
const LISTED = 5;
const WIDTH = 100;

export function sensorsText(answer: SensorsAnswer, all: boolean): string {
  const stores = answer.stores.map((store) => storeText(store, answer, all));
  const end =
    '+/- is one standard deviation of the estimate (rms over the time weighed; worst = its greatest).\n' +
    'A loss is weighed a while after it happens, when what was known before has left the bed.';
  return [head(answer), ...stores, end].join('\n\n');
}

function head({ unit, over }: SensorsAnswer): string {
  if (over.kind === 'recording') {
    return `${unit}: thermocouples weighed over the second half of ${over.recording} (${over.covered_h.toFixed(1)} h)`;
  }
  const { charge_h, discharge_h, stand_h } = over;
  return `${unit}: thermocouples weighed over a settled day: ${charge_h.toFixed(1)} h charging, ${discharge_h.toFixed(1)} h discharging at rated power, ${stand_h.toFixed(1)} h standing`;
}

const percent = (share: number, digits = 2): string => `${(share * 100).toFixed(digits)} %`;
const centimetres = (m: number | null): string => (m === null ? '-' : (m * 100).toFixed(1));
const signed = (share: number): string => {
  const text = (share * 100).toFixed(1);
  return share > 0 ? `+${text} %` : `${text} %`;
};

function storeText(store: StoreWorth, answer: SensorsAnswer, all: boolean): string {
  const { all: now } = store;
  const title = `Store ${store.store}`;
  const inUse = store.sensors.filter((s) => s.in_use);
  const out = store.sensors.filter((s) => !s.in_use);
  const hours = now.soc_sigma_rms * answer.full_hours;
  const parts = [
    `${title}\n${'-'.repeat(title.length)}`,
    `With ${inUse.length} thermocouples on ${store.strings.length} ${store.strings.length === 1 ? 'string' : 'strings'}: state of charge +/-${percent(now.soc_sigma_rms)} (worst ${percent(now.soc_sigma_worst)}),\n` +
      `front +/-${centimetres(now.position_sigma_rms_m)} cm (worst ${centimetres(now.position_sigma_worst_m)} cm). Where this store ends the discharge that is +/-${hours.toFixed(3)} h at rated power.`,
    losses(store, inUse, all),
    ...(out.length === 0 ? [] : [repairs(out, answer.rejected)]),
    wholes(store, answer.full_hours),
    ...store.strings
      .flatMap((string) => string.one_more.slice(0, 1))
      .slice(0, 1)
      .map(() => oneMore(store)),
  ];
  return parts.join('\n\n');
}

const DOING = { charge: 'charging', discharge: 'discharging', stand: 'standing' } as const;

function losses(store: StoreWorth, inUse: readonly SensorWorth[], all: boolean): string {
  const missed = inUse.filter((s) => s.rise >= HARDLY);
  const shown = all ? inUse : inUse.slice(0, Math.max(LISTED, missed.length));
  const rest = inUse.slice(shown.length);
  const strings = new Map(store.strings.map((string) => [string.id, string]));
  const rows = shown.map((s) => {
    const whole = strings.get(s.string_id) as StringWorth;
    return [
      s.id,
      s.string_id,
      s.position_m.toFixed(2),
      signed(s.rise),
      percent(s.store.soc_sigma_rms),
      percent(s.store.soc_sigma_worst),
      `${centimetres(whole.all.position_sigma_rms_m)} -> ${centimetres(s.string.position_sigma_rms_m)}`,
      s.most_in === null ? '-' : DOING[s.most_in],
    ];
  });
  const header = [
    'if lost',
    'string',
    'x m',
    'more sigma',
    'charge +/-',
    'worst',
    'front of its string cm',
  ];
  const lines = [
    missed.length === 0
      ? `Any one of them can be lost: sigma of the state of charge rises by less than ${percent(HARDLY, 0)}.`
      : `${missed.length} would be missed; the most precious first.`,
    table([...header, 'tells most'], rows),
  ];
  if (rest.length > 0) {
    const most = Math.max(...rest.map((s) => s.rise));
    lines.push(
      wrap(
        `Hardly missed, one at a time (${signed(most)} at most): ${rest.map((s) => s.id).join(', ')}`,
      ),
    );
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
  return `Out of use at the end of the recording; what repair would do:\n${table(['if repaired', 'string', 'x m', 'now', 'sigma', 'charge +/-'], rows)}`;
}

function wholes(store: StoreWorth, full_hours: number): string {
  const row = (name: string, what: string, of: { store: StoreWorth['all']; rise: number }) => [
    name,
    what,
    signed(of.rise),
    percent(of.store.soc_sigma_rms),
    percent(of.store.soc_sigma_worst),
    (of.store.soc_sigma_rms * full_hours).toFixed(3),
    centimetres(of.store.position_sigma_rms_m),
  ];
  const rows = [
    ...store.groups.map((g) =>
      row(`card ${g.id}`, `${g.thermocouples} on ${g.strings.join(', ')}`, g),
    ),
    ...store.strings.map((s) =>
      row(`string ${s.id}`, `${s.thermocouples} at r = ${s.radius_m} m`, s),
    ),
  ];
  const header = [
    'if all of it is lost',
    'thermocouples',
    'more sigma',
    'charge +/-',
    'worst',
    'hours +/-',
    'front cm',
  ];
  return table(header, rows);
}

/** Changes of sigma by place, one column per string, the best place of each said first. */
function oneMore(store: StoreWorth): string {
  const lines = store.strings.map((string) => {
    const best = string.one_more.reduce((a, b) => (b.rise < a.rise ? b : a));
    return `${string.id}: best at x = ${best.position_m.toFixed(2)} m, sigma ${signed(best.rise)}, front of the string ${centimetres(string.all.position_sigma_rms_m)} -> ${centimetres(best.string.position_sigma_rms_m)} cm`;
  });
  const places = store.strings[0]?.one_more ?? [];
  const rows = places.map(({ position_m }, i) => [
    position_m.toFixed(2),
    ...store.strings.map((string) => signed(string.one_more[i]?.rise ?? 0)),
  ]);
  return [
    'One thermocouple more, on a card of its own; change of sigma of the state of charge:',
    ...lines,
    table(['x m', ...store.strings.map((s) => s.id)], rows),
  ].join('\n');
}

function wrap(text: string): string {
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(' ')) {
    if (line !== '' && line.length + word.length + 1 > WIDTH) {
      lines.push(line);
      line = '  ';
    }
    line += line.trim() === '' ? `${line}${word}` : ` ${word}`;
  }
  return [...lines, line].join('\n');
}
